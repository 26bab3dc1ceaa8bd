"""The parts of a settings panel: a number field, a flat slider, a switch; each reachable by keys."""

import math
from collections.abc import Sequence

import attrs
from PySide6.QtCore import QEvent, QLocale, QRectF, QSize, Qt, Signal
from PySide6.QtGui import QFontMetricsF, QKeyEvent, QPainter, QPaintEvent, QValidator, QWheelEvent
from PySide6.QtWidgets import QAbstractButton, QDoubleSpinBox, QHBoxLayout, QLabel, QSlider, QVBoxLayout, QWidget

from wattproof.gui.figures import MINUS
from wattproof.gui.paths import solid
from wattproof.gui.theme import Theme, Weight

_STEPS = 1000  # of a slider from end to end


@attrs.frozen
class Range:
    """What a control may be set to. `log` spaces the slider by ratio."""

    minimum: float
    maximum: float
    unit: str
    decimals: int = 3
    log: bool = False

    def to_step(self, value: float) -> int:
        """Return the slider's step for a value."""
        if self.log:
            value = max(value, self.minimum)
            return round(_STEPS * math.log(value / self.minimum) / math.log(self.maximum / self.minimum))
        return round(_STEPS * (value - self.minimum) / (self.maximum - self.minimum))

    def to_value(self, step: int) -> float:
        """Return the value of a slider's step."""
        if self.log:
            return self.minimum * math.pow(self.maximum / self.minimum, step / _STEPS)
        return self.minimum + (self.maximum - self.minimum) * step / _STEPS


class NumberField(QDoubleSpinBox):
    """A number with its unit. The space bar is left to the tone, whatever has the focus."""

    def __init__(self, theme: Theme, span: Range, label: str) -> None:
        super().__init__()
        self.theme = theme
        self.setLocale(QLocale.c())
        self.setButtonSymbols(QDoubleSpinBox.ButtonSymbols.NoButtons)
        self.setKeyboardTracking(False)
        self.setDecimals(span.decimals)
        self.setRange(span.minimum, span.maximum)
        self.setStepType(QDoubleSpinBox.StepType.AdaptiveDecimalStepType)
        self.setSuffix(f" {span.unit}" if span.unit else "")
        self.setAlignment(Qt.AlignmentFlag.AlignRight)
        self.setAccessibleName(label)
        self.setFocusPolicy(Qt.FocusPolicy.StrongFocus)
        theme.changed.connect(self.recolor)
        self.recolor()

    def recolor(self) -> None:
        """Take the theme's colours; a style sheet on the window keeps fields from inheriting them."""
        self.setPalette(self.theme.qt_palette())

    def textFromValue(self, value: float) -> str:
        """Write the number without trailing zeros."""
        text = f"{value:.{self.decimals()}f}"
        text = text.rstrip("0").rstrip(".") if "." in text else text
        return "0" if text == "-0" else text.replace("-", MINUS)

    def valueFromText(self, text: str) -> float:
        """Read the number, whichever minus sign stands before it."""
        return super().valueFromText(text.replace(MINUS, "-"))

    def validate(self, text: str, position: int) -> tuple[QValidator.State, str, int]:
        """Judge the text, whichever minus sign stands before it."""
        return super().validate(text.replace(MINUS, "-"), position)[0], text, position

    def event(self, event: QEvent) -> bool:
        """Let the space bar through to the window: no number needs it."""
        asks = event.type() is QEvent.Type.ShortcutOverride
        if asks and isinstance(event, QKeyEvent) and event.key() == Qt.Key.Key_Space:
            event.ignore()
            return False
        return super().event(event)

    def wheelEvent(self, event: QWheelEvent) -> None:
        """Turn only where the field has the focus, so that scrolling past changes nothing."""
        if self.hasFocus():
            super().wheelEvent(event)
        else:
            event.ignore()


class Slider(QSlider):
    """A flat slider: a line, the part set in ink, and a plain handle."""

    def __init__(self, theme: Theme, label: str) -> None:
        super().__init__(Qt.Orientation.Horizontal)
        self.theme = theme
        self.setRange(0, _STEPS)
        self.setSingleStep(5)
        self.setPageStep(50)
        self.setAccessibleName(label)
        self.setFocusPolicy(Qt.FocusPolicy.StrongFocus)
        theme.changed.connect(self.update)

    def sizeHint(self) -> QSize:
        """Return a height that a finger can hit."""
        return QSize(120, round(max(24, self.theme.px(30))))

    def wheelEvent(self, event: QWheelEvent) -> None:
        """Turn one step a detent."""
        direction = (event.angleDelta().y() > 0) - (event.angleDelta().y() < 0)
        self.setValue(self.value() + direction * self.singleStep())
        event.accept()

    def paintEvent(self, _event: QPaintEvent) -> None:
        """Draw line and handle."""
        colors = self.theme.palette
        with QPainter(self) as painter:
            painter.setRenderHint(QPainter.RenderHint.Antialiasing)
            radius = max(8.0, self.theme.px(11))
            middle = self.height() / 2
            left, right = radius + 2, self.width() - radius - 2
            x = left + (right - left) * (self.value() - self.minimum()) / (self.maximum() - self.minimum())
            painter.setPen(solid(colors.color("ghost"), 3, round_ends=True))
            painter.drawLine(round(left), round(middle), round(right), round(middle))
            painter.setPen(solid(colors.color("ink"), 3, round_ends=True))
            painter.drawLine(round(left), round(middle), round(x), round(middle))
            painter.setBrush(colors.color("paper"))
            painter.setPen(solid(colors.color("blue" if self.hasFocus() else "ink"), 2.5))
            painter.drawEllipse(QRectF(x - radius, middle - radius, 2 * radius, 2 * radius))


class Adjuster(QWidget):
    """A labelled number field over a slider. `adjusted` is told only what a person did."""

    adjusted = Signal(float)

    def __init__(self, theme: Theme, label: str, span: Range, help_text: str = "", *, slider: bool = True) -> None:
        super().__init__()
        self.span = span
        self.field = NumberField(theme, span, label)
        self.slider = Slider(theme, label)
        self.slider.setVisible(slider)
        self.field.setToolTip(help_text)
        self.slider.setToolTip(help_text)
        name = QLabel(label)
        name.setBuddy(self.field)
        top = QHBoxLayout()
        top.addWidget(name, 1)
        top.addWidget(self.field, 1)
        rows = QVBoxLayout(self)
        rows.setContentsMargins(0, 0, 0, 0)
        rows.setSpacing(2)
        rows.addLayout(top)
        if slider:
            rows.addWidget(self.slider)
        self.field.valueChanged.connect(self._typed)
        self.slider.valueChanged.connect(self._slid)

    def show_value(self, value: float) -> None:
        """Show what is in force, without telling anybody, unless a person is just changing it."""
        if not self.slider.isSliderDown():
            self._set_quietly(self.slider, self.span.to_step(value))
        if not self.field.lineEdit().isModified():
            self._set_quietly(self.field, value)

    def _typed(self, value: float) -> None:
        self._set_quietly(self.slider, self.span.to_step(value))
        self.field.lineEdit().setModified(False)
        self.adjusted.emit(value)

    def _slid(self, step: int) -> None:
        value = self.span.to_value(step)
        self._set_quietly(self.field, value)
        self.adjusted.emit(value)

    @staticmethod
    def _set_quietly(widget: QSlider | QDoubleSpinBox, value: float) -> None:
        widget.blockSignals(True)
        if isinstance(widget, QSlider):
            widget.setValue(round(value))
        elif abs(widget.value() - value) >= 10.0 ** -(widget.decimals() + 1):
            widget.setValue(value)
        widget.blockSignals(False)


class FlatButton(QAbstractButton):
    """A plain button: ink on paper, filled where it is chosen."""

    def __init__(self, theme: Theme, label: str) -> None:
        super().__init__()
        self.theme = theme
        self.filled = False  # the one button that is meant to be pressed next
        self.setText(label)
        self.setAccessibleName(label)
        self.setFocusPolicy(Qt.FocusPolicy.StrongFocus)
        self.setCursor(Qt.CursorShape.PointingHandCursor)
        theme.changed.connect(self.update)

    def sizeHint(self) -> QSize:
        """Return a size that holds the label and can be hit."""
        width = QFontMetricsF(self.theme.font(18, Weight.MEDIUM)).horizontalAdvance(self.text())
        return QSize(round(max(48, width + 28)), round(max(30, self.theme.px(42))))

    def keyPressEvent(self, event: QKeyEvent) -> None:
        """Press on Return; the space bar is the tone's."""
        if event.key() in (Qt.Key.Key_Return, Qt.Key.Key_Enter):
            self.click()
        elif event.key() == Qt.Key.Key_Space:
            event.ignore()
        else:
            super().keyPressEvent(event)

    def paintEvent(self, _event: QPaintEvent) -> None:
        """Draw frame and label."""
        colors = self.theme.palette
        with QPainter(self) as painter:
            painter.setRenderHint(QPainter.RenderHint.Antialiasing)
            frame = QRectF(self.rect()).adjusted(1.5, 1.5, -1.5, -1.5)
            chosen = self.isChecked() or self.isDown() or self.filled
            painter.setPen(solid(colors.color("blue" if self.hasFocus() else "ink"), 2.5 if self.hasFocus() else 1.4))
            painter.setBrush(colors.color("ink" if chosen else "paper"))
            painter.drawRoundedRect(frame, 6, 6)
            painter.setPen(colors.color("paper" if chosen else "ink"))
            painter.setFont(self.theme.font(18, Weight.MEDIUM))
            painter.drawText(frame, Qt.AlignmentFlag.AlignCenter, self.text())


class Switch(QWidget):
    """A labelled row of exclusive buttons."""

    adjusted = Signal(float)

    def __init__(self, theme: Theme, label: str, choices: Sequence[tuple[float, str]], help_text: str = "") -> None:
        super().__init__()
        rows = QVBoxLayout(self)
        rows.setContentsMargins(0, 0, 0, 0)
        rows.setSpacing(4)
        rows.addWidget(QLabel(label))
        row = QHBoxLayout()
        row.setSpacing(6)
        self.buttons: dict[float, FlatButton] = {}
        for value, words in choices:
            button = FlatButton(theme, words)
            button.setCheckable(True)
            button.setAccessibleName(f"{label} {words}")
            button.setToolTip(help_text)
            button.clicked.connect(lambda _=False, chosen=value: self._chosen(chosen))
            self.buttons[value] = button
            row.addWidget(button, 1)
        rows.addLayout(row)

    def show_value(self, value: float) -> None:
        """Show what is in force."""
        for choice, button in self.buttons.items():
            button.setChecked(choice == value)

    def _chosen(self, value: float) -> None:
        self.show_value(value)
        self.adjusted.emit(value)
