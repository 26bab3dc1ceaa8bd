"""From the tone to the captured codes, chunk by chunk: output converter, amplifier, load, divider, input converter."""

import math
from collections import deque

import numpy as np

from wattproof.bench.simulated.characters import Character, Electrical
from wattproof.bench.simulated.clipping import Clipper
from wattproof.bench.simulated.extras import Extras
from wattproof.bench.simulated.interface import Interface, bent, noise_sigma, quantised
from wattproof.bench.simulated.knob import Knob
from wattproof.bench.simulated.oversampling import DELAY_FRAMES, Downsampler, Upsampler
from wattproof.bench.simulated.phase import lines
from wattproof.bench.simulated.recursion import Smoother
from wattproof.bench.simulated.source import RAMP_S, Source
from wattproof.bench.simulated.table import Table
from wattproof.core.signal import Samples

CHANNELS = 2
GAIN_MATCH = np.array([[1.0], [0.983]])  # the channels of one amplifier are never quite alike
LIMIT_MATCH = np.array([[1.0], [0.996]])
HUM_MATCH = np.array([[1.0], [1.3]])
SQRT2 = math.sqrt(2.0)
SAG_LOOKS = 8  # each so many samples of the raised rate count for the mean current
SUPPLY_LOOKS = 64  # chunks over which a meter at the supply averages: half a second and more
HIGH_RATE_CHUNK = 8192  # frames of a chunk at the raised rate


def chunk_frames(rate_hz: float) -> int:
    """Return the size of a chunk: the power of two that holds a whole ramp."""
    return 1 << math.ceil(math.log2(RAMP_S * rate_hz))


class Chain:
    """Everything between the samples played and the samples captured. One thread at a time may use it."""

    def __init__(self, character: Character, interface: Interface, rate_hz: float, seed: int, mains_hz: float) -> None:
        self.frames = chunk_frames(rate_hz)
        self._character, self._interface, self._rate_hz, self._seed = character, interface, rate_hz, seed
        factor = HIGH_RATE_CHUNK // self.frames
        self.source = Source(CHANNELS, rate_hz, 1.0 + interface.clock_offset_ppm * 1e-6)
        self.knob = Knob(0.0, rate_hz, self.frames, character.scratches)
        self.load_ohm, self.supply_v = 8.0, character.supply_v
        self._now = character.electrical(self.load_ohm, self.supply_v)
        self._droop_v = 0.0
        self.delivered_w: deque[float] = deque([0.0], maxlen=SUPPLY_LOOKS)
        self._delay: Samples = np.zeros((CHANNELS, interface.latency_frames - 2 * DELAY_FRAMES))
        self._up = Upsampler(CHANNELS, self.frames, factor)
        self._clipper = Clipper(CHANNELS, character.knee)
        self._down = Downsampler(CHANNELS, self.frames, factor)
        self.extras = Extras(rate_hz * factor, CHANNELS)
        coupling_frames = rate_hz / (2.0 * math.pi * interface.coupling_hz)
        self._coupling = Smoother(coupling_frames, self.frames, (CHANNELS,))
        self._fade = np.arange(1, HIGH_RATE_CHUNK + 1) / HIGH_RATE_CHUNK
        self._frame_at_high_rate = np.arange(1, HIGH_RATE_CHUNK + 1) / factor
        self._hum = tuple((mains_hz * multiple, vrms * SQRT2) for multiple, vrms in character.hum)
        self._residue = tuple((hz, vrms * SQRT2) for hz, vrms in character.residue)
        own_hum = interface.input_hum
        self._own_hum = tuple((mains_hz * multiple, rms_fs) for multiple, rms_fs in own_hum)
        self.table = Table()
        self._captured: Samples = np.zeros((CHANNELS, self.frames))

    def chunk(self, index: int) -> Samples:
        """Return the captured codes of chunk `index` as floats, shape (frames, channels). Each follows the last."""
        first_frame = index * self.frames
        dice = np.random.Generator(np.random.Philox(key=self._seed, counter=[0, 0, index, 0]))
        played = self._delayed(self._converted_out(first_frame, dice))
        volts = self._joined(self._up.push(played))
        volts *= 1.0 / self._full_scale_v
        captured = self._down.push(bent(volts, self._interface.input_harmonics))
        captured += self._added(first_frame, dice) / self._full_scale_v
        captured += lines(self._own_hum, self._rate_hz, first_frame, self.frames)
        captured += self._interface.crosstalk * captured[::-1]
        captured -= self._coupling.push(captured)
        captured *= self._coupling.high_pass_gain
        captured += self._interface.input_offset_fs
        self._captured = quantised(captured, dice)
        return np.ascontiguousarray(self._captured.T)

    @property
    def _full_scale_v(self) -> float:
        """Peak voltage at the amplifier's terminals that drives an input to full scale."""
        return self._interface.input_full_scale_vrms * SQRT2 * self._interface.attenuator_ratio

    def _converted_out(self, first_frame: int, dice: np.random.Generator) -> Samples:
        played = self.source.chunk(first_frame, self.frames)
        if self.table.mistake.monitoring:
            played += self.table.mistake.monitoring * self._captured
        codes = quantised(played, dice)
        sigma = noise_sigma(self._interface.output_noise_fs, self._rate_hz) / SQRT2
        codes += sigma * dice.standard_normal(codes.shape, dtype=np.float32)
        return codes

    def _joined(self, samples: Samples) -> Samples:
        """Return the voltages before the divider, whatever the outputs are plugged into."""
        if not self.table.is_loop:
            return self._amplified(samples * 0.0 if self.table.is_terminated else samples)
        output_v = bent(samples, self._interface.output_harmonics)
        output_v *= self._interface.output_full_scale_vrms * SQRT2
        return self.table.joined(output_v, self._interface.attenuator_ratio)

    def _delayed(self, samples: Samples) -> Samples:
        line = np.concatenate([self._delay, samples], axis=1)
        self._delay = line[:, self.frames :]
        return line[:, : self.frames]

    def _amplified(self, samples: Samples) -> Samples:
        """Return terminal voltages at the raised rate for output samples in full-scale units."""
        after = self._character.electrical(self.load_ohm, self.supply_v)
        before, self._now = self._now, after
        scale = self._interface.output_full_scale_vrms * SQRT2 * self._knob_gain()
        wanted_v = bent(samples, self._interface.output_harmonics)
        wanted_v *= GAIN_MATCH * (scale * self._between(before, after, "gain"))
        wanted_v = self.extras.toned(wanted_v)
        match = LIMIT_MATCH * self._character.sagged(self.load_ohm, self.supply_v, self._droop_v)
        upper_v = match * self._between(before, after, "upper_v")
        lower_v = match * self._between(before, after, "lower_v")
        volts = self._character.bent(self._clipper.push(wanted_v, upper_v, lower_v), upper_v)
        volts = self.extras.delivered(volts, self.load_ohm, self._character.output_ohm)
        self.delivered_w.append(float(np.square(volts).mean(axis=1).sum()) / self.load_ohm)
        if self._character.sag_ohm:
            self._sag(volts)
        return volts

    def _sag(self, volts: Samples) -> None:
        """Let the supply follow the mean current that both channels draw over a chunk."""
        mean_a = float(np.abs(volts[:, ::SAG_LOOKS]).mean(axis=1).sum()) / self.load_ohm
        share = 1.0 - math.exp(-self.frames / self._rate_hz / self._character.sag_s)
        self._droop_v += share * (self._character.sag_ohm * mean_a - self._droop_v)

    def _between(self, before: Electrical, after: Electrical, name: str) -> float | Samples:
        """Return one electrical property over a chunk: a straight way where load or supply were changed."""
        start, end = float(getattr(before, name)), float(getattr(after, name))
        return end if start == end else start + (end - start) * self._fade

    def _knob_gain(self) -> float | Samples:
        gains = self.knob.gains()
        if not isinstance(gains, float):
            gains = np.interp(self._frame_at_high_rate, np.arange(1, self.frames + 1), gains)
        return self.extras.tracks(gains)

    def _added(self, first_frame: int, dice: np.random.Generator) -> Samples:
        """Return what amplifier and input add by themselves, in V at the terminals: noise, hum, residue, offset."""
        input_noise_vrms = self._interface.input_noise_fs * self._full_scale_v / SQRT2  # as seen at the terminals
        noise_vrms = (
            input_noise_vrms if self.table.is_loop else math.hypot(self._character.noise_vrms, input_noise_vrms)
        )
        added: Samples = np.zeros((CHANNELS, self.frames))
        added += noise_sigma(noise_vrms, self._rate_hz) * dice.standard_normal(added.shape, dtype=np.float32)
        if self.table.is_loop:
            return np.asarray(added, dtype=np.float64)
        added += HUM_MATCH * lines(self._hum, self._rate_hz, first_frame, self.frames)
        added += lines(self._residue, self._rate_hz, first_frame, self.frames)
        added += self._character.offset_v * HUM_MATCH
        return added
