"""What a fit needs that depends on frequency and length but not on the samples: made once, used while a tone runs.

A block is rows × columns. Each column function (a power of τ, or a power of τ times a phasor) is summed along the
columns by one real matrix product for all channels; what is left is as short as the rows. Phasors lie as (cos, sin)
pairs, so that one array is seen as real numbers by the products and as complex numbers by everything else.
"""

import math
from functools import lru_cache

import attrs
import numpy as np
from numpy.typing import NDArray

from wattproof.dsp.grid import Grid, grid_for, unit_phasors
from wattproof.dsp.model import Matrix, Model, gram, halves

Phasors = NDArray[np.complex128]


@lru_cache(maxsize=32)
def _time_powers(frames: int, highest: int) -> tuple[Matrix, Matrix]:
    """Return τ of rows and of columns to the powers 0…highest, each of shape (highest + 1, …)."""
    grid = grid_for(frames)
    scale = 2.0 / grid.frames
    exponents = np.arange(highest + 1)[:, None]
    return (grid.row_frame * scale) ** exponents, (grid.column_frame * scale) ** exponents


def _powers_of(phasors: Phasors, highest: int) -> Phasors:
    """Return phasors^0…phasors^highest, shape (highest + 1, …)."""
    table = np.empty((highest + 1, phasors.size), dtype=np.complex128)
    table[0] = 1.0
    table[1] = phasors
    done = 1
    while done < highest:  # doubling keeps both the rounding and the number of calls at log2 of the order
        more = min(done, highest - done)
        np.multiply(table[1 : more + 1], table[done], out=table[done + 1 : done + more + 1])
        done += more
    return table


@lru_cache(maxsize=16)
def _lift(powers: int) -> Matrix:
    """Binomials that turn sums of (row τ)^p·(column τ)^i into sums of τ^q: shape (p·i, q), p + i = q."""
    lift = np.zeros((powers, powers, powers))
    for q in range(powers):
        for i in range(q + 1):
            lift[q - i, i, q] = math.comb(q, i)
    return lift.reshape(powers * powers, powers)


def _lower(row_time: Matrix) -> Matrix:
    """Weights that turn coefficients of τ^q into coefficients of (column τ)^i in each row: shape (q, i·rows)."""
    powers, rows = row_time.shape
    lower = np.zeros((powers, powers, rows))
    for q in range(powers):
        for i in range(q + 1):
            lower[q, i] = math.comb(q, i) * row_time[q - i]
    return lower.reshape(powers, powers * rows)


def _sums(rows: Phasors, columns: Phasors, row_time: Matrix, column_time: Matrix) -> Matrix:
    """Return W_r(d): Σ τ^r·cos dθ (r even) or Σ τ^r·sin dθ (r odd), shape (powers, orders)."""
    by_column = column_time @ columns.T
    by_row = row_time @ rows.T
    sums = np.empty(by_row.shape)
    for power in range(row_time.shape[0]):
        weights = np.array([math.comb(power, i) for i in range(power + 1)], dtype=float)[:, None]
        total = (weights * by_column[: power + 1] * by_row[power::-1]).sum(axis=0)
        sums[power] = total.imag if power % 2 else total.real
    return sums


def _solver(model: Model, inverses: tuple[Matrix, Matrix]) -> Matrix:
    """Return the matrix from sums (trend, then cos and sin sums of each term) to coefficients in the same places.

    A term's coefficient is a − jb where the fit is a·cos + b·sin.
    """
    trend, terms = model.trend + 1, len(model.terms)
    odd_power = np.array([power % 2 == 1 for power, _ in model.terms])
    cos_at, sin_at = trend + 2 * np.arange(terms), trend + 2 * np.arange(terms) + 1
    places = (
        np.concatenate([np.arange(0, trend, 2), np.where(odd_power, sin_at, cos_at)]),
        np.concatenate([np.arange(1, trend, 2), np.where(odd_power, cos_at, sin_at)]),
    )
    solver = np.zeros((model.parameters, model.parameters))
    for place, inverse in zip(places, inverses, strict=True):
        solver[np.ix_(place, place)] = inverse
    solver[:, sin_at] *= -1.0
    return solver


@attrs.frozen(eq=False)
class Prepared:
    """One model at one frequency on one grid.

    `inner`, shape (columns, functions), holds the column functions; `row_phasors`, shape (rows, terms), those of the
    rows. `solver` turns sums into coefficients. `unit_variance`, shape (terms,), is the variance of a coefficient's
    real or imaginary part (their mean) per unit variance of white noise on one sample.
    """

    model: Model
    grid: Grid
    cycles_per_frame: float
    inner: Matrix
    row_phasors: Phasors
    row_time: Matrix
    solver: Matrix
    lower_trend: Matrix
    lower_ramp: Matrix
    unit_variance: Matrix

    def sums(self, block: Matrix) -> Matrix:
        """Return Σ x·τ^q and the pairs Σ x·τ^q·(cos kθ, sin kθ) of block (channels, rows, columns), by channel."""
        channels, trend, powers = block.shape[0], self.model.trend + 1, self.model.ramp + 1
        by_row = (block.reshape(-1, self.grid.columns) @ self.inner).reshape(channels, self.grid.rows, -1)
        sums = np.empty((channels, self.inner.shape[1]))
        moments = self.row_time[:trend] @ by_row[..., :trend]
        sums[:, :trend] = moments.reshape(channels, -1) @ _lift(trend)
        if not self.model.orders:
            return sums
        turned = by_row.view(np.complex128)[..., trend // 2 :] * self.row_phasors
        pairs = sums.view(np.complex128)[:, trend // 2 :]
        ramp_moments = self.row_time[:powers] @ turned[..., :powers]
        pairs[:, :powers] = ramp_moments.reshape(channels, -1) @ _lift(powers)
        pairs[:, powers:] = turned[..., powers:].sum(axis=1)
        return sums

    def waveform(self, coefficients: Matrix, out: Matrix | None = None) -> Matrix:
        """Return Σ trend·τ^q + Re Σ c·τ^q·e^{jkθ}, shape (channels, rows, columns), of coefficients by channel."""
        if out is None:
            out = np.empty((coefficients.shape[0], self.grid.rows, self.grid.columns))
        flat = out.reshape(-1, self.grid.columns)
        channels, trend, powers = coefficients.shape[0], self.model.trend + 1, self.model.ramp + 1
        rows = self.grid.rows
        weights = np.empty((channels, rows, self.inner.shape[1]))
        lowered = (coefficients[:, :trend] @ self.lower_trend).reshape(channels, trend, rows)
        weights[..., :trend] = lowered.transpose(0, 2, 1)
        if not self.model.orders:
            np.matmul(weights.reshape(channels * rows, -1), self.inner.T, out=flat)
            return out
        complex_weights = weights.view(np.complex128)[..., trend // 2 :]
        terms = coefficients.view(np.complex128)[:, trend // 2 :]
        ramp = (terms[:, :powers] @ self.lower_ramp).reshape(channels, powers, rows)
        complex_weights[..., :powers] = ramp.transpose(0, 2, 1)
        complex_weights[..., powers:] = terms[:, None, powers:]
        complex_weights *= self.row_phasors
        np.conjugate(complex_weights, out=complex_weights)  # Re(c·e) = Re c·cos − Im c·sin
        np.matmul(weights.reshape(channels * rows, -1), self.inner.T, out=flat)
        return out


def prepare(model: Model, grid: Grid, cycles_per_frame: float) -> Prepared:
    """Make what a fit of `model` at one frequency needs; costs about two fits."""
    orders = [order for _, order in model.terms]
    highest = 2 * max(orders, default=1)
    powers, trend = model.ramp + 1, model.trend + 1
    row_time, column_time = _time_powers(grid.frames, 2 * max(model.ramp, model.trend))
    rows = _powers_of(unit_phasors(grid.row_frame, cycles_per_frame), highest)
    columns = _powers_of(unit_phasors(grid.column_frame, cycles_per_frame), highest)
    inner = np.empty((grid.columns, model.parameters))
    inner[:, :trend] = column_time[:trend].T
    pairs = inner.view(np.complex128)[:, trend // 2 :]
    pairs[...] = columns[orders].T
    pairs[:, :powers] *= column_time[:powers].T
    sums = _sums(rows, columns, row_time, column_time)
    even, odd = (np.asarray(np.linalg.inv(gram(half, sums)), dtype=np.float64) for half in halves(model))
    variance = (np.diagonal(even)[(trend + 1) // 2 :] + np.diagonal(odd)[trend // 2 :]) / 2.0
    return Prepared(
        model=model,
        grid=grid,
        cycles_per_frame=cycles_per_frame,
        inner=inner,
        row_phasors=np.ascontiguousarray(rows[orders].T),
        row_time=row_time,
        solver=_solver(model, (even, odd)),
        lower_trend=_lower(row_time[:trend]),
        lower_ramp=_lower(row_time[:powers]),
        unit_variance=variance,
    )
