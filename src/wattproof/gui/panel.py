"""The column where the hand works: its head, the open page, what is asked, the notice, and the one big button."""

from collections.abc import Callable, Sequence

import attrs
from PySide6.QtCore import QPointF, QRectF, QSize, Qt, Signal
from PySide6.QtGui import QPainter, QPaintEvent, QPolygonF
from PySide6.QtWidgets import QFrame, QLabel, QScrollArea, QSizePolicy, QStackedWidget, QVBoxLayout, QWidget

from wattproof.bench.protocol import Control
from wattproof.gui import text
from wattproof.gui.ask_card import AskCard
from wattproof.gui.controls import Adjuster, FlatButton, Range, Switch
from wattproof.gui.paths import solid
from wattproof.gui.stations import Place, decimals_of, is_load, setting
from wattproof.gui.task_head import TaskHead
from wattproof.gui.theme import Theme, Weight

Turn = Callable[[str, float], None]


@attrs.frozen
class Hands:
    """What the pages may do: each call may show a refusal."""

    wish_frequency: Callable[[float], None]
    wish_level: Callable[[float], None]
    wish_channel: Callable[[int], None]
    set_limit_vrms: Callable[[float], None]
    set_limit_fs: Callable[[float], None]
    turn: Turn
    new_stroke: Callable[[], None]


class ToneButton(FlatButton):
    """The big button that starts and stops the tone: shape and word say which."""

    def sizeHint(self) -> QSize:
        """Return a size that is found without looking."""
        return QSize(200, round(max(52, self.theme.px(84))))

    def paintEvent(self, _event: QPaintEvent) -> None:
        """Draw a square to stop, a triangle to start, the words and the key."""
        colors, px = self.theme.palette, self.theme.px
        with QPainter(self) as painter:
            painter.setRenderHint(QPainter.RenderHint.Antialiasing)
            frame = QRectF(self.rect()).adjusted(2, 2, -2, -2)
            on = self.isChecked()
            painter.setPen(solid(colors.color("blue" if self.hasFocus() else "ink"), 3.5 if self.hasFocus() else 2))
            painter.setBrush(colors.color("ink" if on else "paper"))
            painter.drawRoundedRect(frame, 8, 8)
            inside = colors.color("paper" if on else "ink")
            painter.setPen(inside)
            half = max(7.0, px(11))
            centre = frame.left() + max(26.0, px(44)), frame.center().y()
            painter.setBrush(inside)
            if on:
                painter.drawRect(QRectF(centre[0] - half, centre[1] - half, 2 * half, 2 * half))
            else:
                _draw_start(painter, centre[0], centre[1], half)
            words = frame.adjusted(max(46.0, px(78)), 0, -8, 0)
            painter.setFont(self.theme.font(25, Weight.BOLD))
            painter.drawText(words.adjusted(0, 0, 0, -words.height() * 0.3), _LEFT, self.text())
            painter.setFont(self.theme.font(17))
            painter.drawText(words.adjusted(0, words.height() * 0.46, 0, 0), _LEFT, text.SPACE_BAR)


_LEFT = Qt.AlignmentFlag.AlignLeft | Qt.AlignmentFlag.AlignVCenter


def _draw_start(painter: QPainter, x: float, y: float, half: float) -> None:
    corners = [QPointF(x - half * 0.8, y - half), QPointF(x - half * 0.8, y + half), QPointF(x + half, y)]
    painter.drawPolygon(QPolygonF(corners))


class Page(QWidget):
    """One station's settings, from top to bottom."""

    def __init__(self, theme: Theme) -> None:
        super().__init__()
        self.theme = theme
        self.rows = QVBoxLayout(self)
        self.rows.setContentsMargins(2, 0, 10, 0)
        self.facts: dict[str, QLabel] = {}

    def add_fact(self, label: str) -> None:
        """Add a line that only states something."""
        fact = QLabel()
        fact.setWordWrap(True)
        self.facts[label] = fact
        self.rows.addWidget(fact)

    def set_fact(self, label: str, words: str) -> None:
        """State it, where the page has such a line."""
        if label not in self.facts:
            return
        soft = self.theme.palette.soft
        shown = f'<span style="color:{soft}">{label}</span>&nbsp; <span style="font-weight:600">{words}</span>'
        if self.facts[label].text() != shown:
            self.facts[label].setText(shown)

    def add_words(self, words: str, kind: str = "remark") -> None:
        """Add a sentence."""
        label = QLabel(words)
        label.setWordWrap(True)
        label.setProperty("kind", kind)
        self.rows.addWidget(label)

    def add_cautions(self, *cautions: str) -> None:
        """Add cautions at the foot of the page, where the hand is."""
        self.rows.addStretch(1)
        for caution in cautions:
            self.add_words(f'<span style="font-weight:600">△ {text.CAUTION}.</span> {caution}', "caution")


class Panel(QWidget):
    """The pages in a stack, the notice and the tone's button below."""

    tone_toggled = Signal()

    def __init__(self, theme: Theme, parent: QWidget) -> None:
        super().__init__(parent)
        self.theme = theme
        self.pages = {place: Page(theme) for place in Place}
        self.head = TaskHead(theme, "")
        self.head.setCheckable(True)
        self.heading = QLabel()
        self.heading.setProperty("kind", "heading")
        self.stack = QStackedWidget()
        self.scrolls: dict[str, QScrollArea] = {}
        self._all: list[Page] = []
        for place, page in self.pages.items():
            self.add_page(place.value, page)
        self.card = AskCard(theme)
        self.hint = QLabel()
        self.hint.setWordWrap(True)
        self.hint.setProperty("kind", "hint")
        self.notice = QLabel()
        self.notice.setWordWrap(True)
        self.notice.setTextFormat(Qt.TextFormat.PlainText)
        self.notice.setProperty("kind", "notice")
        self.notice.hide()
        self.tone = ToneButton(theme, text.START)
        self.tone.setCheckable(True)
        self.tone.setSizePolicy(QSizePolicy.Policy.Expanding, QSizePolicy.Policy.Fixed)
        self.tone.clicked.connect(lambda _=False: self.tone_toggled.emit())
        rows = QVBoxLayout(self)
        rows.setContentsMargins(0, 0, 0, 0)
        rows.addWidget(self.head)
        rows.addWidget(self.heading)
        rows.addWidget(self.stack, 1)
        rows.addWidget(self.card)
        rows.addWidget(self.hint)
        rows.addWidget(self.notice)
        rows.addWidget(self.tone)
        self.adjusters: dict[str, Adjuster | Switch] = {}

    def add_page(self, name: str, page: Page) -> None:
        """Add a page that `show_page` shows by its name."""
        scroll = QScrollArea()
        scroll.setWidgetResizable(True)
        scroll.setFrameShape(QFrame.Shape.NoFrame)
        scroll.setHorizontalScrollBarPolicy(Qt.ScrollBarPolicy.ScrollBarAlwaysOff)
        scroll.setFocusPolicy(Qt.FocusPolicy.NoFocus)
        scroll.setWidget(page)
        self.scrolls[name] = scroll
        self._all.append(page)
        self.stack.addWidget(scroll)

    def show_page(self, name: str, heading: str = "") -> None:
        """Show a page, a station's settings by its place."""
        self.stack.setCurrentWidget(self.scrolls[name])
        self.heading.setText(heading)
        self.heading.setVisible(bool(heading))

    def set_head(self, words: str, *, listed: bool) -> None:
        """Say what is being done, and whether the list is open."""
        self.head.setText(words)
        self.head.setAccessibleName(words)
        self.head.setChecked(listed)
        self.head.update()

    def set_tone(self, *, on: bool, words: str = "") -> None:
        """Show whether the tone is wanted, or what else the big button does."""
        self.tone.setChecked(on)
        words = words or (text.STOP if on else text.START)
        self.tone.setText(words)
        self.tone.setAccessibleName(words)

    def set_hint(self, words: str) -> None:
        """Say what comes next."""
        if words != self.hint.text():
            self.hint.setText(words)

    def say(self, words: str) -> None:
        """Show a notice until the next one; "" takes it away."""
        self.notice.setText(f"▲  {words}" if words else "")
        self.notice.setVisible(bool(words))

    def add_control(self, control: Control, turn: Turn) -> None:
        """Render one of the bench's own controls from its declaration."""
        made: Adjuster | Switch
        if control.choices:
            words = [(choice, setting(_at(control, choice))) for choice in control.choices]
            made = Switch(self.theme, control.label, words, control.help)
        else:
            span = Range(control.minimum, control.maximum, control.unit, decimals_of(control))
            made = Adjuster(self.theme, control.label, span, control.help)
        made.show_value(control.value)
        made.adjusted.connect(lambda value, name=control.name: turn(name, value))
        self.adjusters[control.name] = made
        place = Place.LOAD if is_load(control) else Place.AMPLIFIER
        self.pages[place].rows.addWidget(made)

    def show_controls(self, controls: Sequence[Control]) -> None:
        """Show what is in force on the bench."""
        for control in controls:
            if control.name in self.adjusters:
                self.adjusters[control.name].show_value(control.value)

    def respace(self) -> None:
        """Set spacing for the scale in force."""
        for page in self._all:
            page.rows.setSpacing(round(max(8, self.theme.px(16))))
        layout = self.layout()
        if layout is not None:
            layout.setSpacing(round(max(6, self.theme.px(12))))


def _at(control: Control, value: float) -> Control:
    return attrs.evolve(control, value=value)
