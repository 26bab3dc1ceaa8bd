"""The interface's own floor as THD+N against output: what the trail shades. Pure."""

import math

import attrs
import numpy as np

from wattproof.core.calibration import Calibration
from wattproof.core.rig import Wiring
from wattproof.dsp.interface_floor import Levels, own_lines, own_noise
from wattproof.gui.axes import Axis
from wattproof.gui.trail import Axis as Along

_POINTS = 48


@attrs.frozen
class FloorKey:
    """What the floor depends on; a change of any of these draws it anew. `drive_fs` is None where the drive varies."""

    wiring: Wiring
    load_ohm: float
    along: Along
    across: Axis
    drive_fs: float | None


def floor_of(calibration: Calibration, key: FloorKey) -> tuple[tuple[float, float], ...]:
    """Return (x, THD+N as a plain ratio) of the interface alone; nothing where it is not known."""
    scale = calibration.input_vrms(key.wiring.input)
    if scale is None:
        return ()
    found = []
    for x in np.geomspace(key.across.low, key.across.high, _POINTS):
        volts = {Along.POWER: math.sqrt(x * key.load_ohm), Along.VOLTS: x}.get(key.along)
        input_fs = x if volts is None else volts / (scale.value * key.wiring.attenuator.ratio)
        levels = Levels(float(input_fs), key.drive_fs)
        noise = own_noise(calibration, key.wiring, levels)
        if noise is None:
            return ()
        lines = (line.ratio for line in own_lines(calibration, key.wiring, levels).values())
        found.append((float(x), math.hypot(noise.value / input_fs, *lines)))
    return tuple(found)
