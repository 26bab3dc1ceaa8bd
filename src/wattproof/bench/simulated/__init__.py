"""The simulated bench: an audio interface around an amplifier, made of arithmetic, so that nothing can be hurt."""

from wattproof.bench.simulated.bench import SimulatedBench
from wattproof.bench.simulated.characters import CHARACTERS, OPEN_OHM
from wattproof.bench.simulated.dropouts import DropOut, Fault
from wattproof.bench.simulated.interface import Interface

__all__ = ["CHARACTERS", "OPEN_OHM", "DropOut", "Fault", "Interface", "SimulatedBench"]
