"""The steps of a campaign, who made them and when; a click goes back or forward to one."""

from __future__ import annotations

from datetime import datetime

from PySide6.QtCore import Qt
from PySide6.QtGui import QBrush, QColor
from PySide6.QtWidgets import QListWidget, QListWidgetItem, QVBoxLayout, QWidget

from coatgui.campaign import CampaignFileError, HistoryEntry
from coatgui.window.desk import Desk
from coatgui.window.palette import Colours
from coatgui.window.places.place import plain_label, plain_tip

_STEP = Qt.ItemDataRole.UserRole


def when(entry: HistoryEntry) -> str:
    """The time of a step by the clock here."""
    try:
        moment = datetime.fromisoformat(entry.when_utc)
    except ValueError:
        return entry.when_utc
    return f"{moment.astimezone():%Y-%m-%d %H:%M}"


class HistoryView(QWidget):
    """The newest step on top; the one that stands now is picked. Steps that were taken back are
    fainter, and so are those that something else was done instead of, which cannot be gone to."""

    def __init__(self, desk: Desk, tone: Colours) -> None:
        super().__init__()
        self.desk, self.tone = desk, tone
        column = QVBoxLayout(self)
        column.setContentsMargins(12, 8, 12, 12)
        self.words = plain_label("small")
        self.words.setText("Click a step, or press return on it, to go back or forward to it.")
        column.addWidget(self.words)
        self.list = QListWidget()
        self.list.setAccessibleName("Steps of this campaign, the newest first")
        self.list.setAccessibleDescription("Return goes back or forward to a step")
        self.list.setWordWrap(True)
        self.list.setHorizontalScrollBarPolicy(Qt.ScrollBarPolicy.ScrollBarAlwaysOff)
        self.list.itemClicked.connect(self._go)
        self.list.itemActivated.connect(self._go)
        column.addWidget(self.list, 1)
        self._shown: tuple[object, ...] = ()

    def refresh(self) -> None:
        """Follow the campaign; without edits since the last time there is nothing to do."""
        file = self.desk.file
        try:
            steps = () if file is None else file.history(with_changes=False)
        except CampaignFileError as problem:
            self.words.setText(str(problem))
            return
        shown = (self.tone, steps)
        if shown == self._shown:
            return
        self._shown = shown
        self.list.clear()
        now = next((s.entry_id for s in reversed(steps) if s.state == "done"), None)
        for step in reversed(steps):
            if step.action not in ("create", "edit"):
                continue
            here = step.entry_id == now or (now is None and step.action == "create")
            state = {"undone": "  (taken back)", "abandoned": "  (replaced by what follows)"}
            item = QListWidgetItem(
                f"{'● ' if here else ''}{step.name}{state.get(step.state, '')}\n"
                f"{when(step)}  {step.who}"
            )
            item.setToolTip(plain_tip(step.name))
            item.setData(_STEP, 0 if step.action == "create" else step.entry_id)
            if step.state in ("undone", "abandoned"):
                item.setForeground(QBrush(QColor(self.tone.second)))
            if step.state == "abandoned":
                item.setFlags(item.flags() & ~Qt.ItemFlag.ItemIsEnabled)
            self.list.addItem(item)
            if here:
                self.list.setCurrentItem(item)

    def _go(self, item: QListWidgetItem) -> None:
        self.desk.go_to(int(item.data(_STEP)))

    def paint_in(self, tone: Colours) -> None:
        self.tone = tone
        self.refresh()
