"""Paints the power statement as it is built: a row for each load and channel, a cell for each point."""

from PySide6.QtCore import QPointF, QRectF, QSize, Signal
from PySide6.QtGui import QFontMetricsF, QMouseEvent, QPainter, QPaintEvent
from PySide6.QtWidgets import QSizePolicy, QWidget

from wattproof.gui.paths import solid
from wattproof.gui.statement_view import Cell, RowView
from wattproof.gui.theme import Theme, Weight

_HEAD, _ROW, _GAP = 30.0, 118.0, 8.0  # heights, in units of the drawing
_LEAST_ROW_PX, _LEAST_HEAD_PX = 80.0, 20.0


class StatementTable(QWidget):
    """Shows rows of the statement; a filled dot marks what was held, an open one what is momentary."""

    opened = Signal(object)  # the cell that was clicked

    def __init__(self, theme: Theme) -> None:
        super().__init__()
        self.theme = theme
        self.rows: tuple[RowView, ...] = ()
        self.setSizePolicy(QSizePolicy.Policy.Expanding, QSizePolicy.Policy.Fixed)
        theme.changed.connect(self._resized)

    def _resized(self) -> None:
        self.updateGeometry()
        self.update()

    @property
    def _head(self) -> float:
        return max(_LEAST_HEAD_PX, self.theme.px(_HEAD))

    @property
    def _row(self) -> float:
        return max(_LEAST_ROW_PX, self.theme.px(_ROW))

    def sizeHint(self) -> QSize:
        """Return the height of all rows."""
        return QSize(240, round(self._head + len(self.rows) * (self._row + self.theme.px(_GAP))))

    def show_rows(self, rows: tuple[RowView, ...]) -> None:
        """Show the statement as far as it is built."""
        if rows == self.rows:
            return
        resized = len(rows) != len(self.rows)
        self.rows = rows
        self.setAccessibleName(self.text())
        if resized:
            self.updateGeometry()
        self.update()

    def text(self) -> str:
        """Return exactly what is painted, line by line."""
        return "\n".join(_spoken(row) for row in self.rows)

    def mousePressEvent(self, event: QMouseEvent) -> None:
        """Open the budget of the power that was clicked."""
        if not self.rows:
            return
        row = int((event.position().y() - self._head) // (self._row + self.theme.px(_GAP)))
        if 0 <= row < len(self.rows):
            cells = self.rows[row].cells
            self.opened.emit(cells[min(int(event.position().x() * len(cells) / self.width()), len(cells) - 1)])

    def paintEvent(self, _event: QPaintEvent) -> None:
        """Draw head and rows."""
        with QPainter(self) as painter:
            painter.setRenderHint(QPainter.RenderHint.Antialiasing)
            if not self.rows:
                return
            names = [cell.at for cell in self.rows[0].cells]
            width = self.width() / max(1, len(names))
            painter.setFont(self.theme.font(18, Weight.MEDIUM))
            painter.setPen(self.theme.palette.color("soft"))
            baseline = self._head * 0.7
            for index, name in enumerate(names):
                painter.drawText(QPointF(self._left(index, width), baseline), name)
            top = self._head
            for row in self.rows:
                self._draw_row(painter, QRectF(1, top, self.width() - 2, self._row), row, width)
                top += self._row + self.theme.px(_GAP)

    def _left(self, index: int, width: float) -> float:
        return index * width + max(6.0, self.theme.px(12))

    def _draw_row(self, painter: QPainter, box: QRectF, row: RowView, width: float) -> None:
        colors = self.theme.palette
        painter.setPen(solid(colors.color("blue" if row.current else "line"), 2.0 if row.current else 1.0))
        painter.setBrush(colors.color("paper"))
        painter.drawRoundedRect(box.adjusted(0.5, 0.5, -0.5, -0.5), 6, 6)
        painter.setFont(self.theme.font(17, Weight.BOLD if row.current else Weight.MEDIUM))
        painter.setPen(colors.color("ink" if row.current else "soft"))
        line = QFontMetricsF(painter.font()).height()
        baseline = box.top() + line * 1.02
        painter.drawText(QPointF(self._left(0, width), baseline), row.title)
        for index, cell in enumerate(row.cells):
            room = QRectF(self._left(index, width), baseline, width - self.theme.px(10), box.bottom() - baseline)
            self._draw_cell(painter, room, cell)

    def _draw_cell(self, painter: QPainter, room: QRectF, cell: Cell) -> None:
        colors = self.theme.palette
        big = self.theme.font(27 if len(self.rows[0].cells) <= 3 else 22, Weight.BOLD)
        painter.setFont(big)
        painter.setPen(colors.color("ink" if cell.found else "soft"))
        baseline = room.top() + QFontMetricsF(big).ascent() + 1
        painter.drawText(QPointF(room.left(), baseline), cell.watts)
        if not cell.found:
            return
        left = room.left() + QFontMetricsF(big).horizontalAdvance(cell.watts) + self.theme.px(5)
        small = self.theme.font(15.5)
        painter.setFont(small)
        metrics = QFontMetricsF(small)
        painter.setPen(colors.color("soft"))
        painter.drawText(QPointF(left, baseline), cell.unit)
        for words, dot in ((cell.spread, False), (cell.volts, False), (cell.how, True)):
            baseline += metrics.height() * 0.98
            left = room.left()
            if dot:
                left = self._draw_dot(painter, left, baseline - metrics.xHeight() / 2, cell)
            painter.drawText(QPointF(left, baseline), words)

    def _draw_dot(self, painter: QPainter, left: float, middle: float, cell: Cell) -> float:
        radius = max(3.0, self.theme.px(4.5))
        painter.setBrush(painter.pen().color() if cell.held else self.theme.palette.color("paper"))
        painter.drawEllipse(QPointF(left + radius, middle), radius, radius)
        return left + 2 * radius + self.theme.px(5)


def _spoken(row: RowView) -> str:
    cells = (
        f"{c.at}: {' '.join(p for p in (c.watts, c.unit, c.spread, c.volts, c.how) if p and c.found)}"
        for c in row.cells
    )
    return f"{row.title}. " + "; ".join(cells)
