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

from coatgui.records import Assessment, Campaign, Panel, Reading, ReadingAssessment, Severity
from coatgui.window.palette import Colours

NODE = "application/x-coatgui-node"
Index = QModelIndex | QPersistentModelIndex


_ROW = Qt.ItemFlag.ItemIsEnabled | Qt.ItemFlag.ItemIsSelectable | Qt.ItemFlag.ItemIsEditable
# Put together once: a view asks for them hundreds of times in every painting.
_FLAGS = {
    "root": Qt.ItemFlag.NoItemFlags,
    "campaign": _ROW,
    "formulation": _ROW | Qt.ItemFlag.ItemIsDropEnabled,
    "panel": _ROW | Qt.ItemFlag.ItemIsDropEnabled | Qt.ItemFlag.ItemIsDragEnabled,
    "reading": _ROW | Qt.ItemFlag.ItemIsDragEnabled,
}


@dataclass(eq=False)
class Node:
    kind: str
    key: str
    text: str
    parent: Node | None = None
    row: int = 0
    children: list[Node] = field(default_factory=list)
    is_filled: bool = False

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
        self._campaign: Campaign | None = None
        self._readings: dict[str, list[Reading]] = {}  # of each panel, by its id
        self._known: dict[str, ReadingAssessment] = {}
        self._sums: dict[str, str] = {}  # what the readings of panels amount to
        self._words: list[str] = []

    def show(self, campaign: Campaign | None, assessment: Assessment | None, words: str) -> bool:
        """Show a campaign, or nothing; with `words`, only rows that match them all. A panel matches
        by its own name, its formulation's, or the state of a reading (doubt, rejected). Returns
        whether there are other rows than before."""
        self._known = {r.reading_id: r for r in assessment.readings} if assessment else {}
        self._sums = {}
        wanted = words.casefold().split()
        if not wanted and not self._words and same_outline(self._campaign, campaign):
            # The rows are those that are there; only what is said behind their names may differ.
            self._campaign = campaign
            top = self.index(0, 0)
            self.dataChanged.emit(top, top)
            return False
        self.beginResetModel()
        self._root = Node("root", "", "")
        self._by_key = {}
        self._campaign = campaign
        self._readings = {}
        self._words = wanted
        if campaign is not None:
            for reading in campaign.readings:
                self._readings.setdefault(reading.panel_id, []).append(reading)
            self._fill(campaign)
        self.endResetModel()
        return True

    def _fill(self, campaign: Campaign) -> None:
        """Formulations and panels; the readings of a panel follow when somebody looks."""
        top = self._keep(self._root, Node("campaign", campaign.campaign_id, campaign.title))
        panels: dict[str, list[Panel]] = {}
        for panel in campaign.panels:
            panels.setdefault(panel.formulation_id, []).append(panel)
        for formulation in campaign.formulations:
            branch = Node("formulation", formulation.formulation_id, formulation.name)
            branch.parent = top
            stems = []
            for panel in panels.get(formulation.formulation_id, []):
                stem = Node("panel", panel.panel_id, panel.name, parent=branch)
                if not self._words or self._leaves(stem) or self._is_named(stem):
                    stems.append(stem)
            if stems or not self._words:
                self._keep(top, branch)
                for stem in stems:
                    self._keep(branch, stem)

    def _keep(self, parent: Node, node: Node) -> Node:
        self._by_key[node.key] = node
        return parent.add(node)

    def _is_named(self, stem: Node) -> bool:
        """Whether every word is in a panel's name or its formulation's."""
        return all(word in _names(stem) for word in self._words)

    def _leaves(self, stem: Node) -> list[Node]:
        """The nodes of a panel's readings that match, by exposure time, made when first wanted."""
        if not stem.is_filled:
            stem.is_filled = True
            names = _names(stem) if self._words else ""
            for reading in sorted(self._readings.get(stem.key, ()), key=lambda r: r.exposure_h):
                leaf = Node("reading", reading.reading_id, f"{reading.exposure_h:g} h")
                if not self._words or all(
                    w in names or w in f"{leaf.text} {self.state(leaf)}" for w in self._words
                ):
                    self._keep(stem, leaf)
        return stem.children

    def rows_of(self, node: Node) -> list[Node]:
        return self._leaves(node) if node.kind == "panel" else node.children

    def state(self, node: Node) -> str:
        """What is said of a row behind its name: of a panel, what its readings amount to."""
        if node.kind == "reading":
            return _state(self._known.get(node.key))
        if node.kind != "panel":
            return ""
        if node.key not in self._sums:
            self._sums[node.key] = _sum([self.state(leaf) for leaf in self._leaves(node)])
        return self._sums[node.key]

    def words(self, node: Node) -> str:
        """Name and state, as the row shows them."""
        state = self.state(node)
        return f"{node.text}   {state}" if state else node.text

    def index_of(self, key: str) -> QModelIndex:
        """The index of an id, or an invalid one."""
        if key not in self._by_key and self._campaign is not None:
            reading = self._campaign.reading(key)
            stem = None if reading is None else self._by_key.get(reading.panel_id)
            if stem is not None:
                self._leaves(stem)
        node = self._by_key.get(key)
        return QModelIndex() if node is None else self.createIndex(node.row, 0, node)

    def node(self, index: Index) -> Node:
        return (index.internalPointer() if index.isValid() else None) or self._root

    def index(self, row: int, column: int, parent: Index = QModelIndex()) -> QModelIndex:  # noqa: B008
        children = self.rows_of(self.node(parent))
        if column != 0 or not 0 <= row < len(children):
            return QModelIndex()
        return self.createIndex(row, 0, children[row])

    def parent(self, index: Index = QModelIndex()) -> QModelIndex:  # type: ignore[override]  # noqa: B008
        above = self.node(index).parent
        if above is None or above is self._root:
            return QModelIndex()
        return self.createIndex(above.row, 0, above)

    def rowCount(self, parent: Index = QModelIndex()) -> int:  # noqa: B008
        return len(self.rows_of(self.node(parent)))

    def hasChildren(self, parent: Index = QModelIndex()) -> bool:  # noqa: B008
        node = self.node(parent)
        if node.kind == "panel" and not node.is_filled and not self._words:
            return node.key in self._readings
        return node.kind != "reading" and bool(self.rows_of(node))

    def columnCount(self, parent: Index = QModelIndex()) -> int:  # noqa: B008
        return 1

    def data(self, index: Index, role: int = Qt.ItemDataRole.DisplayRole) -> Any:
        if not index.isValid():
            return None
        node = self.node(index)
        if role == Qt.ItemDataRole.DisplayRole:
            return self.words(node)
        if role == Qt.ItemDataRole.EditRole:
            return node.text
        if role == Qt.ItemDataRole.AccessibleTextRole:
            return f"{node.kind} {node.text} {self.state(node)}".strip()
        if role == Qt.ItemDataRole.ForegroundRole and self.state(node):
            return QBrush(QColor(self.ink_of(node)))
        return None

    def ink_of(self, node: Node) -> str:
        """The colour of a row's words."""
        state = self.state(node)
        if not state:
            return self.tone.ink
        return self.tone.rust if "■" in state else self.tone.amber

    # --- what a person asks for ------------------------------------------------------------

    def flags(self, index: Index) -> Qt.ItemFlag:
        return _FLAGS[self.node(index).kind]

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


def _names(stem: Node) -> str:
    """A panel's name after its formulation's, to look for words in."""
    above = stem.parent.text if stem.parent is not None else ""
    return f"{above} {stem.text}".casefold()


def same_outline(one: Campaign | None, other: Campaign | None) -> bool:
    """Whether two campaigns have the same formulations, panels and readings under the same names,
    in the same places, at the same times."""
    if one is None or other is None or one.campaign_id != other.campaign_id:
        return False
    if one.title != other.title or one.formulations != other.formulations:
        return False
    if one.panels is not other.panels and [
        (p.panel_id, p.formulation_id, p.name) for p in one.panels
    ] != [(p.panel_id, p.formulation_id, p.name) for p in other.panels]:
        return False
    return one.readings is other.readings or (
        len(one.readings) == len(other.readings)
        and all(
            a is b
            or (a.reading_id, a.panel_id, a.exposure_h) == (b.reading_id, b.panel_id, b.exposure_h)
            for a, b in zip(one.readings, other.readings, strict=True)
        )
    )


def _sum(leaves: list[str]) -> str:
    """What a panel's readings amount to: ■ 1 ▲ 2."""
    counts = [(shape, sum(shape in leaf for leaf in leaves)) for shape in ("■", "▲")]
    return " ".join(f"{shape} {number}" for shape, number in counts if number)
