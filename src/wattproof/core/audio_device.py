"""One audio device of the sound system, as a list of devices shows it."""

import attrs

RATES_HZ = (44_100.0, 48_000.0, 88_200.0, 96_000.0, 176_400.0, 192_000.0)  # what is tried


@attrs.frozen
class Device:
    """A device as the sound system offers it. `choice` is what names it, in full, for `--bench`.

    `rates_hz` are those of RATES_HZ at which it really opened; none where it opened at none; None where it was not
    tried or did not answer in time.
    """

    host_api: str
    name: str
    inputs: int
    outputs: int
    default_rate_hz: float
    rates_hz: tuple[float, ...] | None = None

    @property
    def choice(self) -> str:
        """HOST/NAME, in full."""
        return f"{self.host_api}/{self.name}"
