"""A table as it is made everywhere in the window."""

from __future__ import annotations

from collections.abc import Sequence

from PySide6.QtCore import Qt
from PySide6.QtWidgets import QAbstractItemView, QHeaderView, QTableWidget


def sheet(
    columns: Sequence[str], name: str, description: str, *, editable: bool = False
) -> QTableWidget:
    """An empty table with headings, whole rows to pick, and Tab leading on."""
    table = QTableWidget(0, len(columns))
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
