"""One divider from an amplifier's terminal to an input: two resistors in series, two in parallel to ground, the input.

All of it is Ohm's law; voltages are referred to the interface's ground.
"""

import math
from collections.abc import Iterator
from enum import StrEnum

import attrs

UPPER = ("R1a", "R1b")
LOWER = ("R2a", "R2b")


def parallel(ohms: tuple[float, ...]) -> float:
    """Return the resistance of resistors in parallel; infinite for none, zero where one is shorted."""
    if any(ohm == 0.0 for ohm in ohms):
        return 0.0
    conductance = math.fsum(1.0 / ohm for ohm in ohms)
    return 1.0 / conductance if conductance else math.inf


@attrs.frozen
class Leg:
    """`upper_ohm` are in series, `lower_ohm` in parallel from the pin to ground; `input_ohm` is the input's own there.

    A shorted part has 0 Ω, an open one infinitely many. An input without resistance of its own has infinitely many.
    """

    upper_ohm: tuple[float, ...]
    lower_ohm: tuple[float, ...]
    input_ohm: float

    @property
    def series_ohm(self) -> float:
        """All that stands between terminal and pin."""
        return math.fsum(self.upper_ohm)

    @property
    def loaded_ohm(self) -> float:
        """All that stands between pin and ground, the input included."""
        return parallel((*self.lower_ohm, self.input_ohm))

    @property
    def gain(self) -> float:
        """Volts at the pin over volts at the terminal."""
        if math.isinf(self.loaded_ohm):
            return 1.0
        return self.loaded_ohm / (self.series_ohm + self.loaded_ohm)

    @property
    def ratio(self) -> float:
        """Volts at the terminal over volts at the pin."""
        return 1.0 / self.gain if self.gain else math.inf

    @property
    def source_ohm(self) -> float:
        """What the cable and the input are fed from: R1 parallel to R2."""
        return parallel((self.series_ohm, *self.lower_ohm))

    @property
    def node_ohm(self) -> float:
        """What the pin stands on: R1, R2 and the input in parallel."""
        return parallel((self.series_ohm, self.loaded_ohm))

    def toleranced(self, tolerance: float, input_tolerance: float, *, most: bool) -> "Leg":
        """Return the leg with each part at that end of its tolerance that lets `most` through, or least.

        The gain rises with every lower part and the input and falls with every upper part, so these are the extremes.
        """
        up = 1.0 + (tolerance if most else -tolerance)
        down = 1.0 - (tolerance if most else -tolerance)
        return Leg(
            tuple(ohm * down for ohm in self.upper_ohm),
            tuple(ohm * up for ohm in self.lower_ohm),
            self.input_ohm * (1.0 + (input_tolerance if most else -input_tolerance)),
        )

    def sensitivities(self) -> tuple[tuple[str, float], ...]:
        """Return for each part, and for "input impedance", how the gain moves: d ln gain / d ln R."""
        share = self.series_ohm / (self.series_ohm + self.loaded_ohm)
        upper = [(name, -share * ohm / self.series_ohm) for name, ohm in zip(UPPER, self.upper_ohm, strict=False)]
        lower = [(name, share * self.loaded_ohm / ohm) for name, ohm in zip(LOWER, self.lower_ohm, strict=False)]
        return (*upper, *lower, ("input impedance", share * self.loaded_ohm / self.input_ohm))

    def voltages(self, terminal_v: float) -> tuple[tuple[str, float], ...]:
        """Return the voltage across each part that is neither open nor shorted, `terminal_v` being at the terminal."""
        current = terminal_v / (self.series_ohm + self.loaded_ohm)
        upper = [(name, _across(current, ohm)) for name, ohm in zip(UPPER, self.upper_ohm, strict=False)]
        pin = terminal_v * self.gain
        lower = [(name, pin if 0.0 < ohm < math.inf else 0.0) for name, ohm in zip(LOWER, self.lower_ohm, strict=False)]
        return (*upper, *lower)

    def heat(self, terminal_v: float) -> tuple[tuple[str, float], ...]:
        """Return the power in each part, W, for the r.m.s. of what stands at the terminal."""
        ohms = dict((*zip(UPPER, self.upper_ohm, strict=False), *zip(LOWER, self.lower_ohm, strict=False)))
        return tuple((name, v * v / ohms[name] if v else 0.0) for name, v in self.voltages(terminal_v))


class Kind(StrEnum):
    """How a part fails."""

    OPEN = "open"
    SHORT = "short"


def single_faults(leg: Leg) -> Iterator[tuple[str, Kind, Leg]]:
    """Yield each part's name, how it fails, and the leg that is left."""
    for kind, ohm in ((Kind.OPEN, math.inf), (Kind.SHORT, 0.0)):
        for k, name in zip(range(len(leg.upper_ohm)), UPPER, strict=False):
            yield name, kind, attrs.evolve(leg, upper_ohm=_replaced(leg.upper_ohm, k, ohm))
        for k, name in zip(range(len(leg.lower_ohm)), LOWER, strict=False):
            yield name, kind, attrs.evolve(leg, lower_ohm=_replaced(leg.lower_ohm, k, ohm))


def _across(current: float, ohm: float) -> float:
    return current * ohm if current else 0.0


def _replaced(ohms: tuple[float, ...], place: int, ohm: float) -> tuple[float, ...]:
    return (*ohms[:place], ohm, *ohms[place + 1 :])
