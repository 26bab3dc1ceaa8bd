"""The list of what can be done, each with a few words on what it is for."""

from PySide6.QtCore import QPointF, QRectF, QSize, Qt, Signal
from PySide6.QtGui import QFontMetricsF, QPainter, QPaintEvent
from PySide6.QtWidgets import QSizePolicy

from wattproof.gui import task_text
from wattproof.gui.controls import FlatButton
from wattproof.gui.panel import Page
from wattproof.gui.paths import solid
from wattproof.gui.tasks import Task
from wattproof.gui.theme import Theme, Weight

_RIGHT = Qt.TextElideMode.ElideRight


class EntryButton(FlatButton):
    """One line of a list: a name, and below it in a few words what it is."""

    def __init__(self, theme: Theme, name: str, about: str) -> None:
        super().__init__(theme, name)
        self.about = about
        self.setAccessibleDescription(self.about)
        self.setCheckable(True)
        self.setSizePolicy(QSizePolicy.Policy.Expanding, QSizePolicy.Policy.Fixed)

    def sizeHint(self) -> QSize:
        """Return two lines that can be hit."""
        return QSize(200, round(max(50, self.theme.px(76))))

    def paintEvent(self, _event: QPaintEvent) -> None:
        """Draw name and purpose; the one in force is framed in ink."""
        colors, px = self.theme.palette, self.theme.px
        with QPainter(self) as painter:
            painter.setRenderHint(QPainter.RenderHint.Antialiasing)
            frame = QRectF(self.rect()).adjusted(1.5, 1.5, -1.5, -1.5)
            color = "blue" if self.hasFocus() else "ink" if self.isChecked() else "line"
            painter.setPen(solid(colors.color(color), 2.2 if color != "line" else 1.0))
            painter.setBrush(colors.color("paper"))
            painter.drawRoundedRect(frame, 6, 6)
            painter.setPen(colors.color("ink"))
            painter.setFont(self.theme.font(21, Weight.BOLD))
            metrics = QFontMetricsF(painter.font())
            top = frame.center().y() - px(6)
            room = self.width() - 2 * px(16)
            painter.drawText(QPointF(px(16), top), metrics.elidedText(self.text(), _RIGHT, room))
            painter.setFont(self.theme.font(15.5))
            painter.setPen(colors.color("soft"))
            shown = painter.fontMetrics().elidedText(self.about, _RIGHT, round(room))
            painter.drawText(QPointF(px(16), top + metrics.height() * 0.92), shown)


class TaskList(Page):
    """The list."""

    chosen = Signal(str)

    def __init__(self, theme: Theme, tasks: tuple[Task, ...]) -> None:
        super().__init__(theme)
        self.buttons = {task: EntryButton(theme, task_text.NAMES[task], task_text.ABOUT[task]) for task in tasks}
        for task, button in self.buttons.items():
            button.clicked.connect(lambda _=False, at=task: self.chosen.emit(at.value))
            self.rows.addWidget(button)
        self.rows.addStretch(1)

    def show_task(self, task: Task) -> None:
        """Mark the task in force."""
        for each, button in self.buttons.items():
            button.setChecked(each is task)
