"""Where clipping begins: the onset of clipping by this project's own definition.

With U the output voltage and Ur = THD+N·U, the unclipped trend at U is the non-negative least-squares fit, with
relative weights, of Ur² = a + b·U² + c·U⁴ + d·U⁶ to the readings from 30 to 1 dB below U: noise, and distortion of the
second, third and higher order as each grows with level. Onset is the highest U at which Ur rises through twice that
trend, stays above it for the next 1 dB, or to the end, and reaches five times the trend within it. The record must
begin at least 20 dB lower.
"""

from enum import StrEnum
from itertools import product

import attrs
import numpy as np

from wattproof.core.signal import Samples
from wattproof.core.units import DB_PER_RELATIVE, db, from_db

RISES_THROUGH = 2.0
REACHES = 5.0
STAYS_DB = 1.0
TREND_FROM_DB = 30.0
TREND_TO_DB = 1.0
LEAST_SPAN_DB = 20.0  # what a record must hold below the onset
_LEAST_POINTS = 5
_MOST_POINTS = 200  # of a dense record each so many readings count: four coefficients need no more
_COLUMNS = 4  # the powers 0, 2, 4 and 6 of the voltage
_SUBSETS = np.array([subset for subset in product((0.0, 1.0), repeat=_COLUMNS) if any(subset)])  # (15, 4)
_EXPONENTS = np.arange(_COLUMNS)
_RIDGE = 1e-13  # of a column's own square: keeps equal columns from being singular, and moves nothing else
_GRADUAL_THDN = 0.003  # a curve that ends above this without an onset has risen gradually, and was not just too short
_PLACE = 0.15  # of the step between two readings: how well the straight line in log-log places a crossing inside it


class NoOnset(StrEnum):
    """Why a curve has no onset."""

    GRADUAL = "no distinct onset: distortion rises gradually"
    BEGIN_LOWER = "begin lower: the record starts less than 20 dB below"
    NOT_REACHED = "not reached: distortion follows its trend to the end"


@attrs.frozen(eq=False)
class Curve:
    """THD+N against output voltage: equal lengths, rising voltage. Plain ratios with their standard uncertainty."""

    voltage_vrms: Samples
    thdn: Samples
    u_thdn: Samples

    def __attrs_post_init__(self) -> None:
        if not self.voltage_vrms.shape == self.thdn.shape == self.u_thdn.shape:
            raise ValueError("Curve's arrays differ in length; each voltage has one THD+N and one uncertainty")
        if np.any(np.diff(self.voltage_vrms) <= 0.0) or np.any(self.voltage_vrms <= 0.0):
            raise ValueError("Curve.voltage_vrms must rise and lie above zero; sort it and join equal voltages")
        if np.any(self.thdn <= 0.0):
            raise ValueError("Curve.thdn must lie above zero; a reading without a residual belongs to no curve")


@attrs.frozen
class Onset:
    """Onset of clipping: its voltage and what the curve leaves uncertain of it, THD+N there, the readings around it."""

    voltage_vrms: float
    u_vrms: float
    thdn: float
    below_vrms: float
    above_vrms: float


def trend_at(voltage: float, voltages: Samples, residuals: Samples) -> float | None:
    """Return the unclipped trend of the residual (V) at a voltage, or None where too few readings lie below it.

    Every non-negative least-squares solution is the plain solution on some subset of columns; with four columns all
    fifteen are tried, which is exact. They are solved together.
    """
    used = (voltages >= voltage * from_db(-TREND_FROM_DB)) & (voltages <= voltage * from_db(-TREND_TO_DB))
    places = used.nonzero()[0]
    if places.size < _LEAST_POINTS:
        return None
    places = places[:: -(-places.size // _MOST_POINTS)]
    square = (voltages[places] / voltage)[:, None] ** 2
    columns = square**_EXPONENTS / residuals[places][:, None] ** 2  # relative weights: each reading counts alike
    norms = np.sqrt(np.sum(columns**2, axis=0))
    columns /= norms
    gram, right = columns.T @ columns, columns.sum(axis=0) * _SUBSETS
    matrices = gram * (_SUBSETS[:, :, None] * _SUBSETS[:, None, :])
    matrices += np.eye(_COLUMNS) * (1.0 - _SUBSETS[:, :, None] + _RIDGE)
    solutions = np.linalg.solve(matrices, right[:, :, None])[:, :, 0]
    left = np.sum(solutions * (solutions @ gram - 2.0 * columns.sum(axis=0)), axis=1)  # less the constant Σ1²
    left[np.any(solutions < 0.0, axis=1)] = np.inf
    best = float(np.sum(solutions[int(np.argmin(left))] / norms))
    return float(np.sqrt(best)) if best > 0.0 else None


def rises_of(curve: Curve) -> Samples:
    """Return the residual over its unclipped trend at each voltage, NaN where there is no trend. Shape (readings,)."""
    voltages, residuals = curve.voltage_vrms, curve.voltage_vrms * curve.thdn
    rises = np.full(voltages.size, np.nan)
    for index in range(voltages.size):
        trend = trend_at(float(voltages[index]), voltages, residuals)
        if trend:
            rises[index] = residuals[index] / trend
    return rises


def find_onset(curve: Curve) -> Onset | NoOnset:
    """Return the onset of clipping, interpolated in log-log between two readings, or why there is none."""
    voltages, rises = curve.voltage_vrms, rises_of(curve)
    found: Onset | NoOnset = NoOnset.NOT_REACHED
    for index in range(1, voltages.size):
        if not rises[index - 1] < RISES_THROUGH <= rises[index]:
            continue
        within = rises[index:][voltages[index:] <= voltages[index] * from_db(STAYS_DB)]
        if np.all(within >= RISES_THROUGH) and np.max(within) >= REACHES:
            found = _placed(curve, rises, index)
        elif found is NoOnset.NOT_REACHED:
            found = NoOnset.GRADUAL
    ends_high = voltages.size > 0 and float(curve.thdn[-1]) > _GRADUAL_THDN
    if found is NoOnset.NOT_REACHED and ends_high:
        spans = db(float(voltages[-1] / voltages[0])) >= LEAST_SPAN_DB
        return NoOnset.GRADUAL if spans else NoOnset.BEGIN_LOWER
    return found


def _placed(curve: Curve, rises: Samples, index: int) -> Onset | NoOnset:
    pair = slice(index - 1, index + 1)
    voltages = curve.voltage_vrms[pair]
    at = crossing(voltages, rises[pair], RISES_THROUGH)
    if db(at / float(curve.voltage_vrms[0])) < LEAST_SPAN_DB:
        return NoOnset.BEGIN_LOWER
    slope = float(np.diff(np.log(rises[pair]))[0] / np.diff(np.log(voltages))[0])
    scatter = float(np.mean(curve.u_thdn[pair] / curve.thdn[pair])) / slope
    u = at * float(np.hypot(scatter, _PLACE * np.diff(np.log(voltages))[0]))
    share = float(np.log(at / voltages[0]) / np.diff(np.log(voltages))[0])
    thdn = float(np.exp((1.0 - share) * np.log(curve.thdn[index - 1]) + share * np.log(curve.thdn[index])))
    return Onset(at, u, thdn, float(voltages[0]), float(voltages[1]))


def crossing(x: Samples, y: Samples, wanted: float) -> float:
    """Return where y, given at two x, passes a wanted value: straight in log-log."""
    log_x, log_y = np.log(x), np.log(y)
    share = (np.log(wanted) - log_y[0]) / (log_y[1] - log_y[0])
    return float(np.exp(log_x[0] + share * (log_x[1] - log_x[0])))


def step_db(onset: Onset) -> float:
    """Return the distance of the two readings around an onset, in dB of output voltage."""
    return DB_PER_RELATIVE * float(np.log(onset.above_vrms / onset.below_vrms))
