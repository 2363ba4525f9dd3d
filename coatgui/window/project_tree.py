"""The project tree at the side: filter, pick, rename in place, drag, remove. Each change is one
operation on the campaign and can be undone."""

from __future__ import annotations

from collections.abc import Callable

from PySide6.QtCore import QModelIndex, QPersistentModelIndex, QPoint, QRect, Qt, QTimer
from PySide6.QtGui import QColor, QKeyEvent, QPainter
from PySide6.QtWidgets import (
    QAbstractItemView,
    QFrame,
    QLineEdit,
    QMenu,
    QStyledItemDelegate,
    QStyleOptionViewItem,
    QToolButton,
    QTreeView,
    QVBoxLayout,
)

from coatgui.campaign import operations
from coatgui.window.desk import Desk
from coatgui.window.palette import Colours
from coatgui.window.tree_model import Node, TreeModel


class _View(QTreeView):
    """A tree in which Delete removes, as it does in the lists of every desktop."""

    def __init__(self, remove: Callable[[], None]) -> None:
        super().__init__()
        self._remove = remove

    def keyPressEvent(self, event: QKeyEvent) -> None:
        if event.key() == Qt.Key.Key_Delete:
            self._remove()
        else:
            super().keyPressEvent(event)


class _Row(QStyledItemDelegate):
    """Paints a row from its node alone: a style would ask the model for a dozen things first."""

    def __init__(self, model: TreeModel, view: QTreeView) -> None:
        super().__init__(view)
        self._model, self._view = model, view

    def paint(
        self,
        painter: QPainter,
        option: QStyleOptionViewItem,
        index: QModelIndex | QPersistentModelIndex,
    ) -> None:
        node, tone = self._model.node(index), self._model.tone
        area: QRect = option.rect
        if index == self._view.currentIndex():
            painter.fillRect(area, QColor(tone.verdigris))
            painter.setPen(QColor(tone.ground))
        else:
            painter.setPen(QColor(self._model.ink_of(node)))
        painter.setFont(self._view.font())
        words = self._view.fontMetrics().elidedText(
            self._model.words(node), Qt.TextElideMode.ElideRight, area.width() - 6
        )
        painter.drawText(area.adjusted(3, 0, -3, 0), Qt.AlignmentFlag.AlignVCenter, words)


class ProjectTree(QFrame):
    def __init__(self, desk: Desk, tone: Colours) -> None:
        super().__init__()
        self.setObjectName("side")
        self.desk = desk
        column = QVBoxLayout(self)
        column.setContentsMargins(8, 8, 8, 8)
        self.filter = QLineEdit()
        self.filter.setPlaceholderText("filter: name, time, doubt…")
        self.filter.setAccessibleName("Filter the tree by words")
        self.filter.setAccessibleDescription("Names, exposure times, or the words doubt, rejected")
        self.filter.setClearButtonEnabled(True)
        for button in self.filter.findChildren(QToolButton):
            button.setAccessibleName("Clear the filter")
        self.filter.textChanged.connect(self.refresh)
        self.model = TreeModel(tone, self)
        self.model.renamed.connect(self._renamed)
        self.model.moved.connect(self._moved)
        self.view = _View(self.remove)
        self.view.setAccessibleName("Project tree")
        self.view.setAccessibleDescription(
            "Formulations, panels and readings. F2 renames, Delete removes, both can be undone."
        )
        self.view.setHeaderHidden(True)
        self.view.setUniformRowHeights(True)
        self.view.setIndentation(14)
        self.view.setModel(self.model)
        self.view.setItemDelegate(_Row(self.model, self.view))
        self.view.setDragDropMode(QAbstractItemView.DragDropMode.DragDrop)
        self.view.setDefaultDropAction(Qt.DropAction.MoveAction)
        self.view.setEditTriggers(QAbstractItemView.EditTrigger.EditKeyPressed)
        self.view.setContextMenuPolicy(Qt.ContextMenuPolicy.CustomContextMenu)
        self.view.customContextMenuRequested.connect(self._menu)
        self.view.selectionModel().currentChanged.connect(self._picked)
        column.addWidget(self.filter)
        column.addWidget(self.view, 1)
        self._campaign = ""
        self._opened = ""  # the panel that was opened only to show the picked reading

    # --- following the desk ----------------------------------------------------------------

    def refresh(self) -> None:
        """Fill anew; what was open stays open, and a filter opens all it finds."""
        open_before = self._open_rows(QModelIndex())
        campaign = self.desk.campaign
        current = self.node()
        if not self.model.show(campaign, self.desk.assessment, self.filter.text()):
            self.view.viewport().update()
        elif self.filter.text().strip():
            self.view.expandAll()
        elif campaign is None or campaign.campaign_id != self._campaign:
            self.view.expandToDepth(1)
        else:
            for key in open_before:
                self.view.expand(self.model.index_of(key))
        self._campaign = "" if campaign is None else campaign.campaign_id
        keep = current.key if current.kind not in ("root", "reading") else ""
        self.mark(keep if self.model.index_of(keep).isValid() else self.desk.selection)

    def _open_rows(self, parent: QModelIndex) -> list[str]:
        keys = []
        for row in range(self.model.rowCount(parent)):
            index = self.model.index(row, 0, parent)
            if self.view.isExpanded(index):
                keys += [self.model.node(index).key, *self._open_rows(index)]
        return keys

    def mark(self, key: str) -> None:
        """Show the row of an id as the current one, without picking it anew."""
        index = self.model.index_of(key)
        if index.isValid():
            blocked = self.view.selectionModel().blockSignals(True)
            above = self.model.parent(index)
            panel = self.model.node(above).key
            if panel != self._opened:
                # Closed again, or a tree of thousands of open rows would grow with every pick.
                self.view.collapse(self.model.index_of(self._opened))
                self._opened = "" if self.view.isExpanded(above) else panel
            self.view.setCurrentIndex(index)
            self.view.scrollTo(index)
            self.view.selectionModel().blockSignals(blocked)
            self.view.viewport().update()

    def paint_in(self, tone: Colours) -> None:
        self.model.tone = tone
        self.view.viewport().update()

    def node(self) -> Node:
        """The current row's node; the root where there is none."""
        return self.model.node(self.view.currentIndex())

    def _picked(self, index: QModelIndex) -> None:
        node = self.model.node(index)
        if node.kind == "reading":
            self.desk.select(node.key)

    # --- what a person asks for ------------------------------------------------------------

    def _renamed(self, kind: str, key: str, name: str) -> None:
        # When the editor has closed: the edit fills the model anew.
        QTimer.singleShot(0, self, lambda: self._rename(kind, key, name))

    def _rename(self, kind: str, key: str, name: str) -> None:
        if kind == "campaign":
            self.desk.edit(operations.rename_campaign, name)
        elif kind == "formulation":
            self.desk.edit(operations.rename_formulation, key, name)
        elif kind == "panel":
            self.desk.edit(operations.edit_panel, key, name=name)
        else:
            self._retime(key, name)

    def _retime(self, reading_id: str, text: str) -> None:
        """A reading goes by its exposure time: 336, 336 h or 14 d."""
        number, days = text.casefold().removesuffix("h").strip(), 1.0
        if number.endswith("d"):
            number, days = number.removesuffix("d").strip(), 24.0
        try:
            hours = float(number.replace(",", ".")) * days
        except ValueError:
            self.desk.failed.emit(
                f"'{text}' is no exposure time: write hours or days, such as 336 h or 14 d."
            )
            return
        self.desk.edit(operations.edit_reading, reading_id, exposure_h=hours)

    def _moved(self, kind: str, key: str, goal: str) -> None:
        def move() -> None:
            if kind == "panel":
                self.desk.edit(operations.move_panel, key, goal)
            else:
                self.desk.edit(operations.edit_reading, key, panel_id=goal)

        QTimer.singleShot(0, self, move)

    def rename(self) -> None:
        """Edit the current row's name in place."""
        index = self.view.currentIndex()
        if index.isValid():
            self.view.setFocus()
            self.view.edit(index)

    def remove(self) -> None:
        """Take the current row's formulation, panel or reading out of the campaign."""
        node = self.node()
        operation = {
            "formulation": operations.remove_formulation,
            "panel": operations.remove_panel,
            "reading": operations.remove_reading,
        }.get(node.kind)
        if operation is not None:
            self.desk.edit(operation, node.key)

    def add_formulation(self) -> None:
        """Make a formulation and let its name be typed at once."""
        campaign = self.desk.campaign
        if campaign is None:
            return
        taken = {f.name for f in campaign.formulations}
        number = 1
        while f"Formulation {number}" in taken:
            number += 1
        self.desk.edit(operations.add_formulation, f"Formulation {number}")
        made = (
            next(
                (f for f in self.desk.campaign.formulations if f.name == f"Formulation {number}"),
                None,
            )
            if self.desk.campaign
            else None
        )
        if made is not None:
            self.filter.clear()
            self.mark(made.formulation_id)
            self.rename()

    def _menu(self, where: QPoint) -> None:
        node = self.model.node(self.view.indexAt(where))
        menu = QMenu(self)
        menu.addAction("Rename\tF2", self.rename).setEnabled(node.kind != "root")
        menu.addAction("Remove\tDel", self.remove).setEnabled(
            node.kind in ("formulation", "panel", "reading")
        )
        menu.addAction("New formulation", self.add_formulation)
        menu.exec(self.view.viewport().mapToGlobal(where))
        menu.deleteLater()
