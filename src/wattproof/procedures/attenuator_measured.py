"""An attenuator as it was measured instead of computed: its ratio, and what a bridge's two legs reject."""

from wattproof.core.errors import WrongUseError
from wattproof.core.quantity import Quantity
from wattproof.core.rig import Attenuator
from wattproof.dsp.attenuation import leg_of
from wattproof.dsp.uncertainty import named_scatter, product, ratio

FURTHEST = 0.2  # from what the resistors say: an attenuator that measures further off is wired wrongly


def measured_ratio(terminals_v: Quantity, level_fs: Quantity, scale: Quantity, attenuator: Attenuator) -> Quantity:
    """Return volts in over volts out: what a meter shows at the terminals over what the input reads at the same time.

    With the meter that the input was calibrated by, its accuracy cancels as far as both are one source.

    Raises:
        WrongUseError: it is more than a fifth off what the stated resistors make.
    """
    at_input = product(named_scatter(level_fs, "ratio"), scale, "V")
    found = ratio(terminals_v, at_input)
    leg = leg_of(attenuator)
    if leg is not None and not 1.0 - FURTHEST < found.value / leg.ratio < 1.0 + FURTHEST:
        raise WrongUseError(
            f"the attenuator measures ÷{found.value:.4g} and its resistors make ÷{leg.ratio:.4g}; look at the wiring, "
            "the input's impedance and the meter's range"
        )
    return found


def bridge_rejection(both_taps_fs: Quantity, scale: Quantity, tap_v: Quantity, attenuation: float) -> Quantity:
    """Return the rejection of common mode, as a plain ratio: both taps stand on one point that carries `tap_v`.

    It is the difference gain, 1/attenuation, over the gain from that point to the input.

    Raises:
        WrongUseError: nothing stands on the taps, or nothing of it is seen.
    """
    if tap_v.value <= 0.0:
        raise WrongUseError("nothing stands on the taps: join both to one output terminal that carries a tone")
    arrives = ratio(product(named_scatter(both_taps_fs, "rejection"), scale, "V"), tap_v)
    if arrives.value <= 2.0 * arrives.u:
        raise WrongUseError("what arrives drowns in the noise; put more on the taps, within the input's limit")
    rejection = 1.0 / (attenuation * arrives.value)
    return Quantity(rejection, "1", arrives.scaled(-rejection / arrives.value, "1").parts)
