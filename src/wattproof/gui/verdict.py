"""The sentence under the figures: what the residual is made of, or why nothing is shown, marked by shape and word."""

from PySide6.QtCore import QPointF, QRectF, Qt
from PySide6.QtGui import QPainter, QPaintEvent, QPolygonF
from PySide6.QtWidgets import QWidget

from wattproof.gui import text
from wattproof.gui.paths import hatch, solid
from wattproof.gui.sentence import Mark, Sentence
from wattproof.gui.theme import Theme, Weight


class Verdict(QWidget):
    """Paints one Sentence."""

    def __init__(self, theme: Theme, parent: QWidget) -> None:
        super().__init__(parent)
        self.theme = theme
        self.sentence = Sentence("", "", Mark.PLAIN)
        theme.changed.connect(self.update)

    def set_sentence(self, sentence: Sentence) -> None:
        """Show a sentence."""
        if sentence != self.sentence:
            self.sentence = sentence
            self.setAccessibleName(sentence.title)
            self.setAccessibleDescription(text.spoken(sentence.title, sentence.detail, ""))
            self.update()

    def text(self) -> str:
        """Return exactly what is painted."""
        return f"{self.sentence.title}\n{self.sentence.detail}"

    def paintEvent(self, _event: QPaintEvent) -> None:
        """Draw the frame of the mark, the title and the detail."""
        with QPainter(self) as painter:
            painter.setRenderHint(QPainter.RenderHint.Antialiasing)
            frame = QRectF(self.rect()).adjusted(2, 2, -2, -2)
            left = self._draw_mark(painter, frame)
            self._draw_words(painter, frame.adjusted(left, 0, -self.theme.px(12), 0))

    def _draw_mark(self, painter: QPainter, frame: QRectF) -> float:
        """Draw frame and shape; return where the words begin."""
        colors, px, mark = self.theme.palette, self.theme.px, self.sentence.mark
        if mark is Mark.WARNING:
            painter.setPen(solid(colors.color("warn"), 2))
            painter.setBrush(colors.color("warn_paper"))
            painter.drawRoundedRect(frame, 8, 8)
            triangle(painter, QPointF(px(42), frame.center().y()), px(20))
            return px(78)
        if mark is Mark.OVERLOAD:
            painter.setPen(solid(colors.color("ink"), 3))
            painter.setBrush(colors.color("paper"))
            painter.drawRect(frame)
            band = QRectF(frame.left(), frame.top(), px(44), frame.height())
            hatch(painter, band, colors.color("ink"), max(7.0, px(12)))
            return px(60)
        color = "line" if mark is Mark.PLAIN else "soft"
        painter.fillRect(QRectF(0, frame.top(), max(3.0, px(5)), frame.height()), colors.color(color))
        return px(22)

    def _draw_words(self, painter: QPainter, room: QRectF) -> None:
        colors, sentence = self.theme.palette, self.sentence
        wrap = Qt.TextFlag.TextWordWrap
        title_size, detail_size = 34.0, 21.0
        for shrink in (1.0, 0.92, 0.84, 0.76, 0.68):
            painter.setFont(self.theme.font(round(title_size * shrink), Weight.BOLD))
            title = painter.boundingRect(room, wrap, sentence.title)
            painter.setFont(self.theme.font(round(detail_size * max(0.8, shrink))))
            detail = painter.boundingRect(room, wrap, sentence.detail)
            height = title.height() + detail.height()
            if height <= room.height() - 4:
                break
        top = room.center().y() - height / 2
        painter.setPen(colors.color("soft" if sentence.mark is Mark.PLAIN else "ink"))
        painter.drawText(
            QRectF(room.left(), top + title.height(), room.width(), detail.height() + 4), wrap, sentence.detail
        )
        painter.setPen(colors.color("ink"))
        painter.setFont(self.theme.font(round(title_size * shrink), Weight.BOLD))
        painter.drawText(QRectF(room.left(), top, room.width(), title.height() + 2), wrap, sentence.title)


def triangle(painter: QPainter, centre: QPointF, half: float) -> None:
    """Fill the warning's triangle in the painter's pen colour."""
    x, y = centre.x(), centre.y()
    painter.setBrush(painter.pen().color())
    corners = [QPointF(x, y - half * 0.9), QPointF(x - half, y + half * 0.8), QPointF(x + half, y + half * 0.8)]
    painter.drawPolygon(QPolygonF(corners))
