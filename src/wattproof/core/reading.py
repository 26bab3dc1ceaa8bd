"""What was read from one span of one channel, and how it was asked for."""

from enum import StrEnum

import attrs

from wattproof.core import checks
from wattproof.core.fields import declared
from wattproof.core.notes import Note
from wattproof.core.quantity import Quantity
from wattproof.core.signal import Span


class State(StrEnum):
    """Whether a span could be read, and if not why. A file never has gaps; a live capture may."""

    OK = "ok"
    OVERLOAD = "overload"
    NO_TONE = "no tone"
    UNSTEADY = "unsteady"
    TOO_SHORT = "too short"
    GAP = "gap"


class Reference(StrEnum):
    """What a distortion ratio is taken to (IEC 60268-3 takes the total)."""

    TOTAL = "total"
    FUNDAMENTAL = "fundamental"


class Remark(StrEnum):
    """What keeps a harmonic from being taken at its face value."""

    NOT_SEEN = "not seen"
    MAY_CONTAIN_MAINS = "may contain mains"


@attrs.frozen
class ReadingSettings:
    """How a span is read. Every field is declared once; options, forms and files are made from the declaration."""

    low_hz: float = declared(
        20.0, label="Band from", unit="Hz", help="lower edge of the measuring band", validator=checks.not_negative
    )
    high_hz: float = declared(
        20_000.0, label="Band to", unit="Hz", help="upper edge of the measuring band", validator=checks.positive
    )
    reference: Reference = declared(
        Reference.TOTAL, label="Ratio to", help="what distortion is compared with: total signal or fundamental"
    )
    full_scale_vrms: float | None = declared(
        None,
        label="Full scale",
        unit="V rms",
        help="V rms of a full-scale sine at this point (0 dBFS, AES17)",
        validator=checks.positive,
    )
    load_ohm: float | None = declared(
        None, label="Load", unit="Ω", help="resistance that takes the power", validator=checks.positive
    )

    def __attrs_post_init__(self) -> None:
        if self.low_hz >= self.high_hz:
            raise ValueError(
                f"the band {self.low_hz:g}-{self.high_hz:g} Hz is reversed or empty; give LO-HI, LO below HI"
            )
        if self.load_ohm is not None and self.full_scale_vrms is None:
            raise ValueError("a load without a full-scale voltage gives no power; state the V rms of full scale too")

    @property
    def band_hz(self) -> tuple[float, float]:
        """Both edges of the band, in Hz; both belong to it."""
        return self.low_hz, self.high_hz


@attrs.frozen
class Harmonic:
    """One harmonic. `ratio` is to the fundamental; `phase_rad` is φk in sin θ + Σ ak·sin(kθ + φk)."""

    order: int
    frequency_hz: float
    ratio: Quantity
    phase_rad: float
    remark: Remark | None = None


@attrs.frozen
class MainsLine:
    """One line of hum. `ratio` is to the fundamental; where there is no tone, to the total in the band."""

    frequency_hz: float
    ratio: Quantity


@attrs.frozen
class Mains:
    """The mains frequency that was found (None: no line seen) and its lines inside the band."""

    frequency_hz: float | None = None
    lines: tuple[MainsLine, ...] = ()


@attrs.frozen(kw_only=True)
class Reading:
    """The quantities of one span of one channel.

    Levels are plain ratios: `level_fs`, `fundamental_fs`, `noise_fs` and `hum_fs` are rms to the rms of a full-scale
    sine, `dc_fs` and `peak_fs` to full scale. `thdn`, `thd`, `noise`, `hum` are to the chosen reference. What cannot be
    honest in a state other than ok is None.
    """

    span: Span
    channel: int = attrs.field(validator=checks.counted_from_one)
    settings: ReadingSettings
    state: State
    notes: tuple[Note, ...] = ()
    fundamental_hz: Quantity | None = None
    fundamental_fs: Quantity | None = None
    level_fs: Quantity | None = None
    level_vrms: Quantity | None = None
    power_w: Quantity | None = None
    dc_fs: Quantity | None = None
    peak_fs: float | None = None
    crest_factor: Quantity | None = None
    thdn: Quantity | None = None
    thd: Quantity | None = None
    noise: Quantity | None = None
    hum: Quantity | None = None
    mains: Mains = Mains()
    harmonics: tuple[Harmonic, ...] = ()
    moving_db_per_s: float = 0.0

    @property
    def sinad(self) -> Quantity | None:
        """SINAD as a plain ratio: total over everything but the fundamental (None where THD+N is)."""
        if self.thdn is None or self.thdn.value <= 0.0:
            return None
        total_over_residual = 1.0 / self.thdn.value
        if self.settings.reference == Reference.FUNDAMENTAL:
            total_over_residual = (1.0 + total_over_residual**2) ** 0.5
        slope = total_over_residual / self.thdn.value
        if self.settings.reference == Reference.FUNDAMENTAL:
            slope = 1.0 / (self.thdn.value**3 * total_over_residual)
        parts = tuple(attrs.evolve(part, u=-part.u * slope) for part in self.thdn.parts)
        return Quantity(total_over_residual, "1", parts, self.thdn.limited_by)
