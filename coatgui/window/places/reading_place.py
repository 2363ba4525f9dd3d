"""Reading: what one spectrum says. Plots left, the section and the parameters right, the findings
below."""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np
from PySide6.QtCore import Qt, QTimer
from PySide6.QtGui import QFontMetricsF, QResizeEvent
from PySide6.QtWidgets import (
    QComboBox,
    QFrame,
    QHBoxLayout,
    QPushButton,
    QScrollArea,
    QStackedWidget,
    QTableWidgetItem,
    QVBoxLayout,
    QWidget,
)

from coatgui.campaign import operations
from coatgui.fitting.views import FitBand, Part
from coatgui.records import Reading, ReadingAssessment
from coatgui.window.composing import Composing
from coatgui.window.desk import Desk
from coatgui.window.fit_drawn import band_of, between, parts_of
from coatgui.window.model_picker import ModelPicker
from coatgui.window.models import models
from coatgui.window.numbers import WORDS, said
from coatgui.window.palette import Colours
from coatgui.window.places.place import Place, plain_label, plain_tip
from coatgui.window.section import SectionView, section_of
from coatgui.window.sheet import sheet
from coatgui.window.spectrum_plots import Drawn, SpectrumPlots
from coatgui.window.still import Still
from coatgui.window.trials import TrialsTable

_HEADINGS = (
    "frequency_hz", "real_ohm", "imaginary_ohm", "modulus_ohm", "phase_degrees", "used",
    "model_real_ohm", "model_imaginary_ohm",
)  # fmt: skip
_MOST_LINES = 5
_MARKS = {"note": "◦", "doubt": "▲", "reject": "■"}
_HINT = "Click a point to leave it out or take it back; drag with Shift for several."
ALONE, OTHER_TIMES, REPLICATES = range(3)
_OVERLAYS = ("This reading alone", "With the panel's other times", "With its replicates")


class ReadingPlace(Place):
    noun, question = "Reading", "What does this spectrum say?"
    needs = "readings"
    promise = "Here one spectrum will be shown with its fit, and as a section through the coating."
    note = "pores_reacting_interface"

    def __init__(self, desk: Desk, tone: Colours) -> None:
        super().__init__(desk, tone)
        self.about = plain_label()
        self._about = Still(self.about, 2)
        self.column.addWidget(self._about)
        row = QHBoxLayout()
        row.setSpacing(12)
        self.column.addLayout(row, 1)
        left = QVBoxLayout()
        left.setSpacing(4)
        self.plots = SpectrumPlots()
        self.plots.toggled.connect(self._later)
        self.plots.pointed.connect(self._pointed)
        left.addWidget(self.plots, 1)
        under = QHBoxLayout()
        self.overlay = QComboBox()
        self.overlay.setAccessibleName("Spectra drawn with this one")
        self.overlay.setAccessibleDescription("Other spectra, fainter the shorter the exposure")
        self.overlay.addItems(list(_OVERLAYS))
        self.overlay.setMinimumContentsLength(14)
        self.overlay.setSizeAdjustPolicy(
            QComboBox.SizeAdjustPolicy.AdjustToMinimumContentsLengthWithIcon
        )
        self.overlay.currentIndexChanged.connect(self.show_selection)
        self.read_out = plain_label("small")
        self._read_out = Still(self.read_out, 1)
        self._read_out.say(_HINT)
        self.tried = _switch(
            "What was tried", "Every model laid on this spectrum, and why it was left"
        )
        self.tried.toggled.connect(self._show_trials)
        self.band = _switch("Band", "The 95 % band of the fit, where it holds")
        self.parts = _switch("Parts", "What film, pores and interface contribute to the fit")
        for switch in (self.band, self.parts):
            switch.toggled.connect(self._draw_beside_fit)
        self.beside = plain_label("small")
        self.beside.hide()
        under.addWidget(self.overlay)
        under.addWidget(self.band)
        under.addWidget(self.parts)
        under.addWidget(self.tried)
        under.addStretch(1)
        left.addLayout(under)
        left.addWidget(self._read_out)
        left.addWidget(self.beside)
        row.addLayout(left, 1)
        row.addWidget(self._side(tone))
        self.findings = plain_label()
        self.findings.setAlignment(Qt.AlignmentFlag.AlignTop)
        area = QScrollArea()
        area.setWidget(self.findings)
        area.setWidgetResizable(True)
        area.setAccessibleName("Findings on this reading")
        area.setAccessibleDescription("Up and down scroll")
        area.setFrameShape(QFrame.Shape.NoFrame)
        area.setHorizontalScrollBarPolicy(Qt.ScrollBarPolicy.ScrollBarAlwaysOff)
        self.findings_area = area
        self.column.addWidget(area)
        self.trials = TrialsTable()
        self.trials.hide()
        self.column.addWidget(self.trials)
        self.toggling: list[int] = []

    def _side(self, tone: Colours) -> QStackedWidget:
        shown = QWidget()
        side = QVBoxLayout(shown)
        side.setContentsMargins(0, 0, 0, 0)
        side.setSpacing(6)
        self.picker = ModelPicker(self.desk)
        self.picker.compose.clicked.connect(self._compose)
        side.addWidget(self.picker)
        self.section = SectionView(tone)
        side.addWidget(self.section, 3)
        self.table = sheet(
            ("parameter", "value (95 % limits)"),
            "Fitted parameters with limits",
            "A row for each parameter; tips say how it was found",
        )
        self.table.verticalHeader().setDefaultSectionSize(21)
        self.table.setMinimumHeight(90)
        side.addWidget(self.table, 2)
        self.composing = Composing(self.desk, tone)
        self.composing.left.connect(self._composed)
        pages = QStackedWidget()
        pages.setFixedWidth(330)
        pages.addWidget(shown)
        pages.addWidget(self.composing)
        self.pages = pages
        return pages

    def show_campaign(self) -> None:
        self.show_selection()

    def show_selection(self) -> None:
        reading, known = self.desk.reading(), self.desk.reading_assessment()
        panel = None
        if reading is not None and self.desk.campaign is not None:
            panel = next(
                (p for p in self.desk.campaign.panels if p.panel_id == reading.panel_id), None
            )
        self.section.show_section(section_of(known, panel, models(self.desk.campaign)), self.tone)
        self.section.setVisible(self.section.section is not None)
        self._say(reading, known)
        self._tabulate(known)
        self._show_trials()
        if reading is None:
            self.plots.show_spectrum(None, (), self.tone)
            return
        self.plots.show_spectrum(drawn(reading, known), self._overlaid(reading), self.tone)
        self._draw_beside_fit()
        self.picker.offer(reading)

    def _show_trials(self) -> None:
        if self.tried.isChecked():
            known, known_models = self.desk.reading_assessment(), models(self.desk.campaign)
            self.trials.show_trials(known.fit if known else None, known_models, self.tone)
        self.trials.setVisible(self.tried.isChecked())
        self.findings_area.setVisible(bool(self.findings.text()) and not self.tried.isChecked())

    def _beside_fit(self, frequency_hz: np.ndarray) -> tuple[FitBand | None, tuple[Part, ...]]:
        """The band and the parts that are asked for, of the fit that is shown."""
        if not self.band.isChecked() and not self.parts.isChecked():
            return None, ()
        known, campaign = self.desk.reading_assessment(), self.desk.campaign
        fit = known.fit if known else None
        model = models(campaign).get(fit.model) if fit else None
        if campaign is None or fit is None or model is None:
            return None, ()
        band = band_of(fit, model, campaign, frequency_hz) if self.band.isChecked() else None
        parts = parts_of(fit, model, frequency_hz) if self.parts.isChecked() else ()
        return band, parts

    def _draw_beside_fit(self) -> None:
        reading = self.desk.reading()
        if reading is None:
            return
        fine = between(reading.spectrum.frequency_hz)
        self.plots.show_beside_fit(*self._beside_fit(fine), fine, self.tone)
        words = self.plots.beside_fit.words()
        self.beside.setText(words)
        self.beside.setVisible(bool(words))

    def _overlaid(self, reading: Reading) -> list[tuple[Drawn, float]]:
        """The other spectra to draw, each with its share of the exposure time."""
        campaign, assessment = self.desk.campaign, self.desk.assessment
        if campaign is None or self.overlay.currentIndex() == ALONE:
            return []
        if self.overlay.currentIndex() == OTHER_TIMES:
            found = [r for r in campaign.readings if r.panel_id == reading.panel_id]
        else:
            own = {p.panel_id: p.formulation_id for p in campaign.panels}
            found = [
                r
                for r in campaign.readings
                if own.get(r.panel_id) == own.get(reading.panel_id)
                and r.exposure_h == reading.exposure_h
            ]
        found.sort(key=lambda r: r.exposure_h)  # the longest lies on top
        times = sorted({r.exposure_h for r in found})
        return [
            (
                drawn(r, assessment.reading(r.reading_id) if assessment else None),
                times.index(r.exposure_h) / max(len(times) - 1, 1),
            )
            for r in found
            if r is not reading
        ]

    def _say(self, reading: Reading | None, known: ReadingAssessment | None) -> None:
        if reading is None or known is None:
            self.findings.setText("")
            self._about.say(
                "No reading is picked: pick one in the tree or on the map."
                if reading is None
                else self.desk.unjudged_words()
            )
            return
        text = f"{known.panel} of {known.formulation} after {known.exposure_h:g} h: "
        if known.fit is None:
            text += "not fitted; the findings below say why."
        else:
            text += (
                f"{known.fit.model_name}, residual {known.fit.residual_rms_percent:.2f} %, "
                f"{known.points_used} of {known.points_read} points used; {known.fit.message}."
            )
        lines = [f"{_MARKS[f.severity.value]}  {f.text}" for f in known.findings]
        if not lines:
            text += " Nothing speaks against this reading."
        self._about.say(text)
        if "\n".join(lines) != self.findings.text():
            self.findings.setText("\n".join(lines))
            self._fit_findings()

    def _fit_findings(self) -> None:
        """As high as the findings need, up to some whole lines; the rest is scrolled to."""
        self.findings.ensurePolished()
        line = math.ceil(QFontMetricsF(self.findings.font()).lineSpacing())
        needed = self.findings.heightForWidth(max(self.width() - 40, 200))
        self.findings_area.setFixedHeight(
            min(needed, _MOST_LINES * line) + 2 * self.findings_area.frameWidth() + 2
        )

    def resizeEvent(self, event: QResizeEvent) -> None:
        super().resizeEvent(event)
        self._fit_findings()

    def _tabulate(self, known: ReadingAssessment | None) -> None:
        if known is None:
            self.table.setRowCount(0)
            return
        rows = [(p.symbol, p.meaning, p.quantity) for p in known.parameters]
        rows += [
            (f"|Z|·A {m.frequency_hz:g} Hz", m.status.value.replace("_", " "), m.quantity)
            for m in known.modulus
            if m.quantity is not None
        ]
        if self.table.rowCount() != len(rows):
            self.table.setRowCount(len(rows))
        for i, (symbol, meaning, quantity) in enumerate(rows):
            tip = plain_tip(f"{meaning} ({WORDS[quantity.bound]}). {quantity.method}")
            for j, text in enumerate((symbol, said(quantity))):
                item = self.table.item(i, j)
                if item is None:
                    item = QTableWidgetItem()
                    self.table.setItem(i, j, item)
                if item.text() != text:
                    item.setText(text)
                if item.toolTip() != tip:
                    item.setToolTip(tip)

    def topic(self) -> str:
        known = self.desk.reading_assessment()
        return known.fit.model if known is not None and known.fit is not None else self.note

    def figure(self) -> list[QWidget]:
        return [] if self.desk.reading() is None else [*self.plots.plots, self.plots.key]

    def caption(self) -> str:
        known = self.desk.reading_assessment()
        if known is None:
            return ""
        model = f", {known.fit.model_name}" if known.fit else ""
        return f"{known.panel} ({known.formulation}) after {known.exposure_h:g} h{model}"

    def data_rows(self) -> list[list[object]]:
        reading = self.desk.reading()
        if reading is None:
            return []
        shown = drawn(reading, self.desk.reading_assessment())
        z = reading.spectrum.impedance_ohm
        model = shown.fit.modelled_ohm if shown.fit else [None] * z.size
        band, parts = self._beside_fit(reading.spectrum.frequency_hz)
        beside = _columns(band, parts)
        rows: list[list[object]] = [[*_HEADINGS, *beside]]
        for place, (f, measured, fitted, used) in enumerate(
            zip(reading.spectrum.frequency_hz, z, model, shown.used, strict=True)
        ):
            rows.append(
                [
                    float(f), float(measured.real), float(measured.imag), float(abs(measured)),
                    float(np.degrees(np.angle(measured))), "yes" if used else "no",
                    None if fitted is None else float(fitted.real),
                    None if fitted is None else float(fitted.imag),
                    *(float(column[place]) for column in beside.values()),
                ]
            )  # fmt: skip
        return rows

    def paint_in(self, tone: Colours) -> None:
        self.composing.composer.paint_in(tone)
        self.plots.point_at(-1)  # the cursor belongs to the mouse, not into a picture
        super().paint_in(tone)

    def _pointed(self, words: str) -> None:
        self._read_out.say(words or _HINT)

    # --- edits -----------------------------------------------------------------------------

    def _later(self, places: list[int]) -> None:
        """Edit when the click has been delivered, for the edit draws the plots anew."""
        self.toggling = places
        QTimer.singleShot(0, self, self._toggle)

    def _toggle(self) -> None:
        places, self.toggling = self.toggling, []
        reading, known = self.desk.reading(), self.desk.reading_assessment()
        if reading is None or not places:
            return
        used = drawn(reading, known).used
        if any(used[place] for place in places):
            chosen = [place for place in places if used[place]]
            self.desk.edit(
                operations.leave_out_points, reading.reading_id, chosen, "left out by hand"
            )
        else:
            self.desk.edit(operations.take_back_points, reading.reading_id, places)

    def _compose(self) -> None:
        known = self.desk.reading_assessment()
        fitted = known.fit.model if known and known.fit else ""
        self.composing.begin(self.picker.picked(), fitted, self.tone)
        self.pages.setCurrentIndex(1)
        self.composing.composer.name.setFocus()

    def _composed(self) -> None:
        self.pages.setCurrentIndex(0)
        self.picker.compose.setFocus()


def _switch(text: str, description: str) -> QPushButton:
    switch = QPushButton(text)
    switch.setCheckable(True)
    switch.setToolTip(description)
    switch.setAccessibleDescription(description)
    return switch


def _columns(band: FitBand | None, parts: Sequence[Part]) -> dict[str, np.ndarray]:
    """Band and parts as columns of the table, by their headings."""
    found: dict[str, np.ndarray] = {}
    if band is not None:
        found["model_modulus_low_ohm"] = band.modulus_low_ohm
        found["model_modulus_high_ohm"] = band.modulus_high_ohm
        found["model_phase_low_degrees"] = band.phase_low_deg
        found["model_phase_high_degrees"] = band.phase_high_deg
    for part in parts:
        if part.impedance_ohm is not None:
            found[f"{part.name}: real_ohm"] = part.impedance_ohm.real
            found[f"{part.name}: imaginary_ohm"] = part.impedance_ohm.imag
    return found


def drawn(reading: Reading, known: ReadingAssessment | None) -> Drawn:
    """A reading as the plots want it. Points that a person has just left out or taken back stand
    so before the new fit is there."""
    fit = known.fit if known else None
    if fit is not None:
        used = np.array(fit.used)
    else:
        used = np.ones(len(reading.spectrum), dtype=bool)
        for point in known.left_out if known else ():
            used[reading.spectrum.frequency_hz == point.frequency_hz] = False
    for place, _ in reading.left_out:
        used[place] = False
    used[list(reading.kept_in)] = True
    return Drawn(reading.spectrum, fit, used)
