"""The card over the plots that shows the budget of one figure; a click on it or Esc puts it away."""

from PySide6.QtCore import Qt
from PySide6.QtGui import QMouseEvent
from PySide6.QtWidgets import QFrame, QLabel, QVBoxLayout, QWidget

from wattproof.core.quantity import Quantity
from wattproof.gui.budget import words_of


class BudgetCard(QFrame):
    """One budget at a time."""

    def __init__(self, parent: QWidget) -> None:
        super().__init__(parent)
        self._over = parent
        self.setProperty("kind", "ask")
        self.label = QLabel()
        self.label.setTextFormat(Qt.TextFormat.RichText)
        QVBoxLayout(self).addWidget(self.label)
        self.owner: QWidget | None = None
        self.hide()

    def open_for(self, owner: QWidget, label: str, quantity: Quantity | None) -> None:
        """Show a figure's budget beside it; a second time puts it away."""
        if quantity is None or (owner is self.owner and not self.isHidden()):
            self.put_away()
            return
        self.owner = owner
        self.label.setText(words_of(label, quantity))
        self.setAccessibleName(label)
        self.adjustSize()
        parent = self._over
        corner = owner.mapTo(parent, owner.rect().topRight())
        left = max(8, min(corner.x() + 8, parent.width() - self.width() - 8))
        top = max(8, min(corner.y() + 8, parent.height() - self.height() - 8))
        self.move(left, top)
        self.raise_()
        self.show()

    def put_away(self) -> None:
        """Show nothing."""
        self.owner = None
        self.hide()

    def mousePressEvent(self, _event: QMouseEvent) -> None:
        """Go away when clicked."""
        self.put_away()
