"""A sheet of paper where the plots are: a picture above, and a text that scrolls below it."""

from PySide6.QtCore import QRectF, Qt
from PySide6.QtGui import QPainter, QPaintEvent
from PySide6.QtSvg import QSvgRenderer
from PySide6.QtWidgets import QFrame, QLabel, QScrollArea, QSizePolicy, QVBoxLayout, QWidget

from wattproof.gui.theme import DARK, LIGHT, Theme


class Picture(QWidget):
    """A drawing (SVG), as large as fits, in its own proportions."""

    def __init__(self, theme: Theme, recolor: dict[str, str] | None = None) -> None:
        super().__init__()
        self.theme = theme
        self._recolor = recolor or {}  # colours of the drawing, and the names of the theme's that take their place
        self._svg = ""
        self._shown = ""
        self._renderer = QSvgRenderer()
        self.setSizePolicy(QSizePolicy.Policy.Expanding, QSizePolicy.Policy.Expanding)
        self.setMinimumHeight(120)
        theme.changed.connect(self.update)

    def show_svg(self, svg: str) -> None:
        """Show another drawing, "" for none."""
        self._svg = svg
        self.setVisible(bool(svg))
        self.update()

    def paintEvent(self, _event: QPaintEvent) -> None:
        """Draw it in the theme's colours."""
        colors = DARK if self.theme.palette.dark else LIGHT
        svg = self._svg
        for color, name in self._recolor.items():
            svg = svg.replace(color, getattr(colors, name))
        if svg != self._shown:
            self._renderer.load(svg.encode())
            self._shown = svg
        size = self._renderer.defaultSize()
        if not svg or size.isEmpty():
            return
        scale = min(self.width() / size.width(), self.height() / size.height())
        wide, high = scale * size.width(), scale * size.height()
        with QPainter(self) as painter:
            painter.setRenderHint(QPainter.RenderHint.Antialiasing)
            self._renderer.render(painter, QRectF((self.width() - wide) / 2, (self.height() - high) / 2, wide, high))


class PaperSheet(QWidget):
    """A picture and a text."""

    def __init__(self, theme: Theme, recolor: dict[str, str] | None = None, *, fixed: bool = False) -> None:
        super().__init__()
        self.picture = Picture(theme, recolor)
        self.text = QLabel()
        self.text.setWordWrap(not fixed)
        self.text.setTextInteractionFlags(Qt.TextInteractionFlag.TextSelectableByMouse)
        self.text.setAlignment(Qt.AlignmentFlag.AlignTop | Qt.AlignmentFlag.AlignLeft)
        self.text.setProperty("kind", "table" if fixed else "sheet")
        self.scroller = QScrollArea()
        self.scroller.setWidgetResizable(True)
        self.scroller.setFrameShape(QFrame.Shape.NoFrame)
        self.scroller.setWidget(self.text)
        self.scroller.setFocusPolicy(Qt.FocusPolicy.NoFocus)
        rows = QVBoxLayout(self)
        rows.setContentsMargins(0, 0, 0, 0)
        rows.addWidget(self.picture, 3)
        rows.addWidget(self.scroller, 4)
        self.picture.hide()

    def show_text(self, words: str) -> None:
        """Show a text."""
        self.text.setText(words)
