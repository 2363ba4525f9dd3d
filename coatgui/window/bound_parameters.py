"""Parameters of a model of one's own that are not fitted by themselves."""

from __future__ import annotations

from collections.abc import Sequence
from functools import partial

from PySide6.QtCore import QObject, Signal
from PySide6.QtWidgets import QComboBox, QTableWidgetItem

from coatgui.circuits import ParameterSpec
from coatgui.window.sheet import sheet
from coatgui.window.typed import typed, written

_VALUE, _SAME = 1, 2
_ROW = 28


class BoundParameters(QObject):
    """A table with a row for each parameter: the value it is held at, or the parameter whose value
    it shares. `held` and `tied` carry all that are so, as pairs; `wrong` a sentence."""

    held = Signal(tuple)
    tied = Signal(tuple)
    wrong = Signal(str)

    def __init__(self) -> None:
        super().__init__()
        self.table = sheet(
            ("parameter", "held at", "same as"),
            "Parameters that are held or tied",
            "Type a value per specimen, with its unit, to hold a parameter at it; or choose the "
            "parameter whose value it shares. Left empty, it is fitted",
            editable=True,
        )
        self.table.setMinimumHeight(120)
        self.table.verticalHeader().setDefaultSectionSize(_ROW)
        self.table.cellChanged.connect(self._typed)
        self.choosers: list[QComboBox] = []
        self._specs: tuple[ParameterSpec, ...] = ()
        self._fixed: dict[str, float] = {}
        self._tied: dict[str, str] = {}
        self._filling = False

    def show_parameters(
        self,
        specs: Sequence[ParameterSpec],
        fixed: Sequence[tuple[str, float]],
        tied: Sequence[tuple[str, str]],
    ) -> None:
        again = tuple(specs) != self._specs
        self._specs, self._fixed, self._tied = tuple(specs), dict(fixed), dict(tied)
        self._filling = True
        if again:
            self._set_up()
        for row, spec in enumerate(self._specs):
            value = QTableWidgetItem(written(self._fixed.get(spec.symbol), spec.kind.unit))
            self.table.setItem(row, _VALUE, value)
            chooser = self.choosers[row]
            chooser.setCurrentIndex(max(chooser.findText(self._tied.get(spec.symbol, "")), 0))
        self._filling = False

    def _set_up(self) -> None:
        self.table.setRowCount(0)
        self.table.setRowCount(len(self._specs))
        self.choosers = []
        for row, spec in enumerate(self._specs):
            name = QTableWidgetItem(spec.symbol)
            name.setFlags(name.flags() & ~name.flags().ItemIsEditable)
            name.setToolTip(spec.meaning)
            self.table.setItem(row, 0, name)
            chooser = QComboBox()
            chooser.setAccessibleName(f"{spec.symbol} is the same as")
            chooser.setAccessibleDescription("Only parameters of one kind can share a value")
            alike = [o.symbol for o in self._specs if o.kind is spec.kind and o is not spec]
            chooser.addItems(["", *alike])
            chooser.setEnabled(bool(alike))
            chooser.activated.connect(partial(self._chosen, row))
            self.choosers.append(chooser)
            self.table.setCellWidget(row, _SAME, chooser)

    def _typed(self, row: int, column: int) -> None:
        if self._filling or column != _VALUE or row >= len(self._specs):
            return
        item, spec = self.table.item(row, column), self._specs[row]
        text = item.text().strip() if item else ""
        fixed = {symbol: value for symbol, value in self._fixed.items() if symbol != spec.symbol}
        if text:
            try:
                fixed[spec.symbol] = typed(text, spec.kind.unit)
            except ValueError as error:
                self.wrong.emit(f"{spec.symbol}: {error}")
                return
        self.held.emit(tuple(fixed.items()))

    def _chosen(self, row: int, _index: int = 0) -> None:
        symbol, leader = self._specs[row].symbol, self.choosers[row].currentText()
        tied = {s: t for s, t in self._tied.items() if s != symbol}
        if leader:
            leader = tied.get(leader, leader)  # of a group there is one that is fitted
            if leader == symbol:
                self.wrong.emit(f"{leader} and {symbol} share one value already.")
                return
            tied = {s: leader if t == symbol else t for s, t in tied.items()}
            tied[symbol] = leader
        self.tied.emit(tuple(tied.items()))
