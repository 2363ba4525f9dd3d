"""Course: a quantity over exposure time, replicates together, and the water beneath."""

from __future__ import annotations

from typing import Any

import numpy as np
import pyqtgraph as pg
from PySide6.QtWidgets import QComboBox, QHBoxLayout

from coatgui.records import Assessment, Bound
from coatgui.window.axis import DecadeAxis, Plot
from coatgui.window.desk import Desk
from coatgui.window.palette import Colours, formulation_look
from coatgui.window.places.map_place import QUANTITIES, amount
from coatgui.window.places.place import Place, plain_label

_TIMES = {
    "exposure time, log": "log",
    "exposure time, √t": "root",
    "exposure time, linear": "plain",
}


class CoursePlace(Place):
    noun, question = "Course", "How is it going?"

    def __init__(self, desk: Desk, tone: Colours) -> None:
        super().__init__(desk, tone)
        bar = QHBoxLayout()
        self.chooser = QComboBox()
        self.chooser.setAccessibleName("Quantity over exposure time")
        self.chooser.addItems([name for name, code in QUANTITIES.items() if code != "water_uptake"])
        self.times = QComboBox()
        self.times.setAccessibleName("Scale of exposure time")
        self.times.addItems(list(_TIMES))
        self.legend = plain_label("small")
        for choice in (self.chooser, self.times):
            choice.currentIndexChanged.connect(self.show_campaign)
            bar.addWidget(choice)
        bar.addWidget(self.legend, 1)
        self.column.addLayout(bar)
        self.course = Plot("Course of the quantity", ("", None), ("", "Ω cm²"))
        self.water = Plot("Course of the water uptake", ("", None), ("water / vol-%", None))
        self.water.setXLink(self.course)
        self.column.addWidget(self.course, 3)
        self.column.addWidget(self.water, 2)

    def _across(self, hours: np.ndarray) -> np.ndarray:
        scale = _TIMES[self.times.currentText()]
        if scale == "log":
            return np.asarray(np.log10(np.maximum(hours, 0.1)))
        return np.asarray(np.sqrt(hours) if scale == "root" else hours)

    def show_campaign(self) -> None:
        assessment = self.desk.assessment
        code = QUANTITIES[self.chooser.currentText()]
        for plot in (self.course, self.water):
            plot.clear()
            plot.paint_in(self.tone.ground, self.tone.second, self.tone.line)
        unit = "F/cm²" if code == "coating_capacitance" else "Ω cm²"
        axis = self.course.getPlotItem().getAxis("left")
        if isinstance(axis, DecadeAxis):
            axis.unit = unit
            axis.setLabel(self.chooser.currentText(), color=self.tone.second)
        if assessment is None:
            self.legend.setText("The course appears when the readings have been judged.")
            return
        shapes = {"o": "●", "s": "■", "t": "▼", "d": "◆", "t1": "▲", "p": "⬟"}
        names = [
            f"{shapes[formulation_look(i)[1]]} {f.formulation}"
            for i, f in enumerate(assessment.formulations)
        ]
        self.legend.setText("   ".join(names) + "   band: 95 % limits of the mean; ↑ only at least")
        self._draw(self.course, assessment, code, logarithm=True)
        self._draw(self.water, assessment, "water_uptake", logarithm=False)
        self._ticks(assessment)
        for plot in (self.course, self.water):
            plot.autoRange()

    def _ticks(self, assessment: Assessment) -> None:
        hours = np.array(sorted({r.exposure_h for r in assessment.readings}))
        places = self._across(hours)
        kept: list[tuple[float, str]] = []
        width = max(float(np.ptp(places)), 1e-9)
        for x, h in zip(places, hours, strict=True):
            if not kept or x - kept[-1][0] > width / 18:
                kept.append((float(x), f"{h:g} h"))
        for plot in (self.course, self.water):
            plot.getPlotItem().getAxis("bottom").setTicks([kept])

    def _draw(self, plot: Plot, assessment: Assessment, code: str, *, logarithm: bool) -> None:
        for i, formulation in enumerate(assessment.formulations):
            colour, shape = formulation_look(i)
            faint = pg.mkColor(colour)
            faint.setAlpha(110)
            panels = [p for p in assessment.panels if p.formulation == formulation.formulation]
            for panel in panels:
                self._panel(plot, assessment, panel.panel_id, code, faint, shape, logarithm)
            course = next((c for c in formulation.courses if c.code == code), None)
            if course is None:
                continue
            points = [p for p in course.points if p.quantity.value is not None]
            if not points:
                continue
            x = self._across(np.array([p.exposure_h for p in points]))
            mean = np.array([p.quantity.value for p in points], dtype=float)
            low = np.array([p.quantity.low or p.quantity.value for p in points], dtype=float)
            high = np.array([p.quantity.high or p.quantity.value for p in points], dtype=float)
            if logarithm:
                mean, low, high = (np.log10(np.maximum(v, 1e-30)) for v in (mean, low, high))
            edge = pg.mkPen(colour, width=0)
            lower, upper = pg.PlotCurveItem(x, low, pen=edge), pg.PlotCurveItem(x, high, pen=edge)
            shade = pg.mkColor(colour)
            shade.setAlpha(38)
            plot.addItem(pg.FillBetweenItem(lower, upper, brush=shade))
            plot.plot(x, mean, pen=pg.mkPen(colour, width=2))

    def _panel(
        self,
        plot: Plot,
        assessment: Assessment,
        panel_id: str,
        code: str,
        colour: Any,
        shape: str,
        logarithm: bool,
    ) -> None:
        own = [r for r in assessment.readings if r.panel_id == panel_id and r.counts]
        found = [(r, q) for r in own if (q := amount(r, code)) is not None and q.value]
        if not found:
            return
        x = self._across(np.array([r.exposure_h for r, _ in found]))
        y = np.array([q.value for _, q in found], dtype=float)
        y = np.log10(y) if logarithm else y
        bounded = np.array([q.bound is Bound.AT_LEAST for _, q in found])
        ids = np.array([r.reading_id for r, _ in found], dtype=object)
        plot.plot(x, y, pen=pg.mkPen(colour, width=1))
        for mask, symbol in ((~bounded, shape), (bounded, "arrow_up")):
            if mask.any():
                marks = plot.plot(
                    x[mask], y[mask], pen=None, symbol=symbol, symbolSize=8,
                    symbolPen=pg.mkPen(colour), symbolBrush=None, data=ids[mask],
                )  # fmt: skip
                marks.sigPointsClicked.connect(self._clicked)

    def _clicked(self, _item: Any, points: Any) -> None:
        if len(points):
            self.desk.select(str(points[0].data()))
