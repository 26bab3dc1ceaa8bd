"""The simulated audio interface: what its converters add, and how its sockets and the divider are scaled."""

import math

import attrs
import numpy as np

from wattproof.core import checks
from wattproof.core.calibration import Calibration, Floor, Scale
from wattproof.core.quantity import Quantity
from wattproof.core.signal import Samples

BITS = 24
LSB = 2.0 ** (1 - BITS)
BAND_HZ = 20_000.0  # the band in which noise figures are stated
DECLARED = "declared by the simulator"


@attrs.frozen(kw_only=True)
class Interface:
    """An interface of two outputs and two inputs, and the divider before its inputs. The figures are invented.

    Harmonics are stated as ratios of the second and third to the fundamental at full scale; noise is rms to a
    full-scale sine, white, in 20 kHz.
    """

    output_full_scale_vrms: float = attrs.field(default=2.0, validator=checks.positive)
    input_full_scale_vrms: float = attrs.field(default=2.0, validator=checks.positive)
    attenuator_ratio: float = attrs.field(default=10.0, validator=checks.positive)
    latency_frames: int = attrs.field(default=1536, validator=checks.within(128, 1_000_000))
    clock_offset_ppm: float = attrs.field(default=0.0, validator=checks.within(-1e4, 1e4))
    coupling_hz: float = attrs.field(default=2.0, validator=checks.positive)
    output_harmonics: tuple[float, float] = (1.6e-6, 2.5e-6)
    input_harmonics: tuple[float, float] = (2.2e-6, -1.4e-6)
    output_noise_fs: float = attrs.field(default=1.6e-6, validator=checks.not_negative)
    input_noise_fs: float = attrs.field(default=1.4e-6, validator=checks.not_negative)
    input_offset_fs: float = attrs.field(default=4e-6, validator=checks.finite)
    input_hum: tuple[tuple[int, float], ...] = ()  # (multiple of the mains, rms to a full-scale sine)
    crosstalk: float = attrs.field(default=0.0, validator=checks.within(0.0, 0.1))  # from either input into the other

    def calibration(self, rate_hz: float, date: str) -> Calibration:
        """Return what the simulator declares of its own scales and floors."""

        def scale(socket: int, vrms: float) -> Scale:
            return Scale(socket, Quantity(vrms, "V"), DECLARED, date)

        def floor(socket: int, noise_fs: float, harmonics: tuple[float, float]) -> Floor:
            orders = tuple((order, Quantity(abs(ratio), "1")) for order, ratio in zip((2, 3), harmonics, strict=True))
            return Floor(socket, 1.0, Quantity(noise_fs, "1"), orders)

        return Calibration(
            device="simulated interface",
            rate_hz=rate_hz,
            inputs=tuple(scale(socket, self.input_full_scale_vrms) for socket in (1, 2)),
            outputs=tuple(scale(socket, self.output_full_scale_vrms) for socket in (1, 2)),
            out_floors=tuple(floor(socket, self.output_noise_fs, self.output_harmonics) for socket in (1, 2)),
            in_floors=tuple(floor(socket, self.input_noise_fs, self.input_harmonics) for socket in (1, 2)),
        )


def bent(samples: Samples, harmonics: tuple[float, float]) -> Samples:
    """Return samples through a converter's own curve: x + 2·h2·x² + 4·h3·x³, whose harmonics are h2 and h3 at peak 1.

    sin² holds half a second harmonic and sin³ a quarter of a third (up to sign).
    """
    second, third = 2.0 * harmonics[0], 4.0 * harmonics[1]
    curve = samples * third
    curve += second
    curve *= samples
    curve += 1.0
    curve *= samples
    return curve


def quantised(samples: Samples, dither: np.random.Generator) -> Samples:
    """Return samples as 24-bit codes with triangular dither of ±1 step, hard at full scale, in full-scale units."""
    codes = samples * (1.0 / LSB)
    codes += dither.random(samples.shape, dtype=np.float32)
    codes -= dither.random(samples.shape, dtype=np.float32)
    np.rint(codes, out=codes)
    np.clip(codes, -1.0 / LSB, 1.0 / LSB - 1.0, out=codes)
    codes *= LSB
    return codes


def noise_sigma(noise_rms: float, rate_hz: float) -> float:
    """Return the standard deviation of white samples that have noise_rms in 20 kHz."""
    return noise_rms * math.sqrt(rate_hz / 2.0 / BAND_HZ)
