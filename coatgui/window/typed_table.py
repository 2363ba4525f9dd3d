"""A table of records whose cells are typed in, with a sentence beneath where one is refused."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import replace
from typing import Any

from PySide6.QtCore import Qt
from PySide6.QtGui import QColor
from PySide6.QtWidgets import QHBoxLayout, QPushButton, QTableWidgetItem, QVBoxLayout, QWidget

from coatgui.window.places.place import plain_label, plain_tip
from coatgui.window.sheet import sheet

_MOST_ROWS = 8  # seen at once


class TypedTable(QWidget):
    """`take` gets all records as they shall be; it raises ValueError where that is refused. Who
    derives from it says what stands in a row, what a typed cell changes, and what a new row is.

    `name` is the table's, `one` what a row is called."""

    def __init__(
        self,
        take: Callable[[tuple[Any, ...]], None],
        columns: Sequence[str],
        name: str,
        one: str,
    ) -> None:
        super().__init__()
        self._take = take
        self._filling = False
        self.records: tuple[Any, ...] = ()
        column = QVBoxLayout(self)
        column.setContentsMargins(0, 0, 0, 0)
        column.setSpacing(4)
        self.note = plain_label("small")
        column.addWidget(self.note)
        self.table = sheet(
            columns, name, "F2 or typing changes a cell; numbers take a unit", editable=True
        )
        self.table.cellChanged.connect(self._changed)
        column.addWidget(self.table)
        self.wrong = plain_label("wrong")
        self.wrong.hide()
        column.addWidget(self.wrong)
        row = QHBoxLayout()
        add, remove = QPushButton(f"Add a {one}"), QPushButton("Remove")
        add.setAccessibleDescription(f"A new row, to be named: a {one}")
        remove.setAccessibleDescription(f"Take out the {one} of the picked row")
        add.clicked.connect(self.add)
        remove.clicked.connect(self.remove)
        row.addWidget(add)
        row.addWidget(remove)
        row.addStretch(1)
        column.addLayout(row)
        self._one = one

    def texts(self, record: Any) -> Sequence[str]:
        """What stands in the cells of a row."""
        raise NotImplementedError

    def change(self, record: Any, column: int, text: str) -> dict[str, Any]:
        """The fields that a typed cell changes. Raises ValueError with a sentence."""
        raise NotImplementedError

    def new(self, name: str) -> Any:
        """The record of a new row."""
        raise NotImplementedError

    def show_records(self, records: tuple[Any, ...], colour: str) -> None:
        self.records = records
        self._filling = True
        self.table.setRowCount(len(records))
        for i, record in enumerate(records):
            for j, text in enumerate(self.texts(record)):
                item = QTableWidgetItem(text)
                item.setToolTip(plain_tip(text))
                item.setForeground(QColor(colour))
                self.table.setItem(i, j, item)
        self._filling = False
        rows = min(max(len(records), 1), _MOST_ROWS)
        height = self.table.horizontalHeader().sizeHint().height()
        self.table.setFixedHeight(
            height + rows * self.table.verticalHeader().defaultSectionSize() + 6
        )

    def _carry_out(self, records: tuple[Any, ...]) -> bool:
        try:
            self._take(records)
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
        try:
            changed = self.change(self.records[row], column, item.text().strip() if item else "")
        except ValueError as error:
            self._say(str(error))
            return
        records = list(self.records)
        records[row] = replace(records[row], **changed)
        self._carry_out(tuple(records))

    def add(self) -> None:
        names = {record.name for record in self.records}
        word = self._one.capitalize()
        number = next(n for n in range(1, len(names) + 2) if f"{word} {n}" not in names)
        if self._carry_out((*self.records, self.new(f"{word} {number}"))):
            self.table.setCurrentCell(len(self.records) - 1, 0)
            self.table.setFocus(Qt.FocusReason.OtherFocusReason)

    def remove(self) -> None:
        row = self.table.currentRow()
        if not 0 <= row < len(self.records):
            self._say("Pick the row to take out first.")
            return
        self._carry_out(self.records[:row] + self.records[row + 1 :])
