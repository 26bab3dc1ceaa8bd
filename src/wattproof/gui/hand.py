"""Turns the bench's own controls as a hand does: a knob glides where the bench can let it, it never jumps."""

from collections.abc import Callable

from wattproof.bench.protocol import Bench, Control
from wattproof.gui.stations import knob_of

FINE, COARSE = 0.01, 0.05  # of the knob's range, for one step of wheel or key
_SLOWEST, _FASTEST = 0.5, 20.0  # per second, in the knob's unit (dB): what a reading follows
_APPROACH_S = 0.35  # the time constant of the way to the target
_EASING = 0.3  # of a wanted change of speed, per frame: the level bends where it would break, and reads as distortion
_STEADY = 0.2  # a speed that is this near to the wanted one is kept: every change of speed is a small break
_THERE = 0.002  # of the range


Glide = Callable[[str, float, float], None]  # control, target, rate per second


class Hand:
    """The hand on a bench's controls. It remembers where the knob is being turned to while it is on its way."""

    def __init__(self, bench: Bench) -> None:
        self._bench = bench
        self._target: float | None = None
        self._per_second = 0.0
        self._glide: Glide | None = getattr(bench, "glide", None)

    @property
    def knob(self) -> Control | None:
        """The amplifier's knob, where the bench has one."""
        return knob_of(self._bench.controls)

    def turn(self, name: str, value: float) -> None:
        """Set a control.

        Raises:
            WrongUseError: no such control, or a value outside its range.
        """
        knob = self.knob
        if knob is None or name != knob.name or self._glide is None:
            self._bench.turn(name, value)
        else:
            self._send(self._glide, knob, value)
            self._target = value

    def follow(self) -> None:
        """Let the knob go on its way; called on every frame."""
        knob = self.knob
        if knob is None or self._target is None or self._glide is None:
            return
        if abs(self._target - knob.value) < _THERE * (knob.maximum - knob.minimum):
            self._target = None
            self._per_second = 0.0
        else:
            self._send(self._glide, knob, self._target)

    def _send(self, glide: Glide, knob: Control, target: float) -> None:
        wanted = min(abs(target - knob.value) / _APPROACH_S, _FASTEST)
        if abs(wanted - self._per_second) > _STEADY * self._per_second:
            self._per_second += _EASING * (wanted - self._per_second)
        elif target == self._target:
            return
        self._per_second = max(_SLOWEST, self._per_second)
        glide(knob.name, target, self._per_second)

    def let_go(self) -> None:
        """Take the hand off: whoever turns from now on is not hindered."""
        self._target, self._per_second = None, 0.0

    def nudge(self, steps: float) -> None:
        """Turn the knob by steps of a hundredth of its range, from where it is being turned to."""
        knob = self.knob
        if knob is None:
            return
        span = knob.maximum - knob.minimum
        start = knob.value if self._target is None else self._target
        wanted = start + steps * FINE * span
        self.turn(knob.name, min(max(wanted, knob.minimum), knob.maximum))
