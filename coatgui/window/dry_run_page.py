"""What every file would become, before anything is brought in: a table, and beside it the picked
file's spectrum and what can be corrected. It blocks nothing; the campaign stays at hand."""

from __future__ import annotations

from dataclasses import replace

from PySide6.QtCore import QItemSelectionModel, Signal
from PySide6.QtWidgets import (
    QAbstractItemView,
    QCheckBox,
    QFormLayout,
    QHBoxLayout,
    QHeaderView,
    QLineEdit,
    QPushButton,
    QSplitter,
    QTableView,
    QVBoxLayout,
    QWidget,
)

from coatgui.intake import (
    Correction,
    Standing,
    Unreadable,
    first_guess,
    read_as_told,
)
from coatgui.records import Dialect, FoundReading, Spectrum
from coatgui.window.columns_form import ColumnsForm
from coatgui.window.incoming import Incoming, Row
from coatgui.window.names_form import NamesForm
from coatgui.window.palette import Colours
from coatgui.window.places.place import plain_label
from coatgui.window.preview_plot import PreviewPlot
from coatgui.window.proposal_model import WHY, ProposalModel

# A larger file is not read again on the window's own thread for the plot alone.
_QUICK_BYTES = 300_000


def hours_said(text: str) -> float | None:
    """An exposure time as a person writes it, 336, 336 h or 14 d, in hours; None where there is
    none. Raises ValueError."""
    words = text.casefold().removesuffix("h").strip()
    if not words:
        return None
    days = words.endswith("d")
    number = float(words.removesuffix("d").strip().replace(",", "."))
    if not 0 <= number < 1e7:
        raise ValueError(text)
    return number * (24.0 if days else 1.0)


class DryRunPage(QWidget):
    """`taken` when a person wants the proposals brought in, `left` when they are to wait."""

    taken = Signal()
    left = Signal()

    def __init__(self, incoming: Incoming, tone: Colours) -> None:
        super().__init__()
        self.incoming, self.tone = incoming, tone
        self.setAccessibleName("Proposals: what the files would become")
        column = QVBoxLayout(self)
        column.setContentsMargins(12, 12, 12, 8)
        column.setSpacing(8)
        self.headline = plain_label("headline")
        self.words = plain_label()
        column.addWidget(self.headline)
        column.addWidget(self.words)
        self.names = NamesForm(incoming)
        self.names.hide()
        column.addWidget(self.names)
        splitter = QSplitter()
        splitter.setHandleWidth(1)
        splitter.addWidget(self._table(tone))
        splitter.addWidget(self._side())
        splitter.setStretchFactor(0, 3)
        splitter.setStretchFactor(1, 2)
        splitter.setSizes([860, 400])
        column.addWidget(splitter, 1)
        column.addLayout(self._buttons())
        incoming.changed.connect(self.refresh)
        incoming.looking.connect(self._looking)
        self._dress(tone)

    def _table(self, tone: Colours) -> QTableView:
        self.model = ProposalModel(tone, self)
        self.table = QTableView()
        self.table.setModel(self.model)
        self.table.setAccessibleName("Files and what they would become")
        self.table.setAccessibleDescription("Up and down pick a file; it is shown beside")
        self.table.setSelectionBehavior(QAbstractItemView.SelectionBehavior.SelectRows)
        self.table.setEditTriggers(QAbstractItemView.EditTrigger.NoEditTriggers)
        self.table.setTabKeyNavigation(False)
        self.table.setShowGrid(False)
        self.table.setWordWrap(False)
        self.table.verticalHeader().hide()
        self.table.verticalHeader().setSectionResizeMode(QHeaderView.ResizeMode.Fixed)
        self.table.verticalHeader().setDefaultSectionSize(24)
        header = self.table.horizontalHeader()
        header.setHighlightSections(False)
        header.setSectionResizeMode(WHY, QHeaderView.ResizeMode.Stretch)
        for place, width in ((0, 88), (1, 144), (2, 170), (4, 48), (5, 128), (6, 122)):
            header.resizeSection(place, width)
        self.table.selectionModel().selectionChanged.connect(lambda *_: self._show_picked())
        return self.table

    def _side(self) -> QWidget:
        side = QWidget()
        column = QVBoxLayout(side)
        column.setContentsMargins(12, 0, 0, 0)
        column.setSpacing(8)
        self.about = plain_label()
        column.addWidget(self.about)
        self.plot = PreviewPlot()
        column.addWidget(self.plot, 1)
        form = QFormLayout()
        form.setSpacing(6)
        self.panel = QLineEdit()
        self.panel.setAccessibleName("Panel of this file")
        self.panel.setAccessibleDescription("Return corrects the proposal")
        self.time = QLineEdit()
        self.time.setPlaceholderText("336 h or 14 d")
        self.time.setAccessibleName("Exposure time of this file")
        self.time.setAccessibleDescription("In hours or days; return corrects the proposal")
        form.addRow("Panel", self.panel)
        form.addRow("Exposure time", self.time)
        column.addLayout(form)
        self.columns = ColumnsForm()
        self.columns.setMinimumHeight(120)
        column.addWidget(self.columns, 1)
        self.alike = QCheckBox("Columns: the same for all files that were read alike")
        self.alike.setAccessibleDescription("A correction of the columns goes to all such files")
        column.addWidget(self.alike)
        self.out = QCheckBox("Leave this file out")
        self.out.setAccessibleDescription("It is neither taken nor listed as refused")
        column.addWidget(self.out)
        self.panel.editingFinished.connect(self._said)
        self.time.editingFinished.connect(self._said)
        self.out.clicked.connect(self._said)
        self.columns.said.connect(self._columns_said)
        self.columns.refused.connect(self.about.setText)
        return side

    def _buttons(self) -> QHBoxLayout:
        row = QHBoxLayout()
        row.setSpacing(8)
        self.take = QPushButton("Bring in")
        self.take.setObjectName("first")
        self.take.setAccessibleDescription("In one step that can be undone")
        self.take.clicked.connect(self.taken)
        self.by_name = QPushButton("Panel and time from the names…")
        self.by_name.setCheckable(True)
        self.by_name.setAccessibleDescription("Point at the parts of one name")
        self.by_name.toggled.connect(self.names.setVisible)
        self.back = QPushButton("Set aside for now")
        self.back.setAccessibleDescription("Go back; the proposals stay")
        self.back.clicked.connect(self.left)
        self.leave = QPushButton("Take nothing")
        self.leave.setAccessibleDescription("Forget the proposals; no file is brought in")
        self.leave.clicked.connect(self.incoming.give_up)
        for button in (self.take, self.by_name, self.back, self.leave):
            row.addWidget(button)
        row.addStretch(1)
        self.state = plain_label("small")
        row.addWidget(self.state)
        return row

    # --- showing ---------------------------------------------------------------------------

    def refresh(self) -> None:
        """Follow the proposals; the picked file stays picked."""
        picked = self.picked()
        rows = self.incoming.rows()
        self.model.show(rows)
        where = next((i for i, r in enumerate(rows) if picked and r.key == picked.key), 0)
        if rows:
            flag = QItemSelectionModel.SelectionFlag
            self.table.selectionModel().setCurrentIndex(
                self.model.index(where, 0), flag.ClearAndSelect | flag.Rows
            )
        readings = sum(len(run.found.readings) for run in self.incoming.runs)
        count = "1 reading" if readings == 1 else f"{readings} readings"
        self.headline.setText(
            f"{count} would become the campaign “{self.incoming.title}”."
            if self.incoming.title
            else f"{count} would be added to this campaign."
        )
        self.words.setText(
            f"{self.incoming.summary()}. Nothing is taken before you say so; what stays asked or "
            "refused is listed under Doubts with its reason."
        )
        self.names.refresh()
        self._show_picked()

    def picked(self) -> Row | None:
        row = self.table.currentIndex().row()
        return self.model.rows[row] if 0 <= row < len(self.model.rows) else None

    def _reading(self, row: Row) -> FoundReading | None:
        proposal = row.proposal
        return next(
            (
                r
                for r in self.incoming.runs[row.batch].found.readings
                if (r.source.file, r.source.part) == (proposal.file, proposal.part)
            ),
            None,
        )

    def _show_picked(self) -> None:
        row = self.picked()
        if row is None or row.batch >= len(self.incoming.runs):
            self.plot.show_spectrum(None, self.tone)
            self.columns.show_dialect(None, None)
            return
        proposal, said = row.proposal, self.incoming.correction(row)
        name = f"{proposal.file} ({proposal.part})" if proposal.part else proposal.file
        self.about.setText("\n".join((name, *proposal.sentences)))
        hours = proposal.exposure_h if said.exposure_h is None else said.exposure_h
        if not self.panel.hasFocus() or not self.panel.isModified():
            self.panel.setText(said.panel or proposal.panel)
        if not self.time.hasFocus() or not self.time.isModified():
            self.time.setText("" if hours is None else f"{hours:g} h")
        self.out.setChecked(said.leave_out)
        spectrum = proposal.standing not in (Standing.LIST, Standing.PASSED_OVER)
        for widget in (self.panel, self.time, self.columns, self.alike):
            widget.setEnabled(spectrum)
        reading = self._reading(row)
        dialect = said.dialect or proposal.dialect
        data = None if reading is not None else self._quick_bytes(row)
        if dialect is None and data is not None and spectrum:
            dialect = self._guess(data)
        self.columns.show_dialect(dialect if spectrum else None, self._area(row))
        if reading is not None:
            self.plot.show_spectrum(reading.spectrum, self.tone)
        elif data is not None and proposal.dialect is not None:
            self.plot.show_spectrum(self._as_told(data, proposal.dialect), self.tone)
        else:
            self.plot.show_spectrum(None, self.tone)

    def _quick_bytes(self, row: Row) -> bytes | None:
        path = self.incoming.batches[row.batch].path(row.proposal.file)
        try:
            return path.read_bytes() if path.stat().st_size <= _QUICK_BYTES else None
        except OSError:
            return None

    def _guess(self, data: bytes) -> Dialect | None:
        try:
            return first_guess(data)
        except Unreadable:
            return None

    def _as_told(self, data: bytes, dialect: Dialect) -> Spectrum | None:
        try:
            return read_as_told(data, dialect)[0].spectrum
        except Unreadable as problem:
            self.about.setText(str(problem))
            return None

    def _area(self, row: Row) -> float | None:
        panel = self.panel.text().strip() or row.proposal.panel
        found = {
            p.panel: p.area_cm2
            for run in self.incoming.runs
            for p in run.found.panels
            if p.area_cm2 is not None
        }
        known = self.incoming.batches[row.batch].told.areas_cm2
        return found.get(panel) or known.get(panel)

    def _looking(self, now: bool) -> None:
        self.state.setText("Looking at the files …" if now else "")
        self.take.setEnabled(not now and self.incoming.is_there)

    # --- corrections -----------------------------------------------------------------------

    def _said(self) -> None:
        row = self.picked()
        if row is None:
            return
        before = self.incoming.correction(row)
        try:
            hours = hours_said(self.time.text())
        except ValueError:
            self.about.setText(
                f"'{self.time.text()}' is no exposure time: write hours or days, such as 336 h or "
                "14 d."
            )
            return
        self.panel.setModified(False)
        self.time.setModified(False)
        panel = self.panel.text().strip()
        # What the file says itself stays its own word.
        told_panel = panel if panel != row.proposal.panel or before.panel else ""
        told_hours = hours
        if before.exposure_h is None and hours == row.proposal.exposure_h:
            told_hours = None
        said = replace(
            before, panel=told_panel, exposure_h=told_hours, leave_out=self.out.isChecked()
        )
        if said != before:
            self.incoming.correct([(row, said)])

    def _columns_said(self, dialect: Dialect) -> None:
        row = self.picked()
        if row is None:
            return
        data = self._quick_bytes(row)
        if data is not None:
            self.plot.show_spectrum(self._as_told(data, dialect), self.tone)
        said = [(row, replace(self.incoming.correction(row), dialect=dialect))]
        if self.alike.isChecked() and row.proposal.dialect is not None:
            said += [
                (other, self._like(other, dialect))
                for other in self.incoming.rows()
                if other.key != row.key
                and other.proposal.dialect is not None
                and other.proposal.dialect.columns == row.proposal.dialect.columns
            ]
        self.incoming.correct(said)

    def _like(self, other: Row, dialect: Dialect) -> Correction:
        assert other.proposal.dialect is not None
        own = replace(other.proposal.dialect, columns=dialect.columns)
        return replace(self.incoming.correction(other), dialect=own)

    def _dress(self, tone: Colours) -> None:
        self.setStyleSheet(
            f"QCheckBox::indicator {{ width: 13px; height: 13px; border: 1px solid {tone.second};"
            f" border-radius: 2px; background: {tone.ground}; }}"
            f"QCheckBox::indicator:checked {{ background: {tone.verdigris}; }}"
            f"QCheckBox::indicator:disabled {{ border-color: {tone.line}; }}"
            f"QCheckBox:focus {{ color: {tone.verdigris}; }}"
            f"QCheckBox::indicator:focus {{ border: 2px solid {tone.verdigris}; }}"
        )

    def paint_in(self, tone: Colours) -> None:
        self._dress(tone)
        self.tone = self.model.tone = tone
        self.refresh()
