"""Which recording a reading came from."""

import attrs

from wattproof.core import checks


@attrs.frozen
class Source:
    """A recording as a whole: its name as given, rate, length in frames, channels, and the SHA-256 of its bytes."""

    file: str
    rate_hz: float = attrs.field(validator=checks.positive)
    frames: int = attrs.field(validator=checks.not_negative)
    channels: int = attrs.field(validator=checks.counted_from_one)
    sha256: str
