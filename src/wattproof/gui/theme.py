"""Paper and ink: the two palettes, the one typeface with digits of equal width, and the scale of the window."""

from enum import StrEnum
from functools import cache
from importlib import resources

import attrs
from PySide6.QtCore import QObject, Qt, Signal
from PySide6.QtGui import QColor, QFont, QFontDatabase, QGuiApplication, QPalette

_LEAST_TEXT_PX = 12  # below this, text can't be read at arm's length on a common 96 dpi screen
_TIGHT_FROM_PX = 26  # large digits stand closer, as the typeface's own display cut has them
_FAMILY = "Inter"
_FALLBACKS = ("Noto Sans", "DejaVu Sans", "Segoe UI", "Helvetica Neue", "Arial")


@attrs.frozen
class Palette:
    """Colours by what they say: blue is measured, ink is set, soft is context, warn warns and does nothing else."""

    dark: bool
    ground: str
    paper: str
    ink: str
    soft: str
    line: str
    blue: str
    ghost: str
    warn: str
    warn_paper: str

    def color(self, name: str) -> QColor:
        """Return one of the colours by its name."""
        return _color(getattr(self, name))


@cache
def _color(written: str) -> QColor:
    return QColor(written)


LIGHT = Palette(
    dark=False,
    ground="#f5f3ed",
    paper="#fdfcf8",
    ink="#1b2530",
    soft="#5f656d",
    line="#dcd9d0",
    blue="#0067a8",
    ghost="#c3beb2",
    warn="#c84e00",
    warn_paper="#fcefe2",
)
DARK = Palette(
    dark=True,
    ground="#1c1b19",
    paper="#242320",
    ink="#eee9dc",
    soft="#a8a399",
    line="#3a3833",
    blue="#5cb4f2",
    ghost="#5b5850",
    warn="#ff8f42",
    warn_paper="#382819",
)


class Weight(StrEnum):
    """The three weights that travel in the package."""

    REGULAR = "regular"
    MEDIUM = "medium"
    BOLD = "semibold"


_QT_WEIGHT = {
    Weight.REGULAR: QFont.Weight.Normal,
    Weight.MEDIUM: QFont.Weight.Medium,
    Weight.BOLD: QFont.Weight.DemiBold,
}


class Choice(StrEnum):
    """Which palette is wanted."""

    SYSTEM = "system"
    LIGHT = "light"
    DARK = "dark"


def load_fonts() -> None:
    """Make the packaged typeface known to Qt; without it Qt falls back to a sans serif of the system."""
    folder = resources.files("wattproof.gui") / "fonts"
    for file in folder.iterdir():
        if file.name.endswith(".otf"):
            QFontDatabase.addApplicationFontFromData(file.read_bytes())


class Theme(QObject):
    """The palette and the scale in force. `changed` says that everything must be drawn anew."""

    changed = Signal()

    def __init__(self, choice: Choice = Choice.SYSTEM) -> None:
        super().__init__()
        self.choice = choice
        self.scale = 1.0
        self._fonts: dict[tuple[float, Weight], QFont] = {}
        QGuiApplication.styleHints().colorSchemeChanged.connect(self._system_changed)

    @property
    def palette(self) -> Palette:
        """The colours in force."""
        if self.choice is Choice.SYSTEM:
            system_is_dark = QGuiApplication.styleHints().colorScheme() is Qt.ColorScheme.Dark
            return DARK if system_is_dark else LIGHT
        return DARK if self.choice is Choice.DARK else LIGHT

    def choose(self, choice: Choice) -> None:
        """Change the palette."""
        self.choice = choice
        self.changed.emit()

    def set_scale(self, scale: float) -> None:
        """Set how large a unit of the drawing is (1 at 1920 × 1080)."""
        if scale != self.scale:
            self.scale = scale
            self._fonts.clear()
            self.changed.emit()

    def px(self, size: float) -> float:
        """Return a length of the drawing in pixels of this window."""
        return size * self.scale

    def font(self, size: float, weight: Weight = Weight.REGULAR) -> QFont:
        """Return the typeface at a size of the drawing, never smaller than can be read."""
        key = (size, weight)
        if key not in self._fonts:
            self._fonts[key] = exact_font(max(_LEAST_TEXT_PX, round(self.px(size))), weight)
        return self._fonts[key]

    def qt_palette(self) -> QPalette:
        """Return the palette for Qt's own widgets."""
        colors = self.palette
        palette = QPalette()
        roles = {
            QPalette.ColorRole.Window: colors.ground,
            QPalette.ColorRole.Base: colors.paper,
            QPalette.ColorRole.Button: colors.paper,
            QPalette.ColorRole.WindowText: colors.ink,
            QPalette.ColorRole.Text: colors.ink,
            QPalette.ColorRole.ButtonText: colors.ink,
            QPalette.ColorRole.Highlight: colors.blue,
            QPalette.ColorRole.HighlightedText: colors.paper,
            QPalette.ColorRole.PlaceholderText: colors.soft,
        }
        for role, color in roles.items():
            palette.setColor(role, QColor(color))
        return palette

    def _system_changed(self) -> None:
        if self.choice is Choice.SYSTEM:
            self.changed.emit()


def exact_font(pixels: int, weight: Weight) -> QFont:
    """Return the typeface at a size in pixels, with digits of equal width."""
    font = QFont([_FAMILY, *_FALLBACKS])
    font.setPixelSize(pixels)
    font.setWeight(_QT_WEIGHT[weight])
    font.setFeature(QFont.Tag("tnum"), 1)
    if pixels > _TIGHT_FROM_PX:
        font.setLetterSpacing(QFont.SpacingType.PercentageSpacing, 96.5)
    font.setHintingPreference(QFont.HintingPreference.PreferNoHinting)
    return font
