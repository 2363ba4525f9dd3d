"""A table as it is made everywhere in the window."""

from __future__ import annotations

from collections.abc import Sequence

from PySide6.QtCore import Qt
from PySide6.QtGui import QKeyEvent, QKeySequence
from PySide6.QtWidgets import (
    QAbstractItemView,
    QApplication,
    QComboBox,
    QHeaderView,
    QTableWidget,
    QTableWidgetItem,
)

from coatgui.window.figure import as_text


class Sheet(QTableWidget):
    """A table of which Ctrl+C copies the picked rows, or all of them, as a spreadsheet takes it."""

    def as_rows(self) -> list[list[object]]:
        """Headings and the picked rows; all of them where at most one is picked."""
        picked = sorted({index.row() for index in self.selectedIndexes()})
        shown = picked if len(picked) > 1 else range(self.rowCount())
        columns = [c for c in range(self.columnCount()) if not self.isColumnHidden(c)]
        rows: list[list[object]] = [[_text(self.horizontalHeaderItem(c)) for c in columns]]
        for row in shown:
            rows.append([_cell(self, row, c) for c in columns])
        return rows

    def keyPressEvent(self, event: QKeyEvent) -> None:
        if event.matches(QKeySequence.StandardKey.Copy):
            QApplication.clipboard().setText(as_text(self.as_rows()))
        else:
            super().keyPressEvent(event)


def _text(item: QTableWidgetItem | None) -> str:
    return "" if item is None else item.text()


def _cell(table: QTableWidget, row: int, column: int) -> str:
    inside = table.cellWidget(row, column)
    if isinstance(inside, QComboBox):
        return inside.currentText()
    return _text(table.item(row, column))


def sheet(columns: Sequence[str], name: str, description: str, *, editable: bool = False) -> Sheet:
    """An empty table with headings, whole rows to pick, and Tab leading on."""
    table = Sheet(0, len(columns))
    table.setHorizontalHeaderLabels(list(columns))
    table.setAccessibleName(name)
    table.setAccessibleDescription(description)
    table.setTabKeyNavigation(False)
    table.setShowGrid(False)
    table.setWordWrap(False)
    table.verticalHeader().hide()
    table.verticalHeader().setMinimumSectionSize(18)
    table.verticalHeader().setDefaultSectionSize(24)
    table.setHorizontalScrollBarPolicy(Qt.ScrollBarPolicy.ScrollBarAlwaysOff)
    trigger = QAbstractItemView.EditTrigger
    table.setEditTriggers(
        trigger.DoubleClicked | trigger.EditKeyPressed | trigger.AnyKeyPressed
        if editable
        else trigger.NoEditTriggers
    )
    if not editable:
        table.setSelectionBehavior(QAbstractItemView.SelectionBehavior.SelectRows)
    header = table.horizontalHeader()
    header.setDefaultAlignment(Qt.AlignmentFlag.AlignLeft)
    header.setSectionResizeMode(QHeaderView.ResizeMode.ResizeToContents)
    header.setStretchLastSection(True)
    header.setHighlightSections(False)
    return table
