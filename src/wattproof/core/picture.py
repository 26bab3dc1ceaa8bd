"""What the live screen draws of one reading: arrays already reduced to what can be seen."""

import attrs

from wattproof.core.reading import Reading
from wattproof.core.signal import Samples


@attrs.frozen(eq=False)
class Picture:
    """One channel's residual waveform and spectrum, beside the reading they belong to.

    `phase_cycles`, `residual`, `output` have equal length: two periods of the fundamental from its rising zero
    crossing; `residual` and `output` are ratios to the fundamental's peak (`output` is the captured waveform less DC).
    `spectrum_hz` and `spectrum_ratio` have equal length: residual noise lines, rms per noise bandwidth over the
    fundamental's rms, the largest per column; harmonics and hum are in the reading. `noise_bandwidth_hz` belongs to
    `window`.
    """

    reading: Reading
    phase_cycles: Samples
    residual: Samples
    output: Samples
    spectrum_hz: Samples
    spectrum_ratio: Samples
    noise_bandwidth_hz: float
    window: str
