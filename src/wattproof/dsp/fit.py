"""Least-squares sine fit with the frequency unknown, harmonics, a ramp of the fundamental and a slow trend.

The method is the four-parameter fit of IEEE Std 1057 (a linear solution whose frequency column is linearised, repeated
until the frequency stands), widened by harmonics, by polynomial terms that let level and phase move inside the block,
and by a polynomial trend that takes drift away together with the sine instead of before it.
"""

import math
from functools import lru_cache

import attrs
import numpy as np

from wattproof.core.signal import Samples
from wattproof.dsp.grid import grid_for
from wattproof.dsp.model import Matrix, Model
from wattproof.dsp.prepared import Phasors, Prepared, prepare

EXACT_PHASE_RAD = 1e-8  # a frequency error that leaves this phase at the block's ends leaves a residual of −300 dB
LIVE_PHASE_RAD = 1e-4  # and this one below −170 dB, since the ramp term takes its first order away
_ROUGH_PHASE_RAD = 0.05  # beyond this the fundamental alone is fitted, which is cheaper
_FEW_ORDERS = 24
_MOST_PASSES = 12


@attrs.frozen(eq=False)
class SineFit:
    """What a fit found.

    `coefficients` has shape (channels, terms): complex peak amplitudes of `model.terms` at the block's centre, so that
    the fitted sine is Re(c·e^{jkθ}). `trend` has shape (channels, trend + 1), in powers of τ (−1…1 over the block).
    `phase_error_rad` is the last frequency correction, as the phase that it made at the block's ends, all channels
    together.
    """

    prepared: Prepared
    rate_hz: float
    solution: Matrix
    coefficients: Phasors
    phase_error_rad: float
    frequency_hz: float  # at the block's centre, with the last correction

    @property
    def model(self) -> Model:
        """What was fitted."""
        return self.prepared.model

    @property
    def trend(self) -> Matrix:
        """Coefficients of τ^q, shape (channels, trend + 1)."""
        return self.solution[:, : self.model.trend + 1]

    @property
    def frames(self) -> int:
        """How many frames were fitted."""
        return self.prepared.grid.frames

    @property
    def seconds(self) -> float:
        """How long the fitted block is."""
        return self.frames / self.rate_hz

    @property
    def dc(self) -> Matrix:
        """Mean of the trend over the block, shape (channels,)."""
        mean: Matrix = self.trend @ _means(self.model.trend)
        return mean

    def relative_slope(self, channel: int) -> float:
        """Return how fast the fundamental's level moves in one channel (index from 0), in relative change per s."""
        first = complex(self.coefficients[channel, 0])
        if self.model.ramp == 0 or first == 0.0:
            return 0.0
        return (complex(self.coefficients[channel, 1]) / first).real * 2.0 / self.seconds

    def waveform(
        self, *, trend: bool = True, first: bool = True, others: bool = True, out: Matrix | None = None
    ) -> Matrix:
        """Return the fitted waveform of the chosen parts, shape (channels, rows, columns), in `out` if given."""
        split = self.model.trend + 1
        beyond = split + 2 * (self.model.ramp + 1)
        solution = self.solution
        if not (trend and first and others):
            solution = solution.copy()
            for start, end, wanted in ((0, split, trend), (split, beyond, first), (beyond, None, others)):
                if not wanted:
                    solution[:, start:end] = 0.0
        return self.prepared.waveform(solution, out)


@lru_cache(maxsize=8)
def _means(trend: int) -> Matrix:
    """Return the means of τ^0…τ^trend over −1…1."""
    return np.array([1.0 / (power + 1) if power % 2 == 0 else 0.0 for power in range(trend + 1)])


def block_of(samples: Samples) -> Matrix:
    """Return samples, shape (frames, channels), as a block (channels, rows, columns), contiguous along the frames.

    Frames that fill no row are left off the end (under 2 % of them).

    Raises:
        ValueError: fewer than 16 frames.
    """
    grid = grid_for(samples.shape[0])
    by_channel = samples.T[:, : grid.frames]
    if by_channel.strides[1] != by_channel.itemsize:
        by_channel = np.ascontiguousarray(by_channel)
    return by_channel.reshape(samples.shape[1], grid.rows, grid.columns)


def fit_prepared(block: Matrix, prepared: Prepared, rate_hz: float) -> SineFit:
    """Fit a block (channels, rows, columns) at a prepared frequency; `phase_error_rad` tells how well it suited."""
    model, cycles, phase = prepared.model, prepared.cycles_per_frame, 0.0
    solution = prepared.sums(block) @ prepared.solver
    coefficients = solution.view(np.complex128)[:, (model.trend + 1) // 2 :]
    if model.ramp and model.orders:
        first = coefficients[:, 0]
        weight = np.vdot(first, first).real
        phase = float(np.vdot(first, coefficients[:, 1]).imag / weight) if weight else 0.0
        cycles += phase / (math.pi * prepared.grid.frames * model.orders[0])
    return SineFit(prepared, rate_hz, solution, coefficients, phase, cycles * rate_hz)


def fit_trend(block: Matrix, rate_hz: float, trend: int = 3) -> SineFit:
    """Fit a slow trend alone, where there is no tone."""
    model = Model((), ramp=0, trend=trend)
    return fit_prepared(block, prepare(model, grid_for(block.shape[1] * block.shape[2]), 0.25), rate_hz)


def fit_block(
    block: Matrix, rate_hz: float, start_hz: float, model: Model, *, phase_limit_rad: float = EXACT_PHASE_RAD
) -> SineFit:
    """Fit a block of shape (channels, rows, columns), all channels at one common frequency (IEEE Std 1057).

    The frequency is refined until its last correction turns less than phase_limit_rad at the block's ends, or stops
    shrinking. A start more than 0.7 bin off may not converge: `phase_error_rad` of the result tells.

    Raises:
        ValueError: the frequency leaves the range from 0 to half the rate.
    """
    few = model.orders[: 1 if len(model.orders) <= _FEW_ORDERS else _FEW_ORDERS]
    quick = Model(few, ramp=max(1, model.ramp), trend=model.trend)
    rough_rad = _ROUGH_PHASE_RAD if len(few) == 1 else 1e-6  # many orders cost more to prepare than a few more passes
    grid = grid_for(block.shape[1] * block.shape[2])
    cycles, last_full = start_hz / rate_hz, math.inf
    rough = len(few) > 1
    fit = None
    for number in range(_MOST_PASSES):
        fit = fit_prepared(block, prepare(quick if rough else model, grid, cycles), rate_hz)
        turned = abs(fit.phase_error_rad)
        if not rough:
            if turned <= phase_limit_rad or turned >= last_full:
                break
            last_full = turned
        # a rough fit leans on what it leaves out: after a whole one there is no way back to it
        rough = (rough or number == 0) and turned > rough_rad and number < _MOST_PASSES // 2
        cycles = fit.frequency_hz / rate_hz
        if not 0.0 < cycles < 0.5:
            raise ValueError(f"the fit ran to {cycles * rate_hz:g} Hz; start nearer to the tone")
    if fit is None:
        raise ValueError("a fit needs at least one pass")
    return fit
