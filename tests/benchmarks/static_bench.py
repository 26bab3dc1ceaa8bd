"""A table drawn at random, as arithmetic: interface, attenuator, load, meter and amplifier, each with its own errors.

It is the truth of the coverage benchmark and shares no code with what is measured: sums of sines and noise, Ohm's law,
and the level law of a converter's harmonics. Figures are invented within what the trade meets.
"""

import math

import attrs
import numpy as np
from numpy.typing import NDArray

Samples = NDArray[np.float64]

RATE_HZ = 48_000.0
FRAMES = 12_000  # 0.25 s
TONE_HZ = 997.0
BAND_HZ = 19_980.0  # 20 Hz to 20 kHz
ORDERS = (2, 3, 4, 5)
MAINS_HZ = 50.0


def from_db(level_db: float) -> float:
    """Return a plain ratio."""
    return float(10.0 ** (level_db / 20.0))


@attrs.frozen
class Converter:
    """One converter: its harmonics at full scale as complex ratios, by order; white noise in the band; a low-pass."""

    harmonics: dict[int, complex]
    noise_fs: float
    pole_hz: float

    def ratio(self, order: int, level_fs: float) -> complex:
        """Return its order-k product over the fundamental at a level: it falls with the (k − 1)th power."""
        return self.harmonics[order] * level_fs ** (order - 1)

    def gain(self, frequency_hz: float) -> complex:
        """Return its response, one pole."""
        return 1.0 / (1.0 + 1j * frequency_hz / self.pole_hz)


@attrs.frozen
class Amplifier:
    """What the amplifier truly puts on its terminals: V rms of the fundamental, complex ratios, noise, hum."""

    fundamental_vrms: float
    harmonics: dict[int, complex]
    noise: float
    hum: float  # one line at twice the mains

    @property
    def thd(self) -> float:
        """Harmonics over the fundamental."""
        return math.sqrt(sum(abs(z) ** 2 for z in self.harmonics.values()))

    @property
    def rest(self) -> float:
        """Everything but the fundamental, over it."""
        return math.sqrt(self.thd**2 + self.noise**2 + self.hum**2)

    @property
    def level_vrms(self) -> float:
        """All of it."""
        return self.fundamental_vrms * math.hypot(1.0, self.rest)


@attrs.frozen
class Divider:
    """A divider's parts as they are, in Ω."""

    upper_ohm: tuple[float, float]
    lower_ohm: tuple[float, float]
    input_ohm: float

    @property
    def ratio(self) -> float:
        """Volts in over volts out."""
        below = 1.0 / (sum(1.0 / ohm for ohm in self.lower_ohm) + 1.0 / self.input_ohm)
        return (sum(self.upper_ohm) + below) / below


@attrs.frozen
class Meter:
    """A voltmeter's data sheet, and its own error as a share of what that allows."""

    percent: float
    digits: float
    step_v: float
    error: float  # −1 … 1

    def shows(self, true_vrms: float) -> float:
        """Return what it shows, in whole steps."""
        off = self.error * (self.percent / 100.0 * true_vrms + self.digits * self.step_v)
        return round((true_vrms + off) / self.step_v) * self.step_v


@attrs.frozen
class Table:
    """One table: nominal values as a person knows them, and the true ones."""

    out: Converter
    into: Converter
    out_vrms: float
    in_vrms: float
    nominal: Divider
    true: Divider
    tolerance: float
    input_tolerance: float
    load_ohm: float
    load_measured_ohm: float
    load_accuracy: float
    meter: Meter
    amplifier: Amplifier
    drive_fs: float
    turn: dict[int, float]  # by how much the amplifier turns the converter-out's products, rad

    @property
    def gain(self) -> float:
        """Full scales captured per full scale played, joined directly."""
        return self.out_vrms / self.in_vrms

    @property
    def input_fs(self) -> float:
        """The amplifier's fundamental at the input, to full scale."""
        return self.amplifier.fundamental_vrms / self.true.ratio / self.in_vrms

    def worst(self, order: int) -> float:
        """Return |out| + |in| of one order at the levels of the reading, the true worst case."""
        return abs(self.out.ratio(order, self.drive_fs)) + abs(self.into.ratio(order, self.input_fs))

    def loop(self, level_fs: float, frequency_hz: float, rng: np.random.Generator, *, pad: bool) -> Samples:
        """Return a capture of the loop at a drive level, directly or through the divider."""
        at_input = level_fs * self.gain / (self.true.ratio if pad else 1.0)
        heard = {
            order: self.out.ratio(order, level_fs) + self.into.ratio(order, at_input * abs(self._both(frequency_hz)))
            for order in ORDERS
        }
        noise = math.hypot(self.into.noise_fs, self.out.noise_fs * at_input / level_fs if level_fs else 0.0)
        if level_fs == 0.0:
            noise = math.hypot(self.into.noise_fs, self.out.noise_fs * self.gain)
        lines = {order: z * self._both(order * frequency_hz) / self._both(frequency_hz) for order, z in heard.items()}
        return _wave(at_input * abs(self._both(frequency_hz)), frequency_hz, lines, noise, rng)

    def reading(self, rng: np.random.Generator) -> Samples:
        """Return a capture of the amplifier at work."""
        first = self.into.gain(TONE_HZ)
        level_fs = self.input_fs * abs(first)
        lines = {}
        for order in ORDERS:
            before = self.amplifier.harmonics[order] + self.out.ratio(order, self.drive_fs) * np.exp(
                1j * self.turn[order]
            )
            lines[order] = before * self.into.gain(order * TONE_HZ) / first + self.into.ratio(order, level_fs)
        noise = math.hypot(
            self.amplifier.noise * self.input_fs, self.into.noise_fs, self.out.noise_fs * self.input_fs / self.drive_fs
        )
        samples = _wave(level_fs, TONE_HZ, lines, noise, rng)
        at = np.arange(FRAMES) / RATE_HZ
        return np.asarray(
            samples + self.input_fs * self.amplifier.hum * np.sin(2.0 * np.pi * (2.0 * MAINS_HZ * at + rng.uniform())),
            dtype=np.float64,
        )

    def _both(self, frequency_hz: float) -> complex:
        return self.out.gain(frequency_hz) * self.into.gain(frequency_hz)

    def response(self, frequency_hz: Samples) -> NDArray[np.complex128]:
        """Return the loop's response at frequencies, as a sweep finds it."""
        return np.array([self._both(hz) for hz in frequency_hz.tolist()])


def _wave(
    level_fs: float, frequency_hz: float, lines: dict[int, complex], noise_fs: float, rng: np.random.Generator
) -> Samples:
    """Return sin θ + Σ |z|·sin(kθ + φ), at a level, with white noise of noise_fs in the band."""
    theta = 2.0 * np.pi * ((np.arange(FRAMES) * (frequency_hz / RATE_HZ) + rng.uniform()) % 1.0)
    turning = np.exp(1j * theta)
    power = turning
    wave = turning.imag.copy()
    for order in range(2, max(lines) + 1):
        power = power * turning
        if order in lines:
            wave += (lines[order] * power).imag  # |z|·sin(kθ + φ)
    sigma = noise_fs / math.sqrt(2.0) * math.sqrt(RATE_HZ / 2.0 / BAND_HZ)
    return np.asarray(level_fs * wave + sigma * rng.standard_normal(FRAMES), dtype=np.float64)


def draw(rng: np.random.Generator) -> Table:
    """Return a table drawn at random."""
    out_vrms, in_vrms = rng.uniform(0.8, 5.0), rng.uniform(1.0, 6.0)
    tolerance = float(rng.choice([0.001, 0.005, 0.01]))
    upper = float(rng.choice([4_700.0, 10_000.0, 22_000.0]))
    lower = upper / float(rng.uniform(4.0, 12.0))
    nominal = Divider((upper, upper), (lower, lower), float(rng.choice([10_000.0, 47_000.0, 1e6])))

    def part(ohm: float, limits: float) -> float:
        return ohm * (1.0 + limits * float(rng.uniform(-1.0, 1.0)))

    true = Divider(
        (part(upper, tolerance), part(upper, tolerance)),
        (part(lower, tolerance), part(lower, tolerance)),
        part(nominal.input_ohm, 0.2),
    )
    load_accuracy = float(rng.uniform(0.002, 0.006))
    load_ohm = part(float(rng.choice([4.0, 8.0])), 0.05)
    measured = load_ohm / (1.0 + load_accuracy * float(rng.uniform(-1.0, 1.0)))
    input_fs = from_db(rng.uniform(-20.0, -2.0))
    return Table(
        out=_converter(rng),
        into=_converter(rng),
        out_vrms=out_vrms,
        in_vrms=in_vrms,
        nominal=nominal,
        true=true,
        tolerance=tolerance,
        input_tolerance=0.2,
        load_ohm=load_ohm,
        load_measured_ohm=measured,
        load_accuracy=load_accuracy,
        meter=Meter(float(rng.uniform(0.2, 1.0)), float(rng.integers(2, 6)), 1e-3, float(rng.uniform(-1.0, 1.0))),
        amplifier=_amplifier(rng, input_fs * true.ratio * in_vrms),
        drive_fs=from_db(rng.uniform(-24.0, -8.0)),
        turn={order: float(rng.uniform(0.0, 2.0 * np.pi)) for order in ORDERS},
    )


def _phasor(rng: np.random.Generator, low_db: float, high_db: float) -> complex:
    return complex(from_db(rng.uniform(low_db, high_db)) * np.exp(2j * np.pi * rng.uniform()))


def _converter(rng: np.random.Generator) -> Converter:
    cleanest_db = float(rng.choice([-135.0, -118.0]))
    harmonics = {order: _phasor(rng, cleanest_db, cleanest_db + 23.0) for order in ORDERS}
    return Converter(harmonics, from_db(rng.uniform(-118.0, -100.0)), float(rng.uniform(80e3, 400e3)))


def _amplifier(rng: np.random.Generator, fundamental_vrms: float) -> Amplifier:
    """Return an amplifier from very clean to bad; a fifth of its harmonics are not there at all."""
    harmonics = {order: _phasor(rng, -110.0, -45.0) if rng.uniform() > 0.2 else 0j for order in ORDERS}
    hum = from_db(rng.uniform(-110.0, -75.0)) if rng.uniform() > 0.5 else 0.0
    return Amplifier(fundamental_vrms, harmonics, from_db(rng.uniform(-105.0, -55.0)), hum)
