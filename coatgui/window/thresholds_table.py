"""The thresholds of the checks as a table: what each is, where it comes from, another value."""

from __future__ import annotations

from collections.abc import Callable

from PySide6.QtCore import Qt
from PySide6.QtGui import QColor
from PySide6.QtWidgets import QHBoxLayout, QPushButton, QTableWidgetItem, QVBoxLayout, QWidget

from coatgui.assessment.rules import table as resource_table
from coatgui.window.palette import Colours
from coatgui.window.places.place import plain_label
from coatgui.window.sheet import sheet
from coatgui.window.typed import typed

_VALUE = 1
# How the ends of the entries' names are said.
_UNITS = (
    ("_f_per_cm2", "F/cm²"), ("_ohm_cm2", "Ω cm²"), ("_percent", "%"), ("_ohm", "Ω"),
    ("_mv", "mV"), ("_apart_c", "°C"), ("_sigma", "σ"),
)  # fmt: skip


def threshold_words(name: str) -> str:
    """An entry of `resources/checks.toml` as words: "wild point / %"."""
    for ending, unit in _UNITS:
        if name.endswith(ending):
            kept = name.removesuffix(ending.removeprefix("_apart"))
            return f"{kept.replace('_', ' ')} / {unit}"
    return name.replace("_", " ")


class ThresholdsTable(QWidget):
    """`take` gets the values that differ from the usual ones; it raises ValueError where they are
    refused."""

    def __init__(self, take: Callable[[tuple[tuple[str, float], ...]], None]) -> None:
        super().__init__()
        self._take = take
        self._filling = False
        self.own: dict[str, float] = {}
        self.usual = {name: float(e["value"]) for name, e in resource_table("checks").items()}
        self.sources = {name: str(e["source"]) for name, e in resource_table("checks").items()}
        self.names = list(self.usual)
        column = QVBoxLayout(self)
        column.setContentsMargins(0, 0, 0, 0)
        column.setSpacing(4)
        self.note = plain_label("small")
        column.addWidget(self.note)
        self.table = sheet(
            ("threshold", "value", "usual", "source"),
            "Thresholds of the checks",
            "F2 or typing changes a value; an emptied cell goes back to the usual value",
            editable=True,
        )
        self.table.setRowCount(len(self.names))
        self.table.cellChanged.connect(self._changed)
        self.table.currentCellChanged.connect(self._explain)
        column.addWidget(self.table, 1)
        self.source = plain_label("small")
        self.source.setMinimumHeight(44)
        self.source.setAlignment(Qt.AlignmentFlag.AlignTop)
        column.addWidget(self.source)
        self.wrong = plain_label("wrong")
        self.wrong.hide()
        column.addWidget(self.wrong)
        row = QHBoxLayout()
        self.reset = QPushButton("Back to the usual value")
        self.reset.setAccessibleDescription("For the threshold of the picked row")
        self.reset.clicked.connect(lambda: self._put(self.table.currentRow(), None))
        self.reset_all = QPushButton("All back")
        self.reset_all.setAccessibleDescription("Every threshold has its usual value again")
        self.reset_all.clicked.connect(lambda: self._carry_out({}))
        row.addWidget(self.reset)
        row.addWidget(self.reset_all)
        row.addStretch(1)
        column.addLayout(row)

    def show_thresholds(self, own: dict[str, float], tone: Colours) -> None:
        self.own = own
        self._filling = True
        for i, name in enumerate(self.names):
            changed = name in own
            texts = (
                f"{'●  ' if changed else ''}{threshold_words(name)}",
                f"{own.get(name, self.usual[name]):g}",
                f"{self.usual[name]:g}",
                self.sources[name],
            )
            for j, text in enumerate(texts):
                item = self.table.item(i, j)
                if item is None:
                    item = QTableWidgetItem()
                    if j != _VALUE:
                        item.setFlags(item.flags() & ~Qt.ItemFlag.ItemIsEditable)
                    self.table.setItem(i, j, item)
                item.setText(text)
                item.setForeground(QColor(tone.ink if j == _VALUE or changed else tone.second))
        self._filling = False
        count = len(set(own) & set(self.names))
        self.note.setText(
            "All have their usual values."
            if not count
            else f"● {count} of {len(self.names)} {'was' if count == 1 else 'were'} changed."
        )
        self.reset_all.setEnabled(bool(own))
        self._explain(self.table.currentRow())

    def _explain(self, row: int, *_: int) -> None:
        there = 0 <= row < len(self.names)
        self.source.setText(self.sources[self.names[row]] if there else "")
        self.reset.setEnabled(there and self.names[row] in self.own)

    def _changed(self, row: int, column: int) -> None:
        if self._filling or column != _VALUE:
            return
        item = self.table.item(row, column)
        text = item.text().strip() if item else ""
        if not text:
            self._put(row, None)
            return
        try:
            value = typed(text, "")
        except ValueError as error:
            self._say(str(error))
            return
        self._put(row, value)

    def _put(self, row: int, value: float | None) -> None:
        if not 0 <= row < len(self.names):
            return
        name = self.names[row]
        own = {key: number for key, number in self.own.items() if key != name}
        if value is not None and value != self.usual[name]:
            own[name] = value
        if value is not None and value < 0:
            self._say("A threshold cannot be negative.")
            return
        self._carry_out(own)

    def _carry_out(self, own: dict[str, float]) -> None:
        try:
            self._take(tuple(sorted(own.items())))
        except ValueError as error:
            self._say(str(error))
            return
        self._say("")
        if own == self.own:  # nothing to do, but the cell may say it in other words
            self._rewrite()

    def _rewrite(self) -> None:
        self._filling = True
        for i, name in enumerate(self.names):
            item = self.table.item(i, _VALUE)
            if item is not None:
                item.setText(f"{self.own.get(name, self.usual[name]):g}")
        self._filling = False

    def _say(self, sentence: str) -> None:
        self.wrong.setText(f"■  {sentence}" if sentence else "")
        self.wrong.setVisible(bool(sentence))
