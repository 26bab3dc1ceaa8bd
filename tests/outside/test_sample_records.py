"""The sample records in calibration/: each loads, and the how-to's watts come out of its rig to the last digit."""

import math
from pathlib import Path

import pytest

from tests.house.sources import ROOT
from wattproof.core.calibration import Calibration, Scale
from wattproof.core.quantity import measured
from wattproof.core.reading import Reading, ReadingSettings, State
from wattproof.core.rounding import stated
from wattproof.core.signal import Span
from wattproof.core.units import from_db
from wattproof.dsp.uncertainty import known
from wattproof.procedures.absolute import absolute
from wattproof.store.calibration_file import read_calibration
from wattproof.store.rig_file import read_rig

FOLDER = ROOT / "calibration"
RIGS = sorted(FOLDER.glob("rig-*.toml"))


@pytest.mark.parametrize("file", RIGS, ids=lambda file: file.stem)
def test_each_sample_rig_loads(file: Path) -> None:
    assert read_rig(file).name


def test_the_sample_calibration_loads() -> None:
    record = read_calibration(FOLDER / "calibration-simulated.toml")
    assert record.device.startswith("simulated")
    assert record.in_floors
    assert record.loops[0].response.frequency_hz[0] == pytest.approx(10.0, rel=1e-12, abs=0.0)


def test_the_how_tos_watts_come_out_of_its_rig() -> None:
    rig = read_rig(FOLDER / "rig-hundred-watts.toml")
    # calibration/README.md, step 5: 4.0050 V at full scale, limits 0.005·1.0342 + 5·0.0001 V of 1.0342 V, rectangular
    u = 4.0050 * (0.005 * 1.0342 + 0.0005) / 1.0342 / math.sqrt(3.0)
    scale = Scale(1, known(4.0050, "V", "level calibration meter", u), "measured", "2026-01-01")
    reading = Reading(
        span=Span(0, 96_000, 96_000.0),
        channel=1,
        settings=ReadingSettings(),
        state=State.OK,
        fundamental_hz=measured(997.0, 0.0, "Hz"),
        fundamental_fs=measured(from_db(-7.42), 0.0, "1"),
        level_fs=measured(from_db(-7.42), 0.0, "1"),
    )
    made = absolute(reading, rig, Calibration(inputs=(scale,)))
    assert made.level_vrms is not None
    assert made.power_w is not None
    # step 6, by hand: 28.159 V, 98.17 W, u 0.799 %; to the digits that it gives
    assert made.level_vrms.value == pytest.approx(28.159, rel=0.0, abs=0.0006)
    assert made.power_w.value == pytest.approx(98.17, rel=0.0, abs=0.006)
    assert 100.0 * made.power_w.u / made.power_w.value == pytest.approx(0.799, rel=0.0, abs=0.001)
    assert stated(made.power_w) == "98.2 ± 1.5 W"


def test_the_bridges_ratio_is_that_of_the_how_to() -> None:
    rig = read_rig(FOLDER / "rig-bridge-24-volts.toml")
    # calibration/README.md, "Bridge-tied outputs", by hand: 9.1395
    assert [wiring.attenuator.ratio for wiring in rig.wirings] == pytest.approx([9.1395, 9.1395], rel=0.0, abs=5e-5)
