"""Panel and exposure time from file names: a person points at the parts of one name, and a table
shows at once what all the others would become."""

from __future__ import annotations

from PySide6.QtCore import Qt
from PySide6.QtWidgets import (
    QAbstractItemView,
    QComboBox,
    QHBoxLayout,
    QHeaderView,
    QPushButton,
    QTableWidget,
    QTableWidgetItem,
    QVBoxLayout,
    QWidget,
)

from coatgui.intake import NamePattern, Standing
from coatgui.intake.names import parts_of
from coatgui.window.incoming import Incoming
from coatgui.window.places.place import plain_label

_MOST_ROWS = 200
_MEANINGS = {"": "–", "panel": "panel", "time": "exposure time", "date": "date"}
_UNITS = {"h": "hours", "d": "days", "wk": "weeks"}


class NamesForm(QWidget):
    """A row of words of the example, each with what it is; below, what the names then say."""

    def __init__(self, incoming: Incoming) -> None:
        super().__init__()
        self.incoming = incoming
        column = QVBoxLayout(self)
        column.setContentsMargins(0, 0, 0, 0)
        column.setSpacing(6)
        top = QHBoxLayout()
        self.example = QComboBox()
        self.example.setAccessibleName("Example of a file name")
        self.example.setAccessibleDescription("Its words are pointed at below")
        self.unit = QComboBox()
        self.unit.setAccessibleName("Unit of the time in the names")
        self.unit.setAccessibleDescription("Where a name itself has none")
        for code, words in _UNITS.items():
            self.unit.addItem(f"times in {words}", code)
        self.use = QPushButton("Use these names")
        self.use.setAccessibleDescription("Panel and exposure time of all files by this pattern")
        top.addWidget(self.example, 1)
        top.addWidget(self.unit)
        top.addWidget(self.use)
        column.addLayout(top)
        self._words = QHBoxLayout()
        self._words.setAlignment(Qt.AlignmentFlag.AlignLeft)
        self._words.setSpacing(8)
        column.addLayout(self._words)
        self.choices: list[QComboBox] = []
        self._held: list[QWidget] = []
        self.trouble = plain_label("small")
        column.addWidget(self.trouble)
        self.table = QTableWidget(0, 3)
        self.table.setHorizontalHeaderLabels(["file", "panel", "exposure time"])
        self.table.setAccessibleName("What the names say under this pattern")
        self.table.setAccessibleDescription("A row for each file")
        self.table.setEditTriggers(QAbstractItemView.EditTrigger.NoEditTriggers)
        self.table.setTabKeyNavigation(False)
        self.table.setShowGrid(False)
        self.table.verticalHeader().hide()
        self.table.verticalHeader().setDefaultSectionSize(22)
        header = self.table.horizontalHeader()
        header.setDefaultAlignment(Qt.AlignmentFlag.AlignLeft)
        header.setHighlightSections(False)
        header.setSectionResizeMode(QHeaderView.ResizeMode.Stretch)
        self.table.setFixedHeight(150)
        column.addWidget(self.table)
        self.example.currentIndexChanged.connect(self._split)
        self.unit.currentIndexChanged.connect(self._show)
        self.use.clicked.connect(self._use)

    def refresh(self) -> None:
        """Follow the proposals; an example that is still there stays."""
        names = self._files()
        if names == [self.example.itemText(i) for i in range(self.example.count())]:
            return
        before = self.example.currentText()
        self.example.blockSignals(True)
        self.example.clear()
        self.example.addItems(names)
        self.example.setCurrentIndex(max(self.example.findText(before), 0))
        self.example.blockSignals(False)
        self._split()

    def _files(self) -> list[str]:
        """Files that hold or may hold a spectrum, those that are asked about first."""
        useless = (Standing.LIST, Standing.PASSED_OVER, Standing.LEFT_OUT)
        rows = [r for r in self.incoming.rows() if r.proposal.standing not in useless]
        return list(dict.fromkeys(row.proposal.file for row in rows))[:_MOST_ROWS]

    def _split(self) -> None:
        """A choice for every word of the example."""
        for widget in self._held:
            self._words.removeWidget(widget)
            widget.hide()
            widget.deleteLater()
        self._held, self.choices = [], []
        for part in parts_of(self.example.currentText()):
            word = plain_label()
            word.setWordWrap(False)
            word.setText(part.text)
            choice = QComboBox()
            choice.setAccessibleName(f"What '{part.text}' is")
            choice.setAccessibleDescription("Neighbouring words may be the panel together")
            for code, meaning in _MEANINGS.items():
                choice.addItem(meaning, code)
            choice.currentIndexChanged.connect(self._show)
            for widget in (word, choice):
                self._words.addWidget(widget)
                self._held.append(widget)
            self.choices.append(choice)
        self._show()

    def pattern(self) -> NamePattern:
        """The pattern pointed at. Raises ValueError."""
        marks: dict[str, tuple[int, int]] = {}
        for part, choice in zip(parts_of(self.example.currentText()), self.choices, strict=True):
            what = str(choice.currentData())
            if what:
                start = marks.get(what, (part.start, 0))[0]
                marks[what] = (start, part.stop)
        return NamePattern.pointed_at(
            self.example.currentText(),
            panel=marks.get("panel"),
            time=marks.get("time"),
            unit=str(self.unit.currentData()),
            date=marks.get("date"),
        )

    def _show(self) -> None:
        self.trouble.setText("Say of each word of the example what it is.")
        self.use.setEnabled(False)
        names = self._files()
        try:
            pattern = self.pattern()
        except ValueError as problem:
            self.trouble.setText(str(problem))
            return
        said = pattern.table(names)
        self.table.setRowCount(len(said))
        understood = 0
        for row, (file, says) in enumerate(said):
            hours = "" if says.exposure_h is None else f"{says.exposure_h:g} h"
            if says.moment is not None and not hours:
                hours = f"{says.moment:%Y-%m-%d}, from the start of exposure"
            understood += bool(says.panel and hours)
            for place, text in enumerate((file, says.panel or "∅", hours or "∅")):
                self.table.setItem(row, place, QTableWidgetItem(text))
        if pattern.panel or pattern.time or pattern.date:
            self.use.setEnabled(True)
            self.trouble.setText(
                f"{understood} of {len(said)} names say both panel and time; what a name leaves "
                "open stays as it was."
            )

    def _use(self) -> None:
        try:
            self.incoming.name_by(self.pattern())
        except ValueError as problem:
            self.trouble.setText(str(problem))
