"""Water: how the film's capacitance rises on the root of time, and how much water that means."""

from __future__ import annotations

from typing import Any

import numpy as np
import pyqtgraph as pg
from PySide6.QtCore import Qt, QTimer
from PySide6.QtGui import QColor, QShowEvent
from PySide6.QtWidgets import QHBoxLayout, QTableWidgetItem, QVBoxLayout, QWidget

from coatgui.assessment.fick import fickian_uptake
from coatgui.assessment.film import film_facts
from coatgui.records import (
    Bound,
    FloatArray,
    Panel,
    PanelAssessment,
    Quantity,
    ReadingAssessment,
    WaterUptake,
)
from coatgui.window.axis import Plot
from coatgui.window.desk import Desk
from coatgui.window.numbers import said
from coatgui.window.palette import Colours
from coatgui.window.places.place import Place, plain_label, plain_tip
from coatgui.window.sheet import sheet

_APART = 1 / 16
_WATER_EVENTS = ("film_saturated", "second_stage_sorption", "dried_out", "wetted_again")
_CURVE_POINTS = 160
_RAISED = str.maketrans("-0123456789", "⁻⁰¹²³⁴⁵⁶⁷⁸⁹")
_HEADINGS = (
    "panel", "exposure_h", "capacitance", "capacitance_low", "capacitance_high", "unit",
    "uptake_vol_percent", "uptake_low", "uptake_high", "bound", "laws_low", "laws_high",
)  # fmt: skip


def capacitance_of(readings: list[ReadingAssessment]) -> list[Quantity | None]:
    """The capacitances that a panel's uptake rests on: the fitted film's where half of the readings
    have one, else the measured ones."""
    fitted = [r.coating_capacitance for r in readings]
    if 2 * sum(q is not None for q in fitted) >= len(readings):
        return fitted
    return [r.capacitance_at_high_frequency for r in readings]


def sorption_curve(panel: PanelAssessment, hours: FloatArray) -> FloatArray | None:
    """Uptake (N,) in vol-% by Fick's law with the panel's own D and saturation at exposure times
    (N,) in h; None where the readings did not hold them."""
    diffusion, end = panel.diffusion_coefficient, panel.saturation_uptake
    if diffusion is None or diffusion.value is None or panel.thickness_um is None:
        return None
    if end is None or end.quantity.value is None:
        return None
    rate_per_h = diffusion.value * 3600.0 / (panel.thickness_um * 1e-4) ** 2
    curve: FloatArray = end.quantity.value * fickian_uptake(rate_per_h * hours)
    return curve


def water_words(panel: PanelAssessment) -> str:
    """What the panel's readings say about its water, as one sentence or two."""
    end = panel.saturation_uptake
    if panel.dry_capacitance is None:
        return f"{panel.panel}: no capacitance of a film is known, so nothing is said of water."
    parts = [f"{panel.panel}: dry film {said(panel.dry_capacitance)}"]
    if end is not None:
        parts.append(f"saturated with {said(end.quantity)} of water by Brasher–Kingsbury")
        if end.law_low is not None and end.law_high is not None:
            parts.append(
                f"between {end.law_low:.2g} and {end.law_high:.2g} vol-% by the choice of law"
            )
    if panel.saturation_mass_percent is not None:
        parts.append(f"that is {said(panel.saturation_mass_percent)}")
    if panel.diffusion_coefficient is not None:
        q = panel.diffusion_coefficient
        limits = f" ({_tens(q.low)}–{_tens(q.high)})" if q.low and q.high else ""
        if q.value is not None:
            parts.append(f"D = {_tens(q.value)} cm²/s{limits}")
    return ", ".join(parts) + "."


def _tens(value: float) -> str:
    """7.1·10⁻¹⁰"""
    number, power = f"{value:.1e}".split("e")
    return f"{number}·10{str(int(power)).translate(_RAISED)}"


class WaterPlace(Place):
    noun, question = "Water", "How much water does the film take up, and how fast?"
    needs = "assessment"
    promise = (
        "Here the water in the film will be followed, with its bracket and its sorption curve."
    )
    note = "water_uptake"

    def __init__(self, desk: Desk, tone: Colours) -> None:
        super().__init__(desk, tone)
        self._drawn = False
        self.about = plain_label()
        self.column.addWidget(self.about)
        row = QHBoxLayout()
        row.setSpacing(12)
        left = QVBoxLayout()
        left.setSpacing(4)
        self.capacitance = Plot(
            "Capacitance of the film", ("", None), ("capacitance", "F/cm²"), decades=False
        )
        self.uptake = Plot(
            "Water uptake", ("exposure time, √t", None), ("apparent water / vol-%", None)
        )
        self.uptake.setXLink(self.capacitance)
        for plot in (self.capacitance, self.uptake):
            left.addWidget(plot, 1)
        self.explained = plain_label("small")
        self.explained.setText(
            "Circles: readings with 95 % limits; ↑ at least. Line: Fick's law with the panel's D. "
            "Pale bars: what the other mixing laws make of the same capacitance. A point is picked "
            "by a click."
        )
        left.addWidget(self.explained)
        row.addLayout(left, 3)
        right = QVBoxLayout()
        right.setSpacing(8)
        self.laws = sheet(
            ("mixing law", "this reading", "at saturation"),
            "Water by mixing law, in vol-%",
            "A row for each law; the laws between the ends of the bracket count as mixtures",
        )
        self.laws.verticalHeader().setDefaultSectionSize(22)
        self.said = plain_label()
        self.said.setAlignment(Qt.AlignmentFlag.AlignTop)
        right.addWidget(self.laws)
        right.addWidget(self.said, 1)
        row.addLayout(right, 2)
        self.column.addLayout(row, 1)

    def _panel(self) -> tuple[PanelAssessment | None, list[ReadingAssessment]]:
        reading, assessment = self.desk.reading(), self.desk.assessment
        if reading is None or assessment is None:
            return None, []
        panel = next((p for p in assessment.panels if p.panel_id == reading.panel_id), None)
        own = [r for r in assessment.readings if r.panel_id == reading.panel_id and r.counts]
        return panel, own

    def show_campaign(self) -> None:
        self.show_selection()

    def show_selection(self) -> None:
        """Drawn when it is seen: stepping through readings elsewhere must not wait for it."""
        self._drawn = self.isVisible()
        if self._drawn:
            self._refresh()

    def showEvent(self, event: QShowEvent) -> None:
        super().showEvent(event)
        if not self._drawn:
            self.show_selection()

    def _refresh(self) -> None:
        for plot in (self.capacitance, self.uptake):
            plot.clear()
            plot.paint_in(self.tone.ground, self.tone.second, self.tone.line)
        panel, readings = self._panel()
        self.laws.setRowCount(0)
        self.said.setText("")
        if panel is None:
            self.about.setText(self.desk.unjudged_words())
            return
        self.about.setText(water_words(panel))
        texts = [f.text for f in panel.findings]
        texts += [event.text for event in panel.events if event.code in _WATER_EVENTS]
        self.said.setText("\n".join(dict.fromkeys(texts)))
        self._tabulate(panel)
        self._draw(panel, readings)

    def _tabulate(self, panel: PanelAssessment) -> None:
        known = self.desk.reading_assessment()
        here = known.water_uptake if known else None
        end = panel.saturation_uptake
        names = (here or end or _NO_LAWS).law_names
        here_by, end_by = (dict(each.by_law) if each else {} for each in (here, end))
        rows = [(name, here_by.get(name), end_by.get(name)) for name in names]
        self.laws.setRowCount(len(rows))
        self.laws.setFixedHeight(36 + 22 * max(len(rows), 1))
        bracket = here or end
        for i, (name, now, last) in enumerate(rows):
            value = now if here else last
            inside = (
                bracket is not None
                and value is not None
                and bracket.law_low is not None
                and bracket.law_high is not None
                and bracket.law_low * 0.999 <= value <= bracket.law_high * 1.001
            )
            texts = (name, *("–" if v is None else f"{v:.2f}" for v in (now, last)))
            for j, text in enumerate(texts):
                item = QTableWidgetItem(text)
                item.setForeground(QColor(self.tone.ink if inside else self.tone.second))
                item.setToolTip(
                    plain_tip("" if inside else "Outside the bracket: not counted as a mixture.")
                )
                self.laws.setItem(i, j, item)

    def _draw(self, panel: PanelAssessment, readings: list[ReadingAssessment]) -> None:
        tone = self.tone
        basis = capacitance_of(readings)
        amounts = [r.water_uptake.quantity if r.water_uptake else None for r in readings]
        self._bars(readings)
        self._curves(panel, readings, basis)
        for plot, quantities in ((self.capacitance, basis), (self.uptake, amounts)):
            self._points(plot, readings, quantities)
        dry = panel.dry_capacitance
        if dry is not None and dry.value is not None:
            symbol = "d" if dry.bound is not Bound.AT_MOST else "arrow_down"
            self.capacitance.addItem(
                pg.ScatterPlotItem(
                    [0.0], [dry.value], symbol=symbol, size=11,
                    pen=pg.mkPen(tone.verdigris, width=1.6), brush=None,
                )
            )  # fmt: skip
        hours = sorted({0.0, *(r.exposure_h for r in readings)})
        self._ticks(hours)
        for plot in (self.capacitance, self.uptake):
            plot.autoRange(padding=0.06)

    def _ticks(self, hours: list[float]) -> None:
        places = np.sqrt(hours)
        width = max(float(places[-1]), 1e-9)
        kept: dict[float, str] = {}
        for at in (len(hours) - 1, 0, *range(len(hours) - 2, 0, -1)):
            if all(abs(places[at] - other) > width * _APART for other in kept):
                kept[float(places[at])] = f"{hours[at]:g} h"
        for plot in (self.capacitance, self.uptake):
            plot.getPlotItem().getAxis("bottom").setTicks([sorted(kept.items())])

    def _bars(self, readings: list[ReadingAssessment]) -> None:
        """What the choice of the law leaves open at each reading."""
        shade = QColor(self.tone.slate)
        shade.setAlpha(70)
        found = [
            (float(np.sqrt(r.exposure_h)), r.water_uptake.law_low, r.water_uptake.law_high)
            for r in readings
            if r.water_uptake is not None
        ]
        for x, low, high in found:
            if low is not None and high is not None:
                self.uptake.addItem(
                    pg.PlotCurveItem([x, x], [low, high], pen=pg.mkPen(shade, width=7))
                )

    def _curves(
        self,
        panel: PanelAssessment,
        readings: list[ReadingAssessment],
        basis: list[Quantity | None],
    ) -> None:
        last = max((r.exposure_h for r in readings), default=0.0)
        root = np.linspace(0.0, np.sqrt(last), _CURVE_POINTS)
        record = self._record(panel.panel_id)
        if record is not None and film_facts(record).wet_thickness_um is not None:
            return  # the saturation then counts swelling, which the readings' uptakes do not
        curve = sorption_curve(panel, root**2)
        if curve is None:
            return
        pen = pg.mkPen(self.tone.verdigris, width=1.6)
        self.uptake.plot(root, curve, pen=pen)
        dry = panel.dry_capacitance
        # Brasher and Kingsbury's uptake is proportional to ln(C/C_0): one reading gives the factor.
        pairs = [
            (r.water_uptake.quantity.value, q.value)
            for r, q in zip(readings, basis, strict=True)
            if r.water_uptake and r.water_uptake.quantity.value and q and q.value
        ]
        if dry is None or not dry.value or not pairs:
            return
        most, capacitance = max(pairs)
        rise = np.log(capacitance / dry.value) / most
        self.capacitance.plot(root, dry.value * np.exp(curve * rise), pen=pen)

    def _record(self, panel_id: str) -> Panel | None:
        panels = () if self.desk.campaign is None else self.desk.campaign.panels
        return next((p for p in panels if p.panel_id == panel_id), None)

    def _points(
        self, plot: Plot, readings: list[ReadingAssessment], quantities: list[Quantity | None]
    ) -> None:
        tone = self.tone
        symbols = {Bound.AT_LEAST: "arrow_up", Bound.AT_MOST: "arrow_down"}
        for reading, q in zip(readings, quantities, strict=True):
            if q is None or q.value is None:
                continue
            x = float(np.sqrt(reading.exposure_h))
            if q.low is not None and q.high is not None:
                plot.addItem(
                    pg.PlotCurveItem([x, x], [q.low, q.high], pen=pg.mkPen(tone.slate, width=1.2))
                )
            here = reading.reading_id == self.desk.selection
            marks = pg.ScatterPlotItem(
                [x], [q.value], symbol=symbols.get(q.bound, "o"), size=12 if here else 8,
                pen=pg.mkPen(tone.verdigris if here else tone.slate, width=2 if here else 1),
                brush=pg.mkBrush(tone.ground), data=[reading.reading_id],
            )  # fmt: skip
            marks.sigClicked.connect(self._clicked)
            plot.addItem(marks)

    def _clicked(self, _item: Any, points: Any, _event: Any = None) -> None:
        if len(points):
            picked = str(points[0].data())
            QTimer.singleShot(0, self, lambda: self.desk.select(picked))

    def figure(self) -> list[QWidget]:
        return [self.capacitance, self.uptake] if self._panel()[0] else []

    def caption(self) -> str:
        panel, _ = self._panel()
        return "" if panel is None else water_words(panel)

    def data_rows(self) -> list[list[object]]:
        panel, readings = self._panel()
        rows: list[list[object]] = [list(_HEADINGS)]
        for r, q in zip(readings, capacitance_of(readings), strict=True):
            water = r.water_uptake
            w = water.quantity if water else None
            rows.append(
                [
                    panel.panel if panel else "", r.exposure_h,
                    *((q.value, q.low, q.high, q.unit) if q else (None, None, None, "")),
                    *((w.value, w.low, w.high, w.bound.value) if w else (None, None, None, "")),
                    water.law_low if water else None, water.law_high if water else None,
                ]
            )  # fmt: skip
        return rows


_NO_LAWS = WaterUptake(Quantity(None, None, None, Bound.UNDETERMINED, "vol-%"), 0.0)
