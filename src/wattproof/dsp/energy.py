"""Energy balance of an amplifier: what the supply gives, what the loads take, and what is left as heat."""

import attrs

from wattproof.core.quantity import Quantity
from wattproof.dsp.uncertainty import difference, ratio


@attrs.frozen
class EnergyBalance:
    """Efficiency as a plain ratio, and the power that is dissipated, in W."""

    efficiency: Quantity
    heat_w: Quantity


def energy_balance(output_w: Quantity, supply_w: Quantity) -> EnergyBalance:
    """Return output over supply and supply less output.

    Raises:
        ValueError: the supply gives nothing.
    """
    if supply_w.value <= 0.0:
        raise ValueError(f"a supply of {supply_w.value:g} W gives no efficiency; it must be above zero")
    return EnergyBalance(ratio(output_w, supply_w), difference(supply_w, output_w))
