"""The column's head: it says what is being done, and opens the list of what else can be done."""

from PySide6.QtCore import QPointF, QSize
from PySide6.QtGui import QFontMetricsF, QPainter, QPaintEvent

from wattproof.gui import task_text
from wattproof.gui.controls import FlatButton
from wattproof.gui.paths import solid
from wattproof.gui.theme import Weight


class TaskHead(FlatButton):
    """The name of what is being done, with a hook that says there is more, and the key."""

    def sizeHint(self) -> QSize:
        """Return a line that can be hit."""
        return QSize(200, round(max(30, self.theme.px(44))))

    def paintEvent(self, _event: QPaintEvent) -> None:
        """Draw the name, a hook that points down, and a line below."""
        colors, px = self.theme.palette, self.theme.px
        with QPainter(self) as painter:
            painter.setRenderHint(QPainter.RenderHint.Antialiasing)
            font = self.theme.font(26, Weight.BOLD)
            painter.setFont(font)
            painter.setPen(colors.color("ink"))
            metrics = QFontMetricsF(font)
            baseline = self.height() / 2 + metrics.capHeight() / 2 - 1
            painter.drawText(QPointF(1, baseline), self.text())
            x, y, size = metrics.horizontalAdvance(self.text()) + px(20), self.height() / 2 - 1, max(4.5, px(7))
            up = -1 if self.isChecked() else 1
            painter.setPen(solid(colors.color("ink"), max(1.8, px(2.6)), round_ends=True))
            painter.drawLine(QPointF(x - size, y - up * size / 2), QPointF(x, y + up * size / 2))
            painter.drawLine(QPointF(x, y + up * size / 2), QPointF(x + size, y - up * size / 2))
            small = self.theme.font(16)
            painter.setFont(small)
            painter.setPen(colors.color("soft"))
            width = QFontMetricsF(small).horizontalAdvance(task_text.CHOOSER_KEY)
            painter.drawText(QPointF(self.width() - width - px(8), baseline), task_text.CHOOSER_KEY)
            bottom = self.height() - 1.0
            painter.setPen(solid(colors.color("blue" if self.hasFocus() else "line"), 2.0 if self.hasFocus() else 1.0))
            painter.drawLine(QPointF(0, bottom), QPointF(self.width(), bottom))
