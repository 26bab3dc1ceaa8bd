"""What the simulated amplifiers truly deliver, from their curves alone. Only tests use it.

One period of the terminal voltage is transformed on a dense grid, so its harmonics are exact to the grid's aliases; no
sampling rate, filter, fit or window is involved, and nothing of the measurement is used.
"""

import math

import attrs
import numpy as np

from wattproof.bench.simulated.chain import GAIN_MATCH, HUM_MATCH, LIMIT_MATCH
from wattproof.bench.simulated.characters import Character, Electrical, character_named
from wattproof.bench.simulated.clipping import Clipper
from wattproof.bench.simulated.extras import (
    CROSS_BACK,
    CROSS_HZ,
    CROSS_RISE,
    FILTER_F,
    FILTER_H,
    Coefficients,
    output_filter,
    rising,
)

POINTS = 1 << 15  # samples of one period: a clipped sine's harmonics alias below 1e-8
BISECTIONS = 40
ROUNDS = 40  # of a settling supply: each leaves a twentieth of the error, or less
SINE = np.sin(2.0 * np.pi * np.arange(POINTS) / POINTS)


@attrs.frozen
class Truth:
    """One channel of one amplifier with one load and supply, driven at one frequency and read in one band.

    Values are settled: a supply that sags has done so under this channel and the others that are `driven` as far.
    """

    character: str | Character
    load_ohm: float = 8.0
    supply_v: float | None = None
    channel: int = 1
    frequency_hz: float = 997.0
    band_hz: tuple[float, float] = (20.0, 20_000.0)
    driven: tuple[int, ...] = ()  # the channels that sound; without any this one alone

    @property
    def gain(self) -> float:
        """V at the terminals per V at the interface's output, small and with the knob at full."""
        return float(GAIN_MATCH[self.channel - 1, 0]) * self._electrical.gain

    @property
    def onset_vrms(self) -> float:
        """Output at the onset of clipping: the largest sine that stays on the straight part of the curve."""
        return self.at(self._onset_peak_v)[0]

    def at(self, wanted_peak_v: float) -> tuple[float, float]:
        """Return (V rms in the band, THD+N to the total) for a wanted sine of that peak, noise and hum included."""
        upper_v, lower_v = self._sagged_limits_v(self.droop_v(wanted_peak_v))
        wave = self._kind.curve(wanted_peak_v * SINE, upper_v, lower_v)
        harmonics_vrms = np.abs(np.fft.rfft(wave)[1:]) / POINTS * math.sqrt(2.0)
        frequencies_hz = self.frequency_hz * np.arange(1, harmonics_vrms.size + 1)
        inside = (frequencies_hz >= self.band_hz[0]) & (frequencies_hz <= self.band_hz[1])
        squares = np.where(inside, harmonics_vrms**2, 0.0)
        rest = float(squares[1:].sum()) + self._added_vrms**2
        total = float(squares[0]) + rest
        return math.sqrt(total), math.sqrt(rest / total)

    def vrms_at_thdn(self, thdn: float) -> float:
        """Return the output (V rms in the band) at which THD+N, rising with the drive beyond the onset, is thdn."""
        low_v = self._onset_peak_v
        high_v = 6.0 * max(self._limits_v)
        if not self.at(low_v)[1] < thdn < self.at(high_v)[1]:
            raise ValueError(
                f"{self._kind.name} does not pass a THD+N of {thdn:g} between onset and six times its limit"
            )
        for _ in range(BISECTIONS):
            middle_v = 0.5 * (low_v + high_v)
            low_v, high_v = (middle_v, high_v) if self.at(middle_v)[1] < thdn else (low_v, middle_v)
        return self.at(low_v)[0]

    def droop_v(self, wanted_peak_v: float) -> float:
        """Return by how much the supply has settled below itself while a sine of that peak is wanted."""
        kind, droop_v = self._kind, 0.0
        if not kind.sag_ohm:
            return 0.0
        for _ in range(ROUNDS):
            mean_v = 0.0
            for channel in self.driven or (self.channel,):
                own = attrs.evolve(self, channel=channel)
                peak_v = wanted_peak_v * own.gain / self.gain
                upper_v, lower_v = own._sagged_limits_v(droop_v)  # noqa: SLF001 - another of its own kind
                mean_v += float(np.abs(kind.curve(peak_v * SINE, upper_v, lower_v)).mean())
            before_v, droop_v = droop_v, kind.sag_ohm * mean_v / self.load_ohm
            if abs(droop_v - before_v) < 1e-9:
                break
        return droop_v

    @property
    def _onset_peak_v(self) -> float:
        """Return the peak of the largest sine that stays on the straight part, once the supply has settled."""
        peak_v = min(self._limits_v) * (1.0 - self._kind.knee)
        for _ in range(ROUNDS if self._kind.sag_ohm else 0):
            peak_v = min(self._sagged_limits_v(self.droop_v(peak_v))) * (1.0 - self._kind.knee)
        return peak_v

    def _sagged_limits_v(self, droop_v: float) -> tuple[float, float]:
        supply_v = self._kind.supply_v if self.supply_v is None else self.supply_v
        factor = self._kind.sagged(self.load_ohm, supply_v, droop_v)
        upper_v, lower_v = self._limits_v
        return factor * upper_v, factor * lower_v

    @property
    def _kind(self) -> Character:
        return character_named(self.character)

    @property
    def _electrical(self) -> Electrical:
        supply_v = self._kind.supply_v if self.supply_v is None else self.supply_v
        return self._kind.electrical(self.load_ohm, supply_v)

    @property
    def _limits_v(self) -> tuple[float, float]:
        match = float(LIMIT_MATCH[self.channel - 1, 0])
        return match * self._electrical.upper_v, match * self._electrical.lower_v

    @property
    def _added_vrms(self) -> float:
        """Noise and hum in the band: white noise as stated for 20 kHz, hum as stated by line."""
        noise_vrms = self._kind.noise_vrms * math.sqrt((self.band_hz[1] - self.band_hz[0]) / 20_000.0)
        match = float(HUM_MATCH[self.channel - 1, 0])
        return math.hypot(noise_vrms, *(match * vrms for _, vrms in self._kind.hum))


RAISED_HZ = 768_000.0  # the rate at which the filters of `extras` run, for a bench of 96 kHz


def delayed(frequency_hz: float, raised_hz: float = RAISED_HZ) -> complex:
    """Return what the amplifier's own delay does: its limiter looks ahead by a few frames of the raised rate."""
    return complex(np.exp(-2j * math.pi * frequency_hz * Clipper.LATE / raised_hz))


def filtered(prototypes: tuple[Coefficients, ...], frequency_hz: float, raised_hz: float = RAISED_HZ) -> complex:
    """Return the true gain of filters in a row: the prototypes where the bilinear transform maps the frequency."""
    s = 2j * raised_hz * math.tan(math.pi * frequency_hz / raised_hz)
    gain: complex = 1.0 + 0.0j
    for top, bottom in prototypes:
        gain *= complex(np.polyval(top, s)) / complex(np.polyval(bottom, s))
    return gain


def with_output_filter(load_ohm: float, output_ohm: float, frequency_hz: float) -> complex:
    """Return what the output filter makes of the voltage at a load, over that without it."""
    return filtered((output_filter(load_ohm, output_ohm),), frequency_hz)


def output_impedance(output_ohm: float, frequency_hz: float, raised_hz: float = RAISED_HZ) -> complex:
    """Return the impedance that the terminals show with the output filter in: (Ro + sL) parallel to C, in ohm."""
    s = 2j * raised_hz * math.tan(math.pi * frequency_hz / raised_hz)
    series = output_ohm + s * FILTER_H
    return series / (1.0 + series * s * FILTER_F)


def crosstalk(share_db: float, frequency_hz: float, *, back: bool, raised_hz: float = RAISED_HZ) -> complex:
    """Return what one channel lets into the other as a ratio; `back` is the way from right to left."""
    share = 10.0 ** (share_db / 20.0) * (CROSS_BACK if back else 1.0)
    return complex(share * (1.0 + CROSS_RISE * filtered((rising(CROSS_HZ),), frequency_hz, raised_hz)))
