"""A calibration of a real duplex loop: the audio server's own, which gives back bit for bit what is played."""

import json
from pathlib import Path

import pytest

from tests.bench.audio_server import DEVICE
from wattproof.bench.portaudio.bench import PortaudioBench
from wattproof.cli.main import run
from wattproof.procedures.calibrate import CalibratePlan
from wattproof.procedures.requests import Ask
from wattproof.runner.calibrating import DONE, make_calibration, rig_for
from wattproof.runner.screen import Asked, Event
from wattproof.store.calibration_file import read_calibration


@pytest.mark.server
@pytest.mark.usefixtures("audio_server")
def test_a_real_duplex_loop_is_calibrated() -> None:
    bench = PortaudioBench(DEVICE, 96_000)
    bench.open()
    plan = CalibratePlan(sweep_s=1.0, block_s=0.25, most_blocks=1, pad=False, highest_fs=0.5)
    asked: list[Ask] = []

    def plugged(ask: Ask) -> str:
        asked.append(ask)
        return DONE

    try:
        assert len(rig_for(bench, None).wirings) == 2
        told: list[Event] = []
        record = make_calibration(bench, plan, None, raise_limit=True).run(told.append, plugged)
    finally:
        bench.close()
    assert [ask.want for ask in asked] == ["direct", "amplifier"]
    assert len([event for event in told if isinstance(event, Asked)]) == 2
    assert (record.device, record.rate_hz) == (DEVICE, 96_000)
    for loop in record.loops:
        # what is played comes back bit for bit: gain one at every frequency, to float32's rounding of 6e-8
        assert loop.gain.value == pytest.approx(1.0, rel=1e-6, abs=0.0)
        assert max(abs(abs(gain) - 1.0) for gain in loop.response.gain.tolist()) < 1e-4
        assert loop.latency_frames == pytest.approx(round(loop.latency_frames), rel=0.0, abs=1e-3)
        assert not loop.inverted
        assert loop.clock_ppm is not None
        assert abs(loop.clock_ppm.value) < 1e-3
    assert record.out_floors == ()


@pytest.mark.server
@pytest.mark.usefixtures("audio_server")
def test_the_command_calibrates_a_loop_that_stands(capsys: pytest.CaptureFixture[str], tmp_path: Path) -> None:
    file = tmp_path / "loop.toml"
    options = ("--wired", "--no-pad", "--sweep-s", "1", "--block-s", "0.25", "--most-blocks", "1", "--json")
    status = run(("measure", "calibrate", "--bench", DEVICE, *options, "--output", str(file)), lambda _: 0, lambda: "")
    out, err = capsys.readouterr()
    assert (status, err) == (0, "")
    document = json.loads(out)
    assert (document["device"], document["scales"], len(document["loops"])) == (DEVICE, [], 2)
    # without --highest-fs the drive stays at the limit of an output whose volts are not known: a tenth of full scale
    assert max(point["level_dbfs"] for point in document["loops"][0]["linearity"]) < -20.0
    assert read_calibration(file).device == DEVICE
