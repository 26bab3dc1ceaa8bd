"""The attenuators that the planner's tests share."""

from wattproof.dsp.attenuator import Plan, plan
from wattproof.dsp.attenuator_wish import Wish


def into_8_ohm() -> Plan:
    """100 W single-ended into 8 Ω, rails of ±45 V, an interface of 4 V full scale and 10 kΩ."""
    return plan(Wish(power_w=100.0, load_ohm=8.0, full_scale_vrms=4.0, input_ohm=10e3, rail_v=45.0))


def into_4_ohm() -> Plan:
    """The same amplifier's 100 W into 4 Ω."""
    return plan(Wish(power_w=100.0, load_ohm=4.0, full_scale_vrms=4.0, input_ohm=10e3, rail_v=45.0))


def bridge_24_v() -> Plan:
    """One channel of a 24 V bridge-tied amplifier of 2×50 W into 4 Ω, balanced input of 20 kΩ."""
    return plan(Wish(power_w=50.0, load_ohm=4.0, full_scale_vrms=4.0, input_ohm=20e3, bridge_tied=True, rail_v=24.0))
