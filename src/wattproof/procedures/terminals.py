"""From a level at an input to volts at the amplifier's terminals, with its budget, for figures beside a reading."""

from wattproof.core.calibration import Calibration
from wattproof.core.errors import WrongUseError
from wattproof.core.quantity import Quantity
from wattproof.core.rig import Wiring
from wattproof.dsp.attenuation import attenuation, cable_factor
from wattproof.dsp.uncertainty import exact, product

REFERENCE_HZ = 1_000.0


def full_scale_volts(
    wiring: Wiring, calibration: Calibration, typed_vrms: float | None, frequency_hz: float = REFERENCE_HZ
) -> Quantity:
    """Return V rms at the terminals of a sine that drives the wiring's input to full scale.

    A typed scale counts as exact, and is said to be typed.

    Raises:
        WrongUseError: it is not known.
    """
    if typed_vrms is not None:
        return exact(typed_vrms, "V")
    scale = calibration.input_vrms(wiring.input)
    if scale is None:
        raise WrongUseError(
            f"input {wiring.input}: its volts are not known; calibrate it, or give --full-scale-vrms V, the V rms at "
            "the amplifier's terminals that drive it to full scale"
        )
    ratio = attenuation(wiring.attenuator, wiring.name, bridge_tied=wiring.bridge_tied)
    return product(scale, ratio.scaled(cable_factor(wiring.attenuator, frequency_hz), "1"), "V")


def drive_volts(wiring: Wiring, calibration: Calibration) -> Quantity | None:
    """Return V rms at the interface's output of a full-scale sine, or None where that is not known."""
    return calibration.output_vrms(wiring.output)
