"""Course: a quantity over exposure time, replicates together, and the water beneath."""

from __future__ import annotations

from typing import Any

import numpy as np
import pyqtgraph as pg
from PySide6.QtCore import Qt, QTimer
from PySide6.QtGui import QHideEvent, QShowEvent
from PySide6.QtWidgets import QComboBox, QHBoxLayout, QWidget

from coatgui.records import Assessment, Bound, FormulationAssessment
from coatgui.window.axis import DecadeAxis, Plot
from coatgui.window.course_marks import RatingsStrip, event_lines
from coatgui.window.course_rows import course_rows
from coatgui.window.desk import Desk
from coatgui.window.legend import Legend
from coatgui.window.palette import Colours, formulation_look
from coatgui.window.places.map_place import QUANTITIES, amount
from coatgui.window.places.place import Place, plain_label
from coatgui.window.places.reading_place import drawn
from coatgui.window.time_constants import Outlines, TimeConstantsPlot, Wanted

_TIMES = {
    "Exposure time, log": "log",
    "Exposure time, √t": "root",
    "Exposure time, linear": "plain",
}
WATER, TIME_CONSTANTS = range(2)
_BELOW = ("Below: water uptake", "Below: time constants")
_EXPLORATORY = (
    "{panel}, exploratory: the wider, the more resistance at that time constant; circles mark "
    "humps. Many outlines fit the same data, and nothing else here rests on them."
)
_AXIS_WIDTH = 108
# Labels of the time axis stand at least this share of its width apart.
_APART = 1 / 16


class CoursePlace(Place):
    noun, question = "Course", "How is it going?"
    needs = "assessment"
    promise = "Here each quantity will run over exposure time, replicates together, water beneath."
    note = "trend"
    leaves_facts = True

    def __init__(self, desk: Desk, tone: Colours) -> None:
        super().__init__(desk, tone)
        bar = QHBoxLayout()
        self.chooser = QComboBox()
        self.chooser.setAccessibleName("Quantity over exposure time")
        self.chooser.setAccessibleDescription("What the upper plot shows")
        self.chooser.addItems([name for name, code in QUANTITIES.items() if code != "water_uptake"])
        self.times = QComboBox()
        self.times.setAccessibleName("Scale of exposure time")
        self.times.setAccessibleDescription("How the exposure time is spread in both plots")
        self.times.addItems(list(_TIMES))
        self.below = QComboBox()
        self.below.setAccessibleName("What the lower plot shows")
        self.below.setAccessibleDescription(
            "Water of all panels, or the time constants of the picked panel"
        )
        self.below.addItems(list(_BELOW))
        self.explained = plain_label("small")
        for choice in (self.chooser, self.times, self.below):
            choice.currentIndexChanged.connect(self.show_campaign)
            bar.addWidget(choice)
        bar.addWidget(self.explained, 1)
        self.column.addLayout(bar)
        self.legend = Legend(tone)
        self.column.addWidget(self.legend)
        self.course = Plot("Course of the quantity", ("", None), ("", "Ω cm²"))
        self.water = Plot("Course of the water uptake", ("", None), ("water / vol-%", None))
        self.water.setXLink(self.course)
        self.constants = TimeConstantsPlot()
        self.constants.setXLink(self.course)
        self.exploratory = plain_label("small")
        for plot in (self.course, self.water, self.constants):
            plot.getPlotItem().getAxis("left").setWidth(_AXIS_WIDTH)
        self.column.addWidget(self.course, 3)
        self.column.addWidget(self.water, 2)
        self.column.addWidget(self.exploratory)
        self.column.addWidget(self.constants, 3)
        self.ratings = RatingsStrip()
        self.ratings.setXLink(self.course)
        self.ratings.getPlotItem().getAxis("left").setWidth(_AXIS_WIDTH)
        self.column.addWidget(self.ratings)
        self._events: list[pg.InfiniteLine] = []
        self.outlines = Outlines(self)
        self.outlines.came.connect(self._draw_constants)
        self._own = {plot: pg.PlotCurveItem() for plot in (self.course, self.water)}
        self._here = {plot: pg.ScatterPlotItem() for plot in (self.course, self.water)}

    def _code(self) -> str:
        return QUANTITIES[self.chooser.currentText()]

    def _across(self, hours: np.ndarray) -> np.ndarray:
        scale = _TIMES[self.times.currentText()]
        if scale == "log":
            return np.asarray(np.log10(np.maximum(hours, 0.1)))
        return np.asarray(np.sqrt(hours) if scale == "root" else hours)

    def _wanted(self) -> list[Wanted]:
        """The readings of the picked panel that count, as the outlines want them."""
        reading, campaign, assessment = (
            self.desk.reading(), self.desk.campaign, self.desk.assessment,
        )  # fmt: skip
        if reading is None or campaign is None or assessment is None:
            return []
        known = {r.reading_id: r for r in assessment.readings if r.counts}
        return [
            Wanted(r.reading_id, r.exposure_h, r.spectrum, drawn(r, known[r.reading_id]).used)
            for r in campaign.readings
            if r.panel_id == reading.panel_id and r.reading_id in known
        ]

    def _draw_constants(self) -> None:
        """Draw the outlines that are there, and have the others computed."""
        shown = self.below.currentIndex() == TIME_CONSTANTS
        self.water.setVisible(not shown)
        self.constants.setVisible(shown)
        self.exploratory.setVisible(shown)
        if not shown or not self.isVisible():
            self.outlines.stop()
            return
        wanted = self._wanted()
        if not self.outlines.trouble:
            self.outlines.want(wanted)
        there = [(w, o) for w in wanted if (o := self.outlines.of(w)) is not None]
        self.constants.show_outlines(
            [(float(self._across(np.array([w.exposure_h]))[0]), o) for w, o in there],
            next(
                (float(self._across(np.array([w.exposure_h]))[0]) for w, _ in there
                 if w.reading_id == self.desk.selection),
                None,
            ),
            self.tone,
        )  # fmt: skip
        panel = self.desk.reading_assessment()
        words = _EXPLORATORY.format(panel=panel.panel if panel else "")
        done = sum(self.outlines.has(w) for w in wanted)
        if self.outlines.busy:
            words += f" {done} of {len(wanted)} readings are computed …"
        elif done > len(there):
            words += f" {done - len(there)} have too few points."
        self.exploratory.setText(self.outlines.trouble or words)
        self.constants.enableAutoRange(axis="y")

    def hideEvent(self, event: QHideEvent) -> None:
        self.outlines.stop()
        super().hideEvent(event)

    def showEvent(self, event: QShowEvent) -> None:
        super().showEvent(event)
        self._draw_constants()

    def show_campaign(self) -> None:
        assessment, code = self.desk.assessment, self._code()
        for plot in (self.course, self.water):
            plot.clear()
            plot.paint_in(self.tone.ground, self.tone.second, self.tone.line)
        axis = self.course.getPlotItem().getAxis("left")
        if isinstance(axis, DecadeAxis):
            axis.unit = "F/cm²" if code == "coating_capacitance" else "Ω cm²"
            axis.setLabel(self.chooser.currentText(), color=self.tone.second)
        if assessment is None:
            self.explained.setText(self.desk.unjudged_words())
            self.legend.show_names([], self.tone)
            self.ratings.show_ratings([], [], 0.0, self._across, self.tone)
            return
        self.explained.setText(
            "Thick: mean of the panels with its 95 % band. Thin: each panel. ↑ at least, ↓ at most."
        )
        self.legend.show_names([f.formulation for f in assessment.formulations], self.tone)
        for plot, of, logarithm in (
            (self.course, code, True),
            (self.water, "water_uptake", False),
        ):
            for place, formulation in enumerate(assessment.formulations):
                self._draw(plot, assessment, formulation, place, of, logarithm)
            plot.addItem(self._own[plot])
            plot.addItem(self._here[plot], ignoreBounds=True)
        self._limits(assessment, code)
        names = [f.formulation for f in assessment.formulations]
        rated = [r for r in assessment.ratings if r.formulation in names]
        longest = max(
            [r.exposure_h for r in assessment.readings] + [r.exposure_h for r in rated], default=0.0
        )
        self.ratings.show_ratings(rated, names, longest, self._across, self.tone)
        self._events = []
        self._ticks(assessment)
        self.show_selection()
        for plot in (self.course, self.water):
            plot.autoRange(padding=0.04)

    def _ticks(self, assessment: Assessment) -> None:
        """Label the inspections: the last and the first always, others where there is room."""
        hours = sorted({r.exposure_h for r in assessment.readings})
        places = [float(x) for x in self._across(np.array(hours))]
        if not places:
            return
        width = max(places[-1] - places[0], 1e-9)
        kept: dict[float, str] = {}
        for at in (len(hours) - 1, 0, *range(len(hours) - 2, 0, -1)):
            if all(abs(places[at] - other) > width * _APART for other in kept):
                kept[places[at]] = f"{hours[at]:g} h"
        for plot in (self.course, self.water, self.constants, self.ratings):
            plot.getPlotItem().getAxis("bottom").setTicks([sorted(kept.items())])

    def _limits(self, assessment: Assessment, code: str) -> None:
        criteria = {c.criterion for panel in assessment.panels for c in panel.limit_crossings}
        for criterion in criteria:
            if code != f"modulus_{criterion.frequency_hz:g}":
                continue
            line = pg.InfiniteLine(
                float(np.log10(criterion.ohm_cm2)),
                angle=0,
                pen=pg.mkPen(self.tone.rust, width=1, style=Qt.PenStyle.DashLine),
                label=criterion.name,
                labelOpts={"position": 0.06, "color": self.tone.rust, "anchors": [(0, 1), (0, 1)]},
            )
            self.course.addItem(line, ignoreBounds=True)

    def _draw(
        self,
        plot: Plot,
        assessment: Assessment,
        formulation: FormulationAssessment,
        place: int,
        code: str,
        logarithm: bool,
    ) -> None:
        colour, shape = formulation_look(place, self.tone.dark)
        for panel in assessment.panels:
            if panel.formulation == formulation.formulation:
                self._panel(plot, panel.panel_id, code, colour, shape, logarithm)
        course = next((c for c in formulation.courses if c.code == code), None)
        points = [p for p in course.points if p.quantity.value is not None] if course else []
        if not points:
            return
        x = self._across(np.array([p.exposure_h for p in points]))
        mean = np.array([p.quantity.value for p in points], dtype=float)
        # A limit that the data do not hold leaves the band at the mean.
        low = np.array(
            [p.quantity.value if p.quantity.low is None else p.quantity.low for p in points]
        )
        high = np.array(
            [p.quantity.value if p.quantity.high is None else p.quantity.high for p in points]
        )
        if logarithm:
            mean, low, high = (
                np.log10(np.maximum(v.astype(float), 1e-30)) for v in (mean, low, high)
            )
        edge = pg.mkPen(None)
        lower, upper = pg.PlotCurveItem(x, low, pen=edge), pg.PlotCurveItem(x, high, pen=edge)
        shade = pg.mkColor(colour)
        shade.setAlpha(34)
        plot.addItem(lower)
        plot.addItem(upper)
        plot.addItem(pg.FillBetweenItem(lower, upper, brush=shade))
        plot.plot(x, mean, pen=pg.mkPen(colour, width=2.4))

    def _series(
        self, panel_id: str, code: str, logarithm: bool
    ) -> tuple[np.ndarray, np.ndarray, list[Bound], list[str]]:
        """Across, up, kinds of bound and ids of a panel's readings that count."""
        assessment = self.desk.assessment
        own = [r for r in assessment.readings if r.panel_id == panel_id] if assessment else []
        found = [
            (r, q.value, q.bound)
            for r in own
            if r.counts and (q := amount(r, code)) is not None and q.value is not None
            if not logarithm or q.value > 0
        ]
        x = self._across(np.array([r.exposure_h for r, _, _ in found], dtype=float))
        y = np.array([value for _, value, _ in found], dtype=float)
        y = np.log10(y) if logarithm else y
        return x, y, [bound for _, _, bound in found], [r.reading_id for r, _, _ in found]

    def _panel(
        self, plot: Plot, panel_id: str, code: str, colour: Any, shape: str, logarithm: bool
    ) -> None:
        x, y, bounds, ids = self._series(panel_id, code, logarithm)
        if not ids:
            return
        faint = pg.mkColor(colour)
        faint.setAlpha(150)
        plot.plot(x, y, pen=pg.mkPen(faint, width=1))
        symbols = {Bound.AT_LEAST: "arrow_up", Bound.AT_MOST: "arrow_down"}
        marks = pg.ScatterPlotItem(
            x, y, symbol=[symbols.get(bound, shape) for bound in bounds], size=8,
            pen=pg.mkPen(colour), brush=None, data=ids,
        )  # fmt: skip
        marks.sigClicked.connect(self._clicked)
        plot.addItem(marks)

    def show_selection(self) -> None:
        """The picked panel's line stands out, and the picked reading on it."""
        reading = self.desk.reading()
        for plot, code, logarithm in (
            (self.course, self._code(), True),
            (self.water, "water_uptake", False),
        ):
            panel_id = reading.panel_id if reading else ""
            x, y, _, ids = self._series(panel_id, code, logarithm)
            self._own[plot].setData(x, y, pen=pg.mkPen(self.tone.ink, width=1.2))
            here = [i for i, key in enumerate(ids) if key == self.desk.selection]
            self._here[plot].setData(
                x[here], y[here], symbol="o", size=15, brush=None,
                pen=pg.mkPen(self.tone.verdigris, width=2),
            )  # fmt: skip
        self._mark_events(reading.panel_id if reading else "")
        self._draw_constants()

    def _mark_events(self, panel_id: str) -> None:
        """What happened to the picked panel, where it is known to have happened by."""
        for line in self._events:
            self.course.removeItem(line)
        assessment = self.desk.assessment
        panels = () if assessment is None else assessment.panels
        panel = next((p for p in panels if p.panel_id == panel_id), None)
        self._events = event_lines(panel.events if panel else (), self._across, self.tone)
        for line in self._events:
            self.course.addItem(line, ignoreBounds=True)

    def figure(self) -> list[QWidget]:
        constants = self.below.currentIndex() == TIME_CONSTANTS
        below = self.constants if constants else self.water
        shown: list[QWidget] = [self.legend, self.course, below]
        if self.ratings.isVisible():
            shown.append(self.ratings)
        return shown if self.desk.assessment else []

    def caption(self) -> str:
        title = self.desk.assessment.title if self.desk.assessment else ""
        if self.below.currentIndex() == TIME_CONSTANTS:
            panel = self.desk.reading_assessment()
            name = panel.panel if panel else ""
            return f"{title}: {self.chooser.currentText()}; time constants of {name}, exploratory"
        return f"{title}: {self.chooser.currentText()} and apparent water uptake"

    def data_rows(self) -> list[list[object]]:
        outlines = None
        if self.below.currentIndex() == TIME_CONSTANTS:
            outlines = [(w.exposure_h, self.outlines.of(w)) for w in self._wanted()]
        return course_rows(
            self.desk.assessment, self._code(), self.desk.reading_assessment(), outlines
        )

    def _clicked(self, _item: Any, points: Any, _event: Any = None) -> None:
        if len(points):
            picked = str(points[0].data())
            QTimer.singleShot(0, self, lambda: self.desk.select(picked))
