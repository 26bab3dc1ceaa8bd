"""Makes form rows from fields that were declared once, and builds the value back from what was typed."""

import types
from collections.abc import Callable, Iterable, Mapping, Sequence
from enum import Enum
from typing import Any, TypeVar, get_args

import attrs
from PySide6.QtCore import QEvent, Qt, Signal
from PySide6.QtGui import QKeyEvent
from PySide6.QtWidgets import QGridLayout, QHBoxLayout, QLabel, QLineEdit, QVBoxLayout, QWidget

from wattproof.core.errors import WrongUseError
from wattproof.core.fields import Declared, fields_of
from wattproof.gui.controls import FlatButton
from wattproof.gui.figures import MINUS
from wattproof.gui.theme import Theme

Value = TypeVar("Value")
_YES, _NO = "yes", "no"
_NOTHING = "–"


class Choices(QWidget):
    """A label and a row of exclusive buttons, each standing for a value."""

    changed = Signal()

    def __init__(self, theme: Theme, label: str, choices: Sequence[tuple[object, str]], help_text: str = "") -> None:
        super().__init__()
        rows = QVBoxLayout(self)
        rows.setContentsMargins(0, 0, 0, 0)
        rows.setSpacing(3)
        name = QLabel(label)
        name.setToolTip(help_text)
        rows.addWidget(name)
        row = QHBoxLayout()
        row.setSpacing(6)
        self.buttons: list[tuple[object, FlatButton]] = []
        for value, words in choices:
            button = FlatButton(theme, words)
            button.setCheckable(True)
            button.setAccessibleName(f"{label} {words}")
            button.setToolTip(help_text)
            button.clicked.connect(lambda _=False, chosen=value: self._chosen(chosen))
            self.buttons.append((value, button))
            row.addWidget(button, 1)
        rows.addLayout(row)
        self.value: Any = None
        if choices:
            self.choose(choices[0][0])

    def choose(self, value: object) -> None:
        """Show a value as chosen, without telling anybody."""
        self.value = value
        for each, button in self.buttons:
            button.setChecked(each == value)

    def _chosen(self, value: object) -> None:
        self.choose(value)
        self.changed.emit()


class Entry(QLineEdit):
    """A typed number or word; an empty one stands for "not stated". The space bar is the tone's where numbers go."""

    changed = Signal()

    def __init__(self, label: str, *, words: bool, empty: str = _NOTHING) -> None:
        super().__init__()
        self._words = words
        self.setAccessibleName(label)
        self.setPlaceholderText(empty)
        self.setAlignment(Qt.AlignmentFlag.AlignLeft if words else Qt.AlignmentFlag.AlignRight)
        self.editingFinished.connect(self.changed.emit)

    def event(self, event: QEvent) -> bool:
        """Let the space bar through to the window where no number needs it."""
        asks = event.type() is QEvent.Type.ShortcutOverride
        if asks and not self._words and isinstance(event, QKeyEvent) and event.key() == Qt.Key.Key_Space:
            event.ignore()
            return False
        return super().event(event)

    @property
    def typed(self) -> str:
        """What was typed, with a plain minus and a decimal point."""
        text = self.text().strip().replace(MINUS, "-")
        return text if self._words else text.replace(",", ".")


class Form(QWidget):
    """Rows for the declared fields of a class, in order; `only` picks some of them."""

    changed = Signal()

    def __init__(
        self,
        theme: Theme,
        cls: type[Any],
        *,
        only: Iterable[str] | None = None,
        without: Iterable[str] = (),
        values: Mapping[str, object] | None = None,
    ) -> None:
        super().__init__()
        self.theme = theme
        picked, left_out = None if only is None else set(only), set(without)
        self.fields = [
            field for field in fields_of(cls) if (picked is None or field.name in picked) and field.name not in left_out
        ]
        self.widgets: dict[str, Choices | Entry] = {}
        self._grid = QGridLayout(self)
        self._grid.setContentsMargins(0, 0, 0, 0)
        self._grid.setColumnStretch(0, 1)
        for field in self.fields:
            given = (values or {}).get(field.name, _default(field))
            self._add(field, given)

    def _add(self, field: Declared, value: object) -> None:
        row = self._grid.rowCount()
        kind = kind_of(field)
        widget: Choices | Entry
        if kind is bool or (isinstance(kind, type) and issubclass(kind, Enum)):
            options = [(True, _YES), (False, _NO)] if kind is bool else [(each, str(each.value)) for each in kind]
            widget = Choices(self.theme, field.label, options, field.help)
            self._grid.addWidget(widget, row, 0, 1, 3)
        else:
            widget = Entry(field.label, words=kind is str)
            widget.setToolTip(field.help)
            name = QLabel(field.label)
            name.setWordWrap(True)
            name.setToolTip(field.help)
            name.setBuddy(widget)
            self._grid.addWidget(name, row, 0)
            self._grid.addWidget(widget, row, 1)
            self._grid.addWidget(QLabel("" if field.unit == "1" else field.unit), row, 2)
        widget.changed.connect(self.changed.emit)
        self.widgets[field.name] = widget
        self._show(widget, value)

    def show_values(self, values: Mapping[str, object]) -> None:
        """Show values by field name; others stay."""
        for name, value in values.items():
            if name in self.widgets:
                self._show(self.widgets[name], value)

    @staticmethod
    def _show(widget: Choices | Entry, value: object) -> None:
        if isinstance(widget, Choices):
            widget.choose(value)
        else:
            widget.setText("" if value is None or value is attrs.NOTHING else _written(value))

    def values(self) -> dict[str, Any]:
        """Return what was typed and chosen, by field name.

        Raises:
            WrongUseError: something that is no number stands where one belongs.
        """
        return {field.name: self._value(field) for field in self.fields}

    def _value(self, field: Declared) -> Any:  # noqa: ANN401 - a field may be of any type
        widget, kind = self.widgets[field.name], kind_of(field)
        if isinstance(widget, Choices):
            return widget.value
        if not widget.typed and kind is not str:
            if optional(field):
                return None
            raise WrongUseError(f"{field.label} is empty; give {_wanted(field)}")
        if kind is str:
            return widget.typed
        return number(field.label, widget.typed, whole=kind is int, wanted=_wanted(field))


def number(label: str, typed: str, *, whole: bool = False, wanted: str = "a number") -> float | int:
    """Return a typed number.

    Raises:
        WrongUseError: it is none.
    """
    try:
        return int(typed) if whole else float(typed)
    except ValueError as error:
        raise WrongUseError(f'{label} is "{typed[:20]}"; give {wanted}') from error


def built(make: Callable[..., Value], values: Mapping[str, Any]) -> Value:
    """Build a value from a form's values.

    Raises:
        WrongUseError: a value outside its range, or fields that do not fit together; the line is the value's own.
    """
    try:
        return make(**values)
    except ValueError as error:
        raise WrongUseError(str(error)) from error


def kind_of(field: Declared) -> Any:  # noqa: ANN401 - a type, which has no common type of its own
    """Return a field's type, without "or None"."""
    if not isinstance(field.kind, types.UnionType):
        return field.kind
    kinds = [kind for kind in get_args(field.kind) if kind is not type(None)]
    return kinds[0] if len(kinds) == 1 else field.kind


def optional(field: Declared) -> bool:
    """Return whether a field may be left empty."""
    return isinstance(field.kind, types.UnionType) and type(None) in get_args(field.kind)


def _default(field: Declared) -> object:
    return field.default


def _written(value: object) -> str:
    return f"{value:.6g}".replace("-", MINUS) if isinstance(value, float) else str(value)


def _wanted(field: Declared) -> str:
    low = "" if field.minimum is None else f" from {field.minimum:g}"
    high = "" if field.maximum is None else f" to {field.maximum:g}"
    unit = "" if field.unit in ("", "1") else f" in {field.unit}"
    return f"a number{unit}{low}{high}"
