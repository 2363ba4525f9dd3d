"""Which coating model a reading gets: a person's choice, for one reading or for several."""

from __future__ import annotations

from collections.abc import Mapping

from PySide6.QtCore import Qt
from PySide6.QtWidgets import QComboBox, QHBoxLayout, QPushButton, QVBoxLayout, QWidget

from coatgui.campaign import operations
from coatgui.circuits import CoatingModel, catalogue
from coatgui.records import Reading
from coatgui.window.desk import Desk
from coatgui.window.models import models
from coatgui.window.places.place import plain_tip

_AUTOMATIC = "Let the program choose"
HERE, WHOLE_PANEL, FROM_HERE = range(3)
_SCOPES = ("For this reading", "For the whole panel", "From this time on")


class ModelPicker(QWidget):
    def __init__(self, desk: Desk) -> None:
        super().__init__()
        self.desk = desk
        self._offered: tuple[Mapping[str, CoatingModel], str] | None = None
        column = QVBoxLayout(self)
        column.setContentsMargins(0, 0, 0, 0)
        column.setSpacing(6)
        self.model = QComboBox()
        self.model.setAccessibleName("Coating model of this reading")
        self.model.setAccessibleDescription("Let the program choose, or insist on a model")
        self.model.setMinimumContentsLength(12)
        self.model.activated.connect(self._pin)
        column.addWidget(self.model)
        row = QHBoxLayout()
        self.scope = QComboBox()
        self.scope.setAccessibleName("Where a model is set")
        self.scope.setAccessibleDescription("The readings that the choice of a model is for")
        self.scope.addItems(list(_SCOPES))
        row.addWidget(self.scope, 1)
        self.compose = QPushButton("Compose…")
        self.compose.setAccessibleDescription("Make a coating model of your own, layer by layer")
        row.addWidget(self.compose)
        column.addLayout(row)

    def offer(self, reading: Reading) -> None:
        """The models in the list, and the one that is set for this reading."""
        offered = (models(self.desk.campaign), reading.pinned_model)
        if offered != self._offered:
            self._offered = offered
            self._fill(*offered)
        self.model.setCurrentIndex(self.model.findData(reading.pinned_model))

    def _fill(self, known: Mapping[str, CoatingModel], pinned: str) -> None:
        self.model.clear()
        self.model.addItem(_AUTOMATIC, "")
        for name, model in known.items():
            own = "" if name in catalogue() else " (own)"
            self.model.addItem(f"{model.name}{own}", name)
            tip = plain_tip(model.meaning or ", ".join(model.symbols))
            self.model.setItemData(self.model.count() - 1, tip, Qt.ItemDataRole.ToolTipRole)
        if self.model.findData(pinned) < 0:
            self.model.addItem(f"{pinned} (not there any more)", pinned)

    def picked(self) -> str:
        """The id of the model that is set, "" where the program chooses."""
        return str(self.model.currentData() or "")

    def _pin(self, index: int) -> None:
        """Set the picked model for the readings that the scope names."""
        name = str(self.model.itemData(index))
        ids = [r.reading_id for r in self._in_scope() if r.pinned_model != name]
        if ids:
            self.desk.edit(operations.pin_model, ids, name)

    def _in_scope(self) -> list[Reading]:
        reading, campaign = self.desk.reading(), self.desk.campaign
        if reading is None or campaign is None:
            return []
        scope = self.scope.currentIndex()
        return [
            r
            for r in campaign.readings
            if r is reading
            or (
                scope != HERE
                and r.panel_id == reading.panel_id
                and (scope == WHOLE_PANEL or r.exposure_h >= reading.exposure_h)
            )
        ]
