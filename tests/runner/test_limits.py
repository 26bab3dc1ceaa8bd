"""The drive limit holds in volts where they are known, else in dBFS, and the rig's other limits are looked at."""

import pytest

from wattproof.core.calibration import Calibration, Scale
from wattproof.core.errors import WrongUseError
from wattproof.core.quantity import Quantity, measured
from wattproof.core.reading import Reading, ReadingSettings, State
from wattproof.core.rig import Limits, Rig
from wattproof.core.signal import Span, Tone
from wattproof.runner.limits import DriveLimit, exceeded

LOUD, QUIET = Scale(1, Quantity(8.0, "V"), "typed", "2026-01-01"), Scale(2, Quantity(2.0, "V"), "typed", "2026-01-01")


def _limit(*scales: Scale, drive_vrms: float = 1.0) -> DriveLimit:
    return DriveLimit(Rig(limits=Limits(drive_vrms=drive_vrms)), Calibration(outputs=scales))


def test_where_the_volts_are_known_the_limit_is_in_volts() -> None:
    limit = _limit(LOUD)
    limit.check(Tone(997.0, 0.125))
    with pytest.raises(WrongUseError, match=r"^output 1: drive 1\.01 V rms is above the limit of 1 V rms; lower the"):
        limit.check(Tone(997.0, 0.126))


def test_where_they_are_not_it_is_in_dbfs() -> None:
    limit = _limit()
    limit.check(Tone(997.0, 0.1))
    with pytest.raises(WrongUseError, match=r"^output 1: drive -19\.2 dBFS is above the limit of -20\.0 dBFS"):
        limit.check(Tone(997.0, 0.11))


def test_the_loudest_output_of_a_tone_counts() -> None:
    limit = _limit(LOUD, QUIET)
    assert limit.ceiling_fs((2,)) == pytest.approx(0.5, rel=1e-12, abs=0)
    assert limit.ceiling_fs((1, 2)) == pytest.approx(0.125, rel=1e-12, abs=0)
    assert not limit.allows(Tone(997.0, 0.3, (2, 1)))
    assert limit.allows(Tone(997.0, 0.3, (2,)))


def test_a_level_at_the_ceiling_is_allowed_whatever_the_rounding() -> None:
    limit = _limit(Scale(1, Quantity(3.1622776601683795, "V"), "typed", "2026-01-01"), drive_vrms=0.7)
    assert limit.allows(Tone(997.0, limit.ceiling_fs((1,))))


def test_an_output_of_little_voltage_may_go_to_full_scale() -> None:
    limit = _limit(QUIET, drive_vrms=5.0)
    assert limit.ceiling_fs((2,)) == 1.0


def test_a_limit_of_nothing_lets_only_silence_through() -> None:
    limit = _limit(LOUD, drive_vrms=0.0)
    assert limit.allows(Tone(997.0, 0.0))
    assert not limit.allows(Tone(997.0, 1e-6))


@pytest.mark.parametrize("vrms", [-1.0, 51.0, float("nan"), float("inf")])
def test_a_limit_that_is_no_sane_voltage_is_refused_and_the_old_one_stays(vrms: float) -> None:
    limit = _limit(LOUD)
    with pytest.raises(WrongUseError, match=r"drive limit \S+ V rms: give 0 to 50 V rms"):
        limit.set_vrms(vrms)
    assert limit.vrms == 1.0


@pytest.mark.parametrize("ratio", [-0.1, 1.1, float("nan")])
def test_a_limit_beyond_full_scale_is_refused_and_the_old_one_stays(ratio: float) -> None:
    limit = _limit()
    with pytest.raises(WrongUseError, match="of full scale: give 0 to 1"):
        limit.set_fs(ratio)
    assert limit.fs == 0.1


def _reading(level_vrms: float, power_w: float, thdn: float) -> Reading:
    return Reading(
        span=Span(0, 100, 48_000.0),
        channel=2,
        settings=ReadingSettings(full_scale_vrms=10.0, load_ohm=8.0),
        state=State.OK,
        level_vrms=measured(level_vrms, 0.0, "V"),
        power_w=measured(power_w, 0.0, "W"),
        thdn=measured(thdn, 0.0, "1"),
    )


@pytest.mark.parametrize(
    ("limits", "said"),
    [
        (Limits(output_vrms=20.0), "channel 2: output 24 V rms is above the limit of 20"),
        (Limits(power_w=50.0), "channel 2: power 72 W is above the limit of 50"),
        (Limits(thdn=0.1), "channel 2: THD+N 0.12 of the reference is above the limit of 0.1"),
        (Limits(output_vrms=25.0, power_w=80.0, thdn=0.2), ""),
        (Limits(), ""),
    ],
)
def test_a_reading_above_a_limit_of_the_rig_says_which(limits: Limits, said: str) -> None:
    assert exceeded(_reading(24.0, 72.0, 0.12), limits) == said
