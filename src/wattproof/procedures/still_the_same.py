"""Whether a gain still is what it was calibrated at: five seconds against a known voltage, before a run.

A gain knob cannot be read by software, so only a voltage tells. A loop's tone sees output times input gain and nothing
of either alone: where one went up and the other down by the same, a loop shows no change.
"""

from enum import StrEnum

import attrs

from wattproof.core.errors import WrongUseError
from wattproof.core.quantity import Quantity
from wattproof.core.reading import Reading
from wattproof.core.rounding import expanded
from wattproof.core.units import DB_PER_RELATIVE, db
from wattproof.dsp.uncertainty import named_scatter, ratio


class Against(StrEnum):
    """What the gain was compared with. The values are stable: they are stored."""

    VOLTAGE = "a known voltage"
    LOOP = "a loop: output times input gain"


@attrs.frozen
class Verdict:
    """How far the gain has moved since the calibration, how far that can be told, and what it was compared with."""

    moved_db: float
    allowed_db: float
    against: Against

    @property
    def same(self) -> bool:
        """Whether the gain has moved by no more than the uncertainty of calibration and comparison together."""
        return abs(self.moved_db) <= self.allowed_db


def against_voltage(level_fs: Quantity, volts: Quantity, scale: Quantity) -> Verdict:
    """Compare a level that was read with a known voltage at the same input; `scale` is its V rms of full scale.

    What calibration and comparison share (the same meter) cancels, and counts in neither.
    """
    now = ratio(volts, named_scatter(level_fs, "comparison"), "V")
    return _verdict(ratio(now, scale), Against.VOLTAGE)


def against_loop(gain: Quantity, calibrated_gain: Quantity) -> Verdict:
    """Compare a loop's gain with the calibrated one: only the product of output and input gain is seen."""
    moved = ratio(named_scatter(gain, "comparison"), named_scatter(calibrated_gain, "calibration"))
    return _verdict(moved, Against.LOOP)


def _verdict(moved: Quantity, against: Against) -> Verdict:
    return Verdict(db(moved.value), DB_PER_RELATIVE * expanded(moved), against)


def refuse_moved(verdict: Verdict, reading: Reading) -> None:
    """Accept a gain that is still the same.

    Raises:
        WrongUseError: it has moved; the line says by how much, and what to do.
    """
    if not verdict.same:
        raise WrongUseError(
            f"the gain of input {reading.channel} has moved by {verdict.moved_db:+.2f} dB since it was calibrated "
            f"(±{verdict.allowed_db:.2f} dB can be told, against {verdict.against}); turn the knob back, or calibrate "
            "anew"
        )
