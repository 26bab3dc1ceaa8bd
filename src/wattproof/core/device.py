"""What is tested and by whom: what a session is about."""

import attrs

from wattproof.core.fields import declared


@attrs.frozen(kw_only=True)
class DeviceUnderTest:
    """The amplifier on the bench, as its plate and its box say, and who tests it."""

    name: str = declared("", label="Amplifier", help="maker and model, as on its plate")
    serial: str = declared("", label="Serial number", help="as on its plate")
    claim: str = declared("", label="Maker's claim", help='what the box or the data sheet says, as "2 x 50 W"')
    state: str = declared("", label="State", help='what state it is in, as "before repair" or "output stage renewed"')
    tested_by: str = declared("", label="Tested by", help="name of the person or the workshop")
