"""What a loop from an output to an input showed of the interface: delay, gain, response, noise, crosstalk, clock."""

import attrs
import numpy as np

from wattproof.core import checks
from wattproof.core.quantity import Quantity
from wattproof.core.reading import Mains
from wattproof.core.signal import Samples


@attrs.frozen(eq=False)
class Response:
    """Complex gain of output and input together against frequency: `frequency_hz` and `gain` of equal length."""

    frequency_hz: Samples = attrs.field(factory=lambda: np.zeros(0))
    gain: np.ndarray[tuple[int], np.dtype[np.complex128]] = attrs.field(factory=lambda: np.zeros(0, dtype=complex))

    def __attrs_post_init__(self) -> None:
        if self.frequency_hz.shape != self.gain.shape:
            raise ValueError("Response.frequency_hz and gain differ in length; each frequency has one gain")


@attrs.frozen(eq=False)
class NoiseSpectrum:
    """Noise density against frequency: rms to a full-scale sine in 1 Hz; `tone_fs` is the level that sounded."""

    tone_fs: float = attrs.field(validator=checks.not_negative)
    frequency_hz: Samples
    density_fs: Samples
    band_fs: Quantity  # the noise in the reading's band


@attrs.frozen
class LevelPoint:
    """One step of the level: what was played and how far the loop's gain departed from that of the top step."""

    level_fs: float = attrs.field(validator=checks.positive)
    departure: Quantity  # gain over the top step's gain, less 1


@attrs.frozen(eq=False, kw_only=True)
class Loop:
    """One output joined to one input, directly; sockets count from 1."""

    output: int = attrs.field(validator=checks.counted_from_one)
    input: int = attrs.field(validator=checks.counted_from_one)
    latency_frames: float
    inverted: bool
    gain: Quantity  # full scales captured per full scale played, at `frequency_hz`
    frequency_hz: float
    pad: Quantity | None = None  # gain through the pad over the direct gain
    response: Response
    linearity: tuple[LevelPoint, ...] = ()
    noise: tuple[NoiseSpectrum, ...] = ()
    crosstalk: Quantity | None = None  # into this input from the other loop, ratio to what that one captures
    mains: Mains = attrs.field(factory=Mains)  # line ratios are to full scale here, since nothing sounds
    clock_ppm: Quantity | None = None  # the output's clock over the input's, less 1, in 1e-6
