"""The criteria of a campaign as a table whose cells are typed in."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from typing import Any

from PySide6.QtCore import Qt
from PySide6.QtGui import QColor
from PySide6.QtWidgets import QHBoxLayout, QPushButton, QTableWidgetItem, QVBoxLayout, QWidget

from coatgui.assessment.rules import default_criteria
from coatgui.records import Criterion
from coatgui.window.palette import Colours
from coatgui.window.places.place import plain_label, plain_tip
from coatgui.window.sheet import sheet
from coatgui.window.typed import typed, written

_COLUMNS = ("name", "at frequency", "|Z|·A falls below", "source")


class CriteriaTable(QWidget):
    """`take` gets all criteria as they shall be; it raises ValueError where that is refused."""

    def __init__(self, take: Callable[[tuple[Criterion, ...]], None]) -> None:
        super().__init__()
        self._take = take
        self._filling = False
        self.criteria: tuple[Criterion, ...] = ()
        column = QVBoxLayout(self)
        column.setContentsMargins(0, 0, 0, 0)
        column.setSpacing(4)
        self.note = plain_label("small")
        column.addWidget(self.note)
        self.table = sheet(
            _COLUMNS, "Criteria", "F2 or typing changes a cell; numbers take a unit", editable=True
        )
        self.table.setMinimumHeight(110)
        self.table.cellChanged.connect(self._changed)
        column.addWidget(self.table, 1)
        self.wrong = plain_label("wrong")
        self.wrong.hide()
        column.addWidget(self.wrong)
        row = QHBoxLayout()
        add, remove = QPushButton("Add a criterion"), QPushButton("Remove")
        add.setAccessibleDescription("A new row, to be named and given its limit")
        remove.setAccessibleDescription("Take out the criterion of the picked row")
        add.clicked.connect(self.add)
        remove.clicked.connect(self.remove)
        row.addWidget(add)
        row.addWidget(remove)
        row.addStretch(1)
        column.addLayout(row)

    def show_criteria(self, own: tuple[Criterion, ...], tone: Colours) -> None:
        shown = own or default_criteria()
        self.note.setText(
            "Panels are held against each of these."
            if own
            else "Usual limits, in force until the campaign has its own: change one to make it so."
        )
        self.criteria = shown
        self._filling = True
        self.table.setRowCount(len(shown))
        for i, criterion in enumerate(shown):
            texts = (
                criterion.name,
                written(criterion.frequency_hz, "Hz"),
                written(criterion.ohm_cm2, "Ω cm²"),
                criterion.source,
            )
            for j, text in enumerate(texts):
                item = QTableWidgetItem(text)
                item.setToolTip(plain_tip(text))
                item.setForeground(QColor(tone.ink if own else tone.second))
                self.table.setItem(i, j, item)
        self._filling = False

    def _carry_out(self, criteria: tuple[Criterion, ...]) -> bool:
        try:
            self._take(criteria)
        except ValueError as error:
            self._say(str(error))
            return False
        self._say("")
        return True

    def _say(self, sentence: str) -> None:
        self.wrong.setText(f"■  {sentence}" if sentence else "")
        self.wrong.setVisible(bool(sentence))

    def _changed(self, row: int, column: int) -> None:
        if self._filling:
            return
        item = self.table.item(row, column)
        text = item.text().strip() if item else ""
        changed: dict[str, Any]
        try:
            if column == 1:
                changed = {"frequency_hz": typed(text, "Hz")}
            elif column == 2:
                changed = {"ohm_cm2": typed(text, "Ω cm²")}
            else:
                changed = {"name" if column == 0 else "source": text}
        except ValueError as error:
            self._say(str(error))
            return
        criteria = list(self.criteria)
        criteria[row] = replace(criteria[row], **changed)
        self._carry_out(tuple(criteria))

    def add(self) -> None:
        names = {criterion.name for criterion in self.criteria}
        number = next(n for n in range(1, len(names) + 2) if f"Criterion {n}" not in names)
        like = self.criteria[-1] if self.criteria else default_criteria()[0]
        new = Criterion(f"Criterion {number}", like.frequency_hz, like.ohm_cm2, "own")
        if self._carry_out((*self.criteria, new)):
            self.table.setCurrentCell(len(self.criteria) - 1, 0)
            self.table.setFocus(Qt.FocusReason.OtherFocusReason)

    def remove(self) -> None:
        row = self.table.currentRow()
        if not 0 <= row < len(self.criteria):
            self._say("Pick the row to take out first.")
            return
        self._carry_out(self.criteria[:row] + self.criteria[row + 1 :])
