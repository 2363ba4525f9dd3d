"""What the columns of a file are, to be corrected in place: role, unit and sign."""

from __future__ import annotations

from dataclasses import replace

from PySide6.QtCore import Qt, Signal
from PySide6.QtWidgets import (
    QAbstractItemView,
    QCheckBox,
    QComboBox,
    QHeaderView,
    QLineEdit,
    QTableWidget,
    QTableWidgetItem,
    QWidget,
)

from coatgui.intake.corrections import corrected_column
from coatgui.intake.impedance import CAPACITIVE_SIGN
from coatgui.intake.units import kind_of
from coatgui.records import Dialect

ROLES = {
    "other": "not used",
    "frequency": "frequency",
    "angular_frequency": "angular frequency",
    "log_frequency": "log₁₀ of the frequency",
    "real": "Z′",
    "imaginary": "Z″",
    "modulus": "|Z|",
    "log_modulus": "log₁₀ of |Z|",
    "phase": "phase",
    "admittance_real": "Y′",
    "admittance_imaginary": "Y″",
    "admittance_modulus": "|Y|",
    "admittance_phase": "phase of Y",
    "capacitance_real": "C′",
    "capacitance_imaginary": "C″",
    "parallel_resistance": "R parallel",
    "parallel_capacitance": "C parallel",
    "series_resistance": "R in series",
    "series_capacitance": "C in series",
    "temperature": "temperature",
    "potential": "potential",
}


class ColumnsForm(QTableWidget):
    """A row for each column of the file. `said` carries the dialect when something was corrected,
    `refused` a sentence where that makes no sense."""

    said = Signal(object)
    refused = Signal(str)

    def __init__(self) -> None:
        super().__init__(0, 4)
        self.setHorizontalHeaderLabels(["heading", "is", "unit", "sign turned"])
        self.setAccessibleName("Columns of the file")
        self.setAccessibleDescription("For each column: what it is, its unit, and its sign")
        self.verticalHeader().hide()
        self.setShowGrid(False)
        self.setTabKeyNavigation(False)
        self.setEditTriggers(QAbstractItemView.EditTrigger.NoEditTriggers)
        self.setSelectionMode(QAbstractItemView.SelectionMode.NoSelection)
        header = self.horizontalHeader()
        header.setDefaultAlignment(Qt.AlignmentFlag.AlignLeft)
        header.setSectionResizeMode(QHeaderView.ResizeMode.Interactive)
        header.setSectionResizeMode(0, QHeaderView.ResizeMode.Stretch)
        for place, width in ((1, 132), (2, 70), (3, 84)):
            header.resizeSection(place, width)
        self.verticalHeader().setDefaultSectionSize(30)
        self._dialect: Dialect | None = None
        self._area_cm2: float | None = None

    def show_dialect(self, dialect: Dialect | None, area_cm2: float | None) -> None:
        """Show how a file was read; None empties the form."""
        self._area_cm2 = area_cm2
        if dialect == self._dialect:
            return
        self._dialect = dialect
        columns = () if dialect is None else dialect.columns
        self.setRowCount(0)
        self.setRowCount(len(columns))
        for row, column in enumerate(columns):
            heading = column.heading or f"column {column.position + 1}"
            item = QTableWidgetItem(heading)
            item.setToolTip(heading)
            self.setItem(row, 0, item)
            role = QComboBox()
            roles = dict(ROLES)
            roles.setdefault(column.role, column.role.replace("_", " "))
            for code, words in roles.items():
                role.addItem(words, code)
            role.setCurrentIndex(role.findData(column.role))
            unit = QLineEdit(column.unit)
            turned = QCheckBox()
            turned.setChecked(column.factor < 0)
            turned.setEnabled(column.role in CAPACITIVE_SIGN)
            for place, (widget, what) in enumerate(
                ((role, "What it is"), (unit, "Unit"), (turned, "Sign turned")), 1
            ):
                widget.setAccessibleName(f"{what}: {heading}")
                widget.setAccessibleDescription("Corrected at once when changed")
                self.setCellWidget(row, place, widget)
            role.activated.connect(self._tell)
            unit.editingFinished.connect(self._tell)
            turned.clicked.connect(self._tell)

    def control(self, row: int, column: int) -> QWidget:
        """The control of a cell, for what is filled in there."""
        return self.cellWidget(row, column)

    def _tell(self) -> None:
        dialect = self._dialect
        if dialect is None:
            return
        columns = []
        for row, column in enumerate(dialect.columns):
            role, unit, turned = (self.cellWidget(row, place) for place in (1, 2, 3))
            assert isinstance(role, QComboBox)
            assert isinstance(unit, QLineEdit)
            assert isinstance(turned, QCheckBox)
            code, written = str(role.currentData()), unit.text().strip()
            if (code, written, turned.isChecked()) == (column.role, column.unit, column.factor < 0):
                columns.append(column)
                continue
            if code != column.role and kind_of(code) != kind_of(column.role):
                written = ""  # the unit of what the column was taken for before
            try:
                columns.append(
                    corrected_column(
                        column, code, written,
                        turned.isChecked() and code in CAPACITIVE_SIGN, self._area_cm2,
                    )
                )  # fmt: skip
            except ValueError as problem:
                self.refused.emit(str(problem))
                return
        made = replace(dialect, columns=tuple(columns))
        if made != dialect:
            self.said.emit(made)
