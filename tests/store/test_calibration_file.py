"""Calibration files: written and read back, refused for another device, rate, channel or format."""

from pathlib import Path

import numpy as np
import pytest

from wattproof.core.calibration import Calibration, Floor, Scale
from wattproof.core.errors import WrongUseError
from wattproof.core.loopback import LevelPoint, Loop, NoiseSpectrum, Response
from wattproof.core.quantity import measured
from wattproof.core.reading import Mains, MainsLine
from wattproof.dsp.uncertainty import known
from wattproof.store.calibration_file import calibration_text, read_calibration, require_suits, write_calibration

FREQUENCIES = np.array([10.0, 1_000.0, 20_000.0])
LOOP = Loop(
    output=1,
    input=2,
    latency_frames=1536.25,
    inverted=False,
    gain=measured(0.98, 1e-6, "1"),
    frequency_hz=997.0,
    pad=measured(0.1, 1e-7, "1"),
    response=Response(FREQUENCIES, np.array([0.9 + 0.1j, 1.0 + 0j, 0.8 - 0.2j])),
    linearity=(LevelPoint(0.25, measured(1e-6, 1e-7, "1")),),
    noise=(NoiseSpectrum(0.0, FREQUENCIES, np.array([1e-8, 2e-8, 3e-8]), measured(2e-6, 1e-8, "1")),),
    mains=Mains(50.0, (MainsLine(50.0, measured(1e-6, 1e-8, "1")),)),
    clock_ppm=measured(3.0, 0.1, "ppm"),
)
CALIBRATION = Calibration(
    device="ALSA/interface",
    rate_hz=96_000.0,
    inputs=(Scale(2, known(2.0, "V", "level calibration meter", 0.005, 12.0), "measured", "2026-01-02"),),
    outputs=(Scale(1, known(1.9, "V", "level calibration meter", 0.005), "measured", "2026-01-02"),),
    out_floors=(Floor(1, 0.5, measured(1e-6, 1e-8, "1"), ((2, measured(1e-6, 1e-8, "1")),), (0.5,)),),
    in_floors=(Floor(2, 0.5, measured(1e-6, 1e-8, "1")),),
    response=LOOP.response,
    date="2026-01-02",
    sample_format="24 bit",
    loops=(LOOP,),
)


def test_what_is_written_is_read_back(tmp_path: Path) -> None:
    file = tmp_path / "calibration.toml"
    write_calibration(file, CALIBRATION)
    again = read_calibration(file)
    assert (again.device, again.rate_hz, again.date, again.sample_format) == (
        "ALSA/interface",
        96_000.0,
        "2026-01-02",
        "24 bit",
    )
    assert again.inputs == CALIBRATION.inputs  # budgets, infinite degrees of freedom too
    assert again.outputs == CALIBRATION.outputs
    assert again.out_floors[0].harmonics == CALIBRATION.out_floors[0].harmonics
    loop = again.loops[0]
    assert (loop.gain, loop.pad, loop.clock_ppm, loop.mains, loop.linearity) == (
        LOOP.gain,
        LOOP.pad,
        LOOP.clock_ppm,
        LOOP.mains,
        LOOP.linearity,
    )
    # magnitude and degrees are stored: they come back to the rounding of float64
    np.testing.assert_allclose(loop.response.gain, LOOP.response.gain, rtol=1e-14, atol=1e-14)
    np.testing.assert_array_equal(loop.noise[0].density_fs, LOOP.noise[0].density_fs)


@pytest.mark.parametrize(
    ("old", "new", "said"),
    [
        ("latency_frames = 1536.25", 'latency_frames = "16 ms"', "loops[1].latency_frames: '16 ms' is no number"),
        ("[loops.response]\n", "[loops.response]\ngain_db = [0.0]\n", "loops[1].response: a response has frequency_hz"),
        ('device = "ALSA/interface"\n', "", "device"),
        ("socket = 2", "socket = 0", "inputs[1].socket: Scale.socket is 0; it counts from 1"),
    ],
)
def test_a_file_edited_by_hand_is_refused_with_its_field(tmp_path: Path, old: str, new: str, said: str) -> None:
    file = tmp_path / "calibration.toml"
    text = calibration_text(CALIBRATION)
    assert old in text
    file.write_text(text.replace(old, new, 1), encoding="utf-8")
    if said == "device":  # it has a default: a record without a device fits none
        with pytest.raises(WrongUseError, match="the calibration is of ''"):
            require_suits(read_calibration(file), "ALSA/interface", 96_000.0, (2,))
        return
    with pytest.raises(WrongUseError) as error:
        read_calibration(file)
    assert said in str(error.value)
    assert f"{file}, line " in str(error.value)


def test_a_record_suits_its_own_device_rate_channel_and_format_only() -> None:
    require_suits(CALIBRATION, "ALSA/interface", 96_000.0, (2,), "24 bit")
    for device, rate_hz, inputs, sample_format, said in (
        ("ALSA/other", 96_000.0, (2,), "", "is of 'ALSA/interface', and this device is 'ALSA/other'"),
        ("ALSA/interface", 48_000.0, (2,), "", "is for 96000 Hz, and this run is at 48000 Hz"),
        ("ALSA/interface", 96_000.0, (1, 2), "", "knows input 2, and the rig uses input 1"),
        ("ALSA/interface", 96_000.0, (2,), "16 bit", "was made in 24 bit, the device now delivers 16 bit"),
    ):
        with pytest.raises(WrongUseError, match=said):
            require_suits(CALIBRATION, device, rate_hz, inputs, sample_format)
