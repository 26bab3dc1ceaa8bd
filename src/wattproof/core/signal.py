"""What is played and what is captured: Tone, Span, Gap, Overload, Capture."""

import attrs
import numpy as np
from numpy.typing import NDArray

from wattproof.core import checks

Samples = NDArray[np.float64]


def _channels(instance: object, attribute: "attrs.Attribute[tuple[int, ...]]", value: tuple[int, ...]) -> None:
    if any(channel < 1 for channel in value) or len(set(value)) != len(value):
        raise ValueError(f"{type(instance).__name__}.{attribute.name} is {value}; channels count from 1, each once")


@attrs.frozen
class Tone:
    """A sine to be played.

    `level_fs` is a plain ratio: 1 is a full-scale sine, so 0 dBFS (AES17). It is no voltage, since volts per full
    scale belong to the calibration. `outputs` are the interface's outputs that sound it, counted from 1.
    """

    frequency_hz: float = attrs.field(validator=checks.positive)
    level_fs: float = attrs.field(validator=checks.within(0.0, 1.0))
    outputs: tuple[int, ...] = attrs.field(default=(1,), validator=_channels)


@attrs.frozen
class Sweep(Tone):
    """A sine whose frequency rises from `frequency_hz` to `end_hz`, by the same factor in each moment; then silence.

    With L = seconds/ln(end/start), sample n is sin(2π·start·L·(e^(t/L) − 1)) at t = n/rate, under raised-cosine ramps
    of 10 ms at both ends. It sounds once, out of silence, and a bench answers with the absolute frame at which its
    first sample is handed to the output: the way round, which a tone's answer counts in, is what a sweep measures.
    """

    end_hz: float = attrs.field(kw_only=True, validator=checks.positive)
    seconds: float = attrs.field(kw_only=True, validator=checks.positive)

    def __attrs_post_init__(self) -> None:
        if self.end_hz <= self.frequency_hz:
            raise ValueError(f"Sweep runs from {self.frequency_hz:g} to {self.end_hz:g} Hz; it must rise")


@attrs.frozen
class Span:
    """A stretch of a capture: `frames` frames from the absolute frame `first_frame`."""

    first_frame: int
    frames: int = attrs.field(validator=checks.not_negative)
    rate_hz: float = attrs.field(validator=checks.positive)

    @property
    def end_frame(self) -> int:
        """The absolute frame after the last."""
        return self.first_frame + self.frames

    @property
    def start_s(self) -> float:
        """Where the span begins, in s from frame 0."""
        return self.first_frame / self.rate_hz

    @property
    def seconds(self) -> float:
        """How long the span is, in s."""
        return self.frames / self.rate_hz


@attrs.frozen
class Gap:
    """A stretch of which frames may be missing, repeated or replaced. `why` names the witness."""

    first_frame: int
    frames: int = attrs.field(validator=checks.not_negative)
    why: str


@attrs.frozen
class Overload:
    """A run of samples at the converter's full scale, judged on raw samples."""

    channel: int = attrs.field(validator=checks.counted_from_one)
    first_frame: int
    frames: int = attrs.field(validator=checks.positive)


@attrs.frozen(eq=False)
class Capture:
    """Samples as they came from the converter.

    `samples` has shape (frames, channels), float64, in full-scale units (the peak of a full-scale sine is 1).
    `first_frame` is absolute: it counts from the opening of the bench and goes on over gaps.
    """

    samples: Samples
    rate_hz: float = attrs.field(validator=checks.positive)
    first_frame: int = 0
    gaps: tuple[Gap, ...] = ()
    overloads: tuple[Overload, ...] = ()

    def __attrs_post_init__(self) -> None:
        if self.samples.ndim != 2 or self.samples.dtype != np.float64:
            shape = f"shape {self.samples.shape}, {self.samples.dtype}"
            raise ValueError(f"Capture.samples has {shape}; it must be (frames, channels) float64")

    @property
    def frames(self) -> int:
        """How many frames were captured."""
        return int(self.samples.shape[0])

    @property
    def channels(self) -> int:
        """How many channels were captured."""
        return int(self.samples.shape[1])

    @property
    def span(self) -> Span:
        """The stretch that the capture covers."""
        return Span(self.first_frame, self.frames, self.rate_hz)
