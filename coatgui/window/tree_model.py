"""The project tree: campaign → formulation → panel → reading, adapted from the campaign."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Any

from PySide6.QtCore import QAbstractItemModel, QModelIndex, QObject, QPersistentModelIndex, Qt

from coatgui.records import Assessment, Campaign, ReadingAssessment, Severity

Index = QModelIndex | QPersistentModelIndex


@dataclass(eq=False)
class Node:
    kind: str
    key: str
    text: str
    state: str = ""
    parent: Node | None = None
    row: int = 0
    children: list[Node] = field(default_factory=list)

    def add(self, child: Node) -> Node:
        child.parent, child.row = self, len(self.children)
        self.children.append(child)
        return child


def state_of(reading: ReadingAssessment | None) -> tuple[str, str]:
    """Shape and word for a reading: ■ rejected, ▲ doubt, → bound by the leads, or nothing."""
    if reading is None:
        return "", ""
    worst = {finding.severity for finding in reading.findings}
    if Severity.REJECT in worst:
        return "■", "rejected"
    if Severity.DOUBT in worst:
        return "▲", "doubt"
    return ("◦", "nothing to say")


class TreeModel(QAbstractItemModel):
    """Rows are nodes with stable ids; the node of an index is its internal pointer."""

    def __init__(self, parent: QObject | None = None) -> None:
        super().__init__(parent)
        self._root = Node("root", "", "")
        self._by_key: dict[str, Node] = {}

    def show(self, campaign: Campaign | None, assessment: Assessment | None, words: str) -> None:
        """Show a campaign, or nothing; with `words`, only panels whose name or formulation holds
        them."""
        self.beginResetModel()
        self._root = Node("root", "", "")
        self._by_key = {}
        if campaign is not None:
            self._fill(campaign, assessment, words.casefold().strip())
        self.endResetModel()

    def _fill(self, campaign: Campaign, assessment: Assessment | None, words: str) -> None:
        known = {r.reading_id: r for r in assessment.readings} if assessment else {}
        top = self._keep(self._root, Node("campaign", campaign.campaign_id, campaign.title))
        readings: dict[str, list[Any]] = {}
        for reading in campaign.readings:
            readings.setdefault(reading.panel_id, []).append(reading)
        for formulation in campaign.formulations:
            panels = [
                panel
                for panel in campaign.panels
                if panel.formulation_id == formulation.formulation_id
                and (words in panel.name.casefold() or words in formulation.name.casefold())
            ]
            if words and not panels:
                continue
            branch = Node("formulation", formulation.formulation_id, formulation.name)
            self._keep(top, branch)
            for panel in panels:
                stem = self._keep(branch, Node("panel", panel.panel_id, panel.name))
                own = sorted(readings.get(panel.panel_id, []), key=lambda r: r.exposure_h)
                for reading in own:
                    shape, word = state_of(known.get(reading.reading_id))
                    text = f"{reading.exposure_h:g} h"
                    state = "" if shape == "◦" else f"{shape} {word}"
                    self._keep(stem, Node("reading", reading.reading_id, text, state.strip()))

    def _keep(self, parent: Node, node: Node) -> Node:
        self._by_key[node.key] = node
        return parent.add(node)

    def index_of(self, key: str) -> QModelIndex:
        """The index of an id, or an invalid one."""
        node = self._by_key.get(key)
        return QModelIndex() if node is None else self.createIndex(node.row, 0, node)

    def node(self, index: Index) -> Node:
        found = index.internalPointer() if index.isValid() else None
        return found if isinstance(found, Node) else self._root

    def index(self, row: int, column: int, parent: Index = QModelIndex()) -> QModelIndex:  # noqa: B008
        children = self.node(parent).children
        if column != 0 or not 0 <= row < len(children):
            return QModelIndex()
        return self.createIndex(row, 0, children[row])

    def parent(self, index: Index = QModelIndex()) -> QModelIndex:  # type: ignore[override]  # noqa: B008
        above = self.node(index).parent
        if above is None or above is self._root:
            return QModelIndex()
        return self.createIndex(above.row, 0, above)

    def rowCount(self, parent: Index = QModelIndex()) -> int:  # noqa: B008
        return len(self.node(parent).children)

    def columnCount(self, parent: Index = QModelIndex()) -> int:  # noqa: B008
        return 1

    def data(self, index: Index, role: int = Qt.ItemDataRole.DisplayRole) -> Any:
        if not index.isValid():
            return None
        node = self.node(index)
        if role == Qt.ItemDataRole.DisplayRole:
            return f"{node.text}   {node.state}" if node.state else node.text
        if role == Qt.ItemDataRole.AccessibleTextRole:
            return f"{node.kind} {node.text} {node.state}".strip()
        return None
