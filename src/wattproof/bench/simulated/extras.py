"""What else the simulated amplifier can be given: tone controls, filters, a bad control, crosstalk, a turned polarity.

All of it is neutral until it is turned. Filters are first and second orders in closed form, brought to the raised rate
by the bilinear transform, so that their true response is the prototype's at the frequency (fs/π)·tan(πf/fs).
"""

import math
from collections.abc import Mapping
from types import MappingProxyType

import attrs
import numpy as np

from wattproof.bench.protocol import Control
from wattproof.core.signal import Samples

BASS_HZ, TREBLE_HZ, RUMBLE_HZ = 150.0, 4_000.0, 20.0
LOUDNESS_BASS_HZ, LOUDNESS_TREBLE_HZ = 100.0, 8_000.0
LOUDNESS_BASS_DB, LOUDNESS_TREBLE_DB = 9.0, 3.0
FILTER_H, FILTER_F = 20e-6, 0.68e-6  # of the class-D output filter, both legs together
CROSS_HZ, CROSS_RISE, CROSS_BACK = 30_000.0, 10.0, 0.5  # capacitive share, and the way from right to left
NO_CROSSTALK_DB = -120.0
SUPPLY_IDLE_W, SUPPLY_EFFICIENCY = 2.4, 0.88  # what the supply gives at rest, and for each watt delivered beyond that

Coefficients = tuple[tuple[float, ...], tuple[float, ...]]  # numerator and denominator in s, highest power first


def _switch(name: str, label: str, text: str) -> Control:
    return Control(name, label, "", 0.0, 1.0, 0.0, text, (0.0, 1.0))


CONTROLS = (
    Control("bass", "Bass", "dB", -12.0, 12.0, 0.0, "shelf of the first order about 150 Hz"),
    Control("treble", "Treble", "dB", -12.0, 12.0, 0.0, "shelf of the first order about 4 kHz"),
    _switch("loudness", "Loudness", "lifts bass and a little treble"),
    _switch("rumble", "Rumble filter", "high-pass of the second order at 20 Hz"),
    _switch("filter", "Output filter", "coil and capacitor of a class-D output, before the load"),
    Control("balance", "Balance", "dB", -6.0, 6.0, 0.0, "right over left"),
    Control("mistrack", "Mistracking", "dB", -6.0, 6.0, 0.0, "right over left with the knob at -60 dB"),
    _switch("one-sided", "One-sided control", "the knob turns the left channel only"),
    _switch("inverting", "Inverting", "the amplifier turns the polarity"),
    Control("crosstalk", "Crosstalk", "dB", NO_CROSSTALK_DB, -20.0, NO_CROSSTALK_DB, "from left to right, far down"),
)  # fmt: skip


def shelf_low(gain_db: float, corner_hz: float) -> Coefficients:
    """Return (s + ω√G)/(s + ω/√G): G at the bottom, 1 at the top."""
    root, corner = 10.0 ** (gain_db / 40.0), 2.0 * math.pi * corner_hz
    return (1.0, corner * root), (1.0, corner / root)


def shelf_high(gain_db: float, corner_hz: float) -> Coefficients:
    """Return (s√G + ω)/(s/√G + ω): 1 at the bottom, G at the top."""
    root, corner = 10.0 ** (gain_db / 40.0), 2.0 * math.pi * corner_hz
    return (root, corner), (1.0 / root, corner)


def high_pass(corner_hz: float) -> Coefficients:
    """Return a Butterworth high-pass of the second order."""
    corner = 2.0 * math.pi * corner_hz
    return (1.0, 0.0, 0.0), (1.0, math.sqrt(2.0) * corner, corner * corner)


def output_filter(load_ohm: float, output_ohm: float) -> Coefficients:
    """Return what coil and capacitor make of the voltage at the load, relative to that without both."""
    whole = load_ohm + output_ohm
    return (whole,), (FILTER_H * load_ohm * FILTER_F, FILTER_H + output_ohm * load_ohm * FILTER_F, whole)


def rising(corner_hz: float) -> Coefficients:
    """Return s/(s + ω)."""
    return (1.0, 0.0), (1.0, 2.0 * math.pi * corner_hz)


class Section:
    """One filter of the first or second order over chunks of shape (channels, frames)."""

    def __init__(self, prototype: Coefficients, rate_hz: float, channels: int) -> None:
        from scipy.signal import bilinear  # noqa: PLC0415 - costs a second, which only who turns these controls pays

        self._b, self._a = bilinear(*prototype, fs=rate_hz)
        self._state = np.zeros((channels, len(self._a) - 1))

    def push(self, chunk: Samples) -> Samples:
        """Return the next chunk, filtered."""
        from scipy.signal import lfilter  # noqa: PLC0415 - likewise

        filtered, self._state = lfilter(self._b, self._a, chunk, axis=1, zi=self._state)
        return np.asarray(filtered, dtype=np.float64)


@attrs.define(eq=False)
class Extras:
    """The settings as they stand, and the filters that they ask for. One thread at a time may use it."""

    rate_hz: float  # the raised one
    channels: int
    settings: dict[str, float] = attrs.field(factory=lambda: {each.name: each.value for each in CONTROLS})
    held_gain: float | None = None  # of the right channel, where the knob does not reach it
    _tone: list[Section] = attrs.field(factory=list)
    _output: dict[float, Section] = attrs.field(factory=dict)
    _cross: Section | None = None

    def set(self, name: str, value: float, knob_gain: float) -> None:
        """Take a setting; `knob_gain` is where the knob stands."""
        self.settings[name] = value
        if name == "one-sided":
            self.held_gain = knob_gain if value else None
        if name in {"bass", "treble", "loudness", "rumble"}:
            wanted = tone_prototypes(self.settings)
            self._tone = [Section(each, self.rate_hz, self.channels) for each in wanted]

    def tracks(self, gain: float | Samples) -> float | Samples:
        """Return the knob's gain for each channel, shape (channels, frames or 1); as it was where both are alike."""
        settings = self.settings
        if not (settings["balance"] or settings["mistrack"] or settings["inverting"] or self.held_gain is not None):
            return gain
        left = np.atleast_1d(np.asarray(gain, dtype=np.float64))
        right = left ** (1.0 - settings["mistrack"] / 60.0) if self.held_gain is None else np.full(1, self.held_gain)
        right = right * 10.0 ** (settings["balance"] / 20.0)
        sign = -1.0 if settings["inverting"] else 1.0
        return sign * np.stack(np.broadcast_arrays(left, right))

    def toned(self, volts: Samples) -> Samples:
        """Return what the tone controls and filters before the output stage make of a chunk."""
        for section in self._tone:
            volts = section.push(volts)
        return volts

    def delivered(self, volts: Samples, load_ohm: float, output_ohm: float) -> Samples:
        """Return what reaches the terminals: through the output filter, with the neighbour's share added."""
        if self.settings["filter"]:
            if load_ohm not in self._output:
                prototype = output_filter(load_ohm, output_ohm)
                self._output = {load_ohm: Section(prototype, self.rate_hz, self.channels)}
            volts = self._output[load_ohm].push(volts)
        if self.settings["crosstalk"] > NO_CROSSTALK_DB:
            self._cross = self._cross or Section(rising(CROSS_HZ), self.rate_hz, self.channels)
            share = 10.0 ** (self.settings["crosstalk"] / 20.0) * np.array([[CROSS_BACK], [1.0]])
            other = volts[::-1]
            volts = volts + share * (other + CROSS_RISE * self._cross.push(other))
        return volts


def tone_prototypes(settings: Mapping[str, float]) -> tuple[Coefficients, ...]:
    """Return the filters that settings ask for, in order; none for what is neutral."""
    found = []
    if settings.get("bass"):
        found.append(shelf_low(settings["bass"], BASS_HZ))
    if settings.get("treble"):
        found.append(shelf_high(settings["treble"], TREBLE_HZ))
    if settings.get("loudness"):
        found.append(shelf_low(LOUDNESS_BASS_DB, LOUDNESS_BASS_HZ))
        found.append(shelf_high(LOUDNESS_TREBLE_DB, LOUDNESS_TREBLE_HZ))
    if settings.get("rumble"):
        found.append(high_pass(RUMBLE_HZ))
    return tuple(found)


BY_NAME: Mapping[str, Control] = MappingProxyType({each.name: each for each in CONTROLS})
