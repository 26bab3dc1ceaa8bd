"""The names of what makes a quantity uncertain, and how each is spread about its estimate (JCGM 101:2008, 6.4)."""

from collections.abc import Mapping

from wattproof.core.quantity import Quantity
from wattproof.dsp.intervals import Interval, Shape, interval95

LEVEL = "level calibration"  # the meter's limits: rectangular
ATTENUATOR = "attenuator"  # resistors within their tolerance: rectangular
INPUT_IMPEDANCE = "input impedance"  # as a plan names it
LOAD = "load"
RESPONSE = "response"
FLOOR = "interface floor"  # a line of known size and unknown phase: U-shaped
FLOOR_NOISE = "interface noise"
BAND_EDGES = "band edges"
INTERFACE = "interface"  # `limited_by` where the interface's own floor is what is seen
NOISE = "noise"  # `limited_by` where a line is not seen in the noise

_SHAPES = (
    (FLOOR, Shape.ARCSINE),
    (LEVEL, Shape.RECTANGULAR),
    (ATTENUATOR, Shape.RECTANGULAR),
    (INPUT_IMPEDANCE, Shape.RECTANGULAR),
    (LOAD, Shape.RECTANGULAR),
    (RESPONSE, Shape.RECTANGULAR),
    (BAND_EDGES, Shape.RECTANGULAR),
)
DOMINATES = 0.35
COUNTS = 0.02
SCATTER = " scatter"  # ends the name of a normal part of a source that is not normal otherwise


def shapes_of(quantity: Quantity) -> Mapping[str, Shape]:
    """Return how the sources of a quantity are spread, by source; what is not named is normal."""
    found = {}
    for part in quantity.parts:
        if part.source.endswith(SCATTER):
            continue
        for start, shape in _SHAPES:
            if part.source.startswith(start):
                found[part.source] = shape
                break
    return found


def stated95(quantity: Quantity) -> Interval:
    """Return the 95 % interval of a quantity: t·u, or where one input that is not normal dominates, their distribution.

    Where none has DOMINATES of the variance, the sum is so near to normal that t·u covers 94.5 to 96 % (computed by
    convolution for the shapes in use). Inputs below COUNTS of the variance are taken as normal in any case.
    """
    variance = quantity.u**2
    shapes = shapes_of(quantity)
    shares = {part.source: part.u**2 / variance for part in quantity.parts if part.source in shapes and variance > 0.0}
    if max(shares.values(), default=0.0) < DOMINATES:
        return interval95(quantity)
    return interval95(quantity, {source: shapes[source] for source, share in shares.items() if share >= COUNTS})
