"""The proposals as a table: every file, what it becomes, and why it needs a look."""

from __future__ import annotations

from typing import Any

from PySide6.QtCore import QAbstractTableModel, QModelIndex, QObject, QPersistentModelIndex, Qt
from PySide6.QtGui import QBrush, QColor

from coatgui.intake import Standing
from coatgui.window.incoming import Row
from coatgui.window.numbers import prefixed
from coatgui.window.palette import Colours
from coatgui.window.places.place import plain_tip

_HEADINGS = ("", "file", "becomes", "why", "points", "frequency", "|Z|")
WHY = 3
MARKS = {
    Standing.READY: "◦",
    Standing.DOUBTFUL: "▲",
    Standing.ASKED: "?",
    Standing.REFUSED: "■",
    Standing.LIST: "≡",
    Standing.LEFT_OUT: "–",
    Standing.PASSED_OVER: "–",
}
Index = QModelIndex | QPersistentModelIndex


def _range(low: float | None, high: float | None, unit: str) -> str:
    if low is None or high is None:
        return ""
    return f"{prefixed(low, unit, 2)} – {prefixed(high, unit, 2)}"


class ProposalModel(QAbstractTableModel):
    """One row for each proposal, in the order given."""

    def __init__(self, tone: Colours, parent: QObject | None = None) -> None:
        super().__init__(parent)
        self.tone = tone
        self.rows: list[Row] = []

    def show(self, rows: list[Row]) -> None:
        """Show these proposals; where the files are the same, the picked row stays picked."""
        if [row.key for row in rows] == [row.key for row in self.rows]:
            self.rows = rows
            if rows:
                last = self.index(len(rows) - 1, len(_HEADINGS) - 1)
                self.dataChanged.emit(self.index(0, 0), last)
            return
        self.beginResetModel()
        self.rows = rows
        self.endResetModel()

    def rowCount(self, parent: Index = QModelIndex()) -> int:  # noqa: B008
        return 0 if parent.isValid() else len(self.rows)

    def columnCount(self, parent: Index = QModelIndex()) -> int:  # noqa: B008
        return 0 if parent.isValid() else len(_HEADINGS)

    def headerData(
        self, section: int, orientation: Qt.Orientation, role: int = Qt.ItemDataRole.DisplayRole
    ) -> Any:
        if orientation == Qt.Orientation.Horizontal and role == Qt.ItemDataRole.DisplayRole:
            return _HEADINGS[section]
        if orientation == Qt.Orientation.Horizontal and role == Qt.ItemDataRole.TextAlignmentRole:
            return Qt.AlignmentFlag.AlignLeft | Qt.AlignmentFlag.AlignVCenter
        return None

    def data(self, index: Index, role: int = Qt.ItemDataRole.DisplayRole) -> Any:
        if not index.isValid():
            return None
        proposal = self.rows[index.row()].proposal
        if role == Qt.ItemDataRole.DisplayRole:
            return self._text(index.row(), index.column())
        if role == Qt.ItemDataRole.ToolTipRole:
            return plain_tip("\n".join((proposal.file, *proposal.sentences)))
        if role == Qt.ItemDataRole.AccessibleTextRole:
            return f"{proposal.standing}: {self._text(index.row(), index.column())}"
        if role == Qt.ItemDataRole.ForegroundRole and index.column() in (0, WHY):
            ink = {
                Standing.DOUBTFUL: self.tone.amber,
                Standing.ASKED: self.tone.amber,
                Standing.REFUSED: self.tone.rust,
            }.get(proposal.standing)
            return QBrush(QColor(ink)) if ink else None
        return None

    def _text(self, row: int, column: int) -> str:
        proposal = self.rows[row].proposal
        if column == 0:
            return f"{MARKS[proposal.standing]} {proposal.standing}"
        if column == 1:
            return f"{proposal.file} ({proposal.part})" if proposal.part else proposal.file
        if column == 2:
            return proposal.becomes
        if column == WHY:
            return proposal.sentences[0] if proposal.sentences else ""
        if column == 4:
            return str(proposal.points) if proposal.points else ""
        if column == 5:
            return _range(proposal.lowest_hz, proposal.highest_hz, "Hz")
        return _range(proposal.lowest_ohm, proposal.highest_ohm, "Ω")
