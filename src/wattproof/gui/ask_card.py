"""The card that asks a person for one thing: what, drawn; what follows; and the button that answers."""

from PySide6.QtCore import Signal
from PySide6.QtWidgets import QFrame, QHBoxLayout, QLabel, QVBoxLayout

from wattproof.bench.protocol import Control
from wattproof.gui import task_text
from wattproof.gui.ask_pictures import AskPicture
from wattproof.gui.controls import Adjuster, FlatButton, Range
from wattproof.gui.form import Entry
from wattproof.gui.theme import Theme
from wattproof.procedures.requests import Ask


class AskCard(QFrame):
    """One question at a time. `answered` is the main button, `declined` the other one."""

    answered = Signal()
    declined = Signal()
    turned = Signal(float)

    def __init__(self, theme: Theme) -> None:
        super().__init__()
        self.theme = theme
        self.ask: Ask | None = None
        self.setProperty("kind", "ask")
        self.picture = AskPicture(theme)
        self.words = QLabel()
        self.words.setWordWrap(True)
        self.words.setProperty("kind", "asked")
        self.below = QLabel()
        self.below.setWordWrap(True)
        self.below.setProperty("kind", "remark")
        self.knob: Adjuster | None = None
        self.entry = Entry(task_text.METER_SHOWS, words=False, empty=task_text.METER_EMPTY)
        self.entry.returnPressed.connect(self.answered.emit)
        self.main = FlatButton(theme, task_text.DONE_BUTTON)
        self.main.filled = True
        self.other = FlatButton(theme, task_text.NOT_YET_BUTTON)
        self.main.clicked.connect(lambda _=False: self.answered.emit())
        self.other.clicked.connect(lambda _=False: self.declined.emit())
        self.rows = QVBoxLayout(self)
        for widget in (self.picture, self.words, self.below, self.entry):
            self.rows.addWidget(widget)
        buttons = QHBoxLayout()
        buttons.addWidget(self.main, 1)
        buttons.addWidget(self.other, 1)
        self.rows.addLayout(buttons)
        self.hide()

    def give_knob(self, control: Control | None) -> None:
        """Put the bench's own volume control on the card, where it has one."""
        if control is None or self.knob is not None:
            return
        self.knob = Adjuster(self.theme, task_text.KNOB, Range(control.minimum, control.maximum, control.unit, 1))
        self.knob.adjusted.connect(self.turned.emit)
        self.rows.insertWidget(3, self.knob)

    def show_ask(  # noqa: PLR0913 - what a card may hold
        self, ask: Ask, below: str, main: str, other: str = "", *, knob: bool = False, typed: bool = False
    ) -> None:
        """Ask for something; `main` and `other` are the buttons' words; `typed`: a number is the answer."""
        if ask == self.ask and not self.isHidden():
            return
        self.ask = ask
        self.picture.show_ask(ask)
        self.picture.show()
        self.words.setText(task_text.asked(ask))
        self.below.setText(below)
        self.below.setVisible(bool(below))
        for button, words in ((self.main, main), (self.other, other)):
            button.setText(words)
            button.setAccessibleName(words)
            button.setVisible(bool(words))
        if self.knob is not None:
            self.knob.setVisible(knob)
        self.entry.setVisible(typed)
        self.entry.clear()
        self.setAccessibleName(f"{task_text.asked(ask)} {below}")
        self.show()
        if typed:
            self.entry.setFocus()
        elif main:
            self.main.setFocus()

    def put_away(self) -> None:
        """Ask nothing."""
        if self.ask is not None or not self.isHidden():
            self.ask = None
            self.hide()
