"""What a place's plots show, as a table in a window beside: to be read, or read out."""

from __future__ import annotations

from collections.abc import Sequence

from PySide6.QtCore import QAbstractTableModel, QModelIndex, QPersistentModelIndex, Qt
from PySide6.QtGui import QKeyEvent, QKeySequence
from PySide6.QtWidgets import QApplication, QDialog, QTableView, QVBoxLayout, QWidget

from coatgui.window.figure import as_text
from coatgui.window.places.place import plain_label

Index = QModelIndex | QPersistentModelIndex
_NOWHERE = QModelIndex()


class RowsModel(QAbstractTableModel):
    """Rows with their headings first; numbers to six digits."""

    def __init__(self, rows: Sequence[Sequence[object]]) -> None:
        super().__init__()
        self.rows = [list(row) for row in rows]
        self._wide = max((len(row) for row in self.rows), default=0)

    def rowCount(self, parent: Index = _NOWHERE) -> int:
        return 0 if parent.isValid() else max(len(self.rows) - 1, 0)

    def columnCount(self, parent: Index = _NOWHERE) -> int:
        return 0 if parent.isValid() else self._wide

    def data(self, index: Index, role: int = Qt.ItemDataRole.DisplayRole) -> object:
        if role != Qt.ItemDataRole.DisplayRole or not index.isValid():
            return None
        row = self.rows[index.row() + 1]
        value = row[index.column()] if index.column() < len(row) else ""
        if value is None:
            return ""
        return f"{value:.6g}" if isinstance(value, float) else str(value)

    def headerData(
        self, section: int, orientation: Qt.Orientation, role: int = Qt.ItemDataRole.DisplayRole
    ) -> object:
        if role != Qt.ItemDataRole.DisplayRole:
            return None
        if orientation == Qt.Orientation.Vertical:
            return section + 1
        head = self.rows[0] if self.rows else []
        return str(head[section]).replace("_", " ") if section < len(head) else ""


class DataTable(QDialog):
    """Stays beside the window, which goes on living; Ctrl+C copies the whole table."""

    def __init__(self, rows: Sequence[Sequence[object]], title: str, parent: QWidget) -> None:
        super().__init__(parent)
        self.setAttribute(Qt.WidgetAttribute.WA_DeleteOnClose)
        self.setWindowTitle(f"Data: {title}")
        self.resize(760, 520)
        column = QVBoxLayout(self)
        caption = plain_label()
        caption.setText(title)
        column.addWidget(caption)
        self.model = RowsModel(rows)
        self.view = QTableView()
        self.view.setModel(self.model)
        self.view.setAccessibleName(f"Data of {title}")
        self.view.setAccessibleDescription("Arrow keys move from cell to cell, Ctrl+C copies all")
        self.view.setTabKeyNavigation(False)
        self.view.setAlternatingRowColors(True)
        self.view.horizontalHeader().setStretchLastSection(True)
        column.addWidget(self.view, 1)
        self.view.resizeColumnsToContents()
        self.view.setCurrentIndex(self.model.index(0, 0))

    def keyPressEvent(self, event: QKeyEvent) -> None:
        if event.matches(QKeySequence.StandardKey.Copy):
            QApplication.clipboard().setText(as_text(self.model.rows))
        else:
            super().keyPressEvent(event)
