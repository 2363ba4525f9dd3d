"""The project tree: campaign → formulation → panel → reading, adapted from the campaign.

The model changes nothing itself. What a person asks for, another name or another place, goes out as
`renamed` or `moved`; the campaign changes by an operation, and the model is filled anew."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Any

from PySide6.QtCore import (
    QAbstractItemModel,
    QMimeData,
    QModelIndex,
    QObject,
    QPersistentModelIndex,
    Qt,
    Signal,
)
from PySide6.QtGui import QBrush, QColor

from coatgui.records import Assessment, Campaign, Reading, ReadingAssessment, Severity
from coatgui.window.palette import Colours

NODE = "application/x-coatgui-node"
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
    """Shape and word for a reading: ■ rejected, ▲ doubt, or ◦."""
    if reading is None:
        return "", ""
    worst = {finding.severity for finding in reading.findings}
    if Severity.REJECT in worst:
        return "■", "rejected"
    if Severity.DOUBT in worst:
        return "▲", "doubt"
    return ("◦", "nothing to say")


class TreeModel(QAbstractItemModel):
    """Rows are nodes with stable ids; the node of an index is its internal pointer. `renamed`
    carries kind, id and the wanted name; `moved` kind, id and the id of the new parent."""

    renamed = Signal(str, str, str)
    moved = Signal(str, str, str)

    def __init__(self, tone: Colours, parent: QObject | None = None) -> None:
        super().__init__(parent)
        self.tone = tone
        self._root = Node("root", "", "")
        self._by_key: dict[str, Node] = {}

    def show(self, campaign: Campaign | None, assessment: Assessment | None, words: str) -> None:
        """Show a campaign, or nothing; with `words`, only rows that match them all. A panel matches
        by its own name, its formulation's, or the state of a reading (doubt, rejected)."""
        self.beginResetModel()
        self._root = Node("root", "", "")
        self._by_key = {}
        if campaign is not None:
            self._fill(campaign, assessment, words.casefold().split())
        self.endResetModel()

    def _fill(self, campaign: Campaign, assessment: Assessment | None, words: list[str]) -> None:
        known = {r.reading_id: r for r in assessment.readings} if assessment else {}
        top = self._keep(self._root, Node("campaign", campaign.campaign_id, campaign.title))
        readings: dict[str, list[Reading]] = {}
        for reading in campaign.readings:
            readings.setdefault(reading.panel_id, []).append(reading)
        for formulation in campaign.formulations:
            branch = Node("formulation", formulation.formulation_id, formulation.name)
            stems = []
            for panel in campaign.panels:
                if panel.formulation_id != formulation.formulation_id:
                    continue
                stem = Node("panel", panel.panel_id, panel.name)
                leaves = [
                    Node(
                        "reading",
                        reading.reading_id,
                        f"{reading.exposure_h:g} h",
                        _state(known.get(reading.reading_id)),
                    )
                    for reading in readings.get(panel.panel_id, [])
                ]
                named = f"{formulation.name} {panel.name}".casefold()
                leaves = [
                    leaf
                    for leaf in leaves
                    if all(w in named or w in f"{leaf.text} {leaf.state}" for w in words)
                ]
                if words and not leaves and not all(w in named for w in words):
                    continue
                hours = {r.reading_id: r.exposure_h for r in readings.get(panel.panel_id, [])}
                stem.children = sorted(leaves, key=lambda leaf: hours[leaf.key])
                stem.state = _sum(stem.children)
                stems.append(stem)
            if words and not stems:
                continue
            self._keep(top, branch)
            for stem in stems:
                leaves, stem.children = stem.children, []
                self._keep(branch, stem)
                for leaf in leaves:
                    self._keep(stem, leaf)

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
        if role == Qt.ItemDataRole.EditRole:
            return node.text
        if role == Qt.ItemDataRole.AccessibleTextRole:
            return f"{node.kind} {node.text} {node.state}".strip()
        if role == Qt.ItemDataRole.ForegroundRole and node.state:
            return QBrush(QColor(self.tone.rust if "■" in node.state else self.tone.amber))
        return None

    # --- what a person asks for ------------------------------------------------------------

    def flags(self, index: Index) -> Qt.ItemFlag:
        flag = Qt.ItemFlag
        if not index.isValid():
            return flag.NoItemFlags
        kind = self.node(index).kind
        flags = flag.ItemIsEnabled | flag.ItemIsSelectable | flag.ItemIsEditable
        if kind in ("panel", "reading"):
            flags |= flag.ItemIsDragEnabled
        if kind in ("formulation", "panel"):
            flags |= flag.ItemIsDropEnabled
        return flags

    def setData(self, index: Index, value: Any, role: int = Qt.ItemDataRole.EditRole) -> bool:
        node, name = self.node(index), str(value).strip()
        if role == Qt.ItemDataRole.EditRole and index.isValid() and name != node.text:
            self.renamed.emit(node.kind, node.key, name)
        return False  # the row changes when the campaign has changed

    def supportedDropActions(self) -> Qt.DropAction:
        return Qt.DropAction.MoveAction

    def mimeTypes(self) -> list[str]:
        return [NODE]

    def mimeData(self, indexes: Any) -> QMimeData:
        data = QMimeData()
        nodes = [self.node(index) for index in indexes]
        data.setData(NODE, "\n".join(f"{n.kind} {n.key}" for n in nodes).encode())
        return data

    def _goal(self, data: QMimeData, parent: Index) -> list[tuple[str, str, str]]:
        """Kind, id and new parent's id of what would be moved by a drop; empty where it cannot."""
        over, moves = self.node(parent), []
        for line in bytes(data.data(NODE).data()).decode().split("\n"):
            kind, _, key = line.partition(" ")
            wanted = {"panel": "formulation", "reading": "panel"}.get(kind)
            goal = over.parent if kind == "panel" and over.kind == "panel" else over
            node = self._by_key.get(key)
            if goal is None or node is None or goal.kind != wanted or node.parent is goal:
                return []
            moves.append((kind, key, goal.key))
        return moves

    def canDropMimeData(
        self, data: QMimeData, action: Qt.DropAction, row: int, column: int, parent: Index
    ) -> bool:
        return data.hasFormat(NODE) and bool(self._goal(data, parent))

    def dropMimeData(
        self, data: QMimeData, action: Qt.DropAction, row: int, column: int, parent: Index
    ) -> bool:
        for move in self._goal(data, parent) if data.hasFormat(NODE) else []:
            self.moved.emit(*move)
        return False  # or the view would take the row away itself


def _state(reading: ReadingAssessment | None) -> str:
    shape, word = state_of(reading)
    return "" if shape in ("", "◦") else f"{shape} {word}"


def _sum(leaves: list[Node]) -> str:
    """What a panel's readings amount to: ■ 1 ▲ 2."""
    counts = [(shape, sum(shape in leaf.state for leaf in leaves)) for shape in ("■", "▲")]
    return " ".join(f"{shape} {number}" for shape, number in counts if number)
