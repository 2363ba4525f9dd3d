"""What stands beside a course: events of the picked panel, and the ratings beneath."""

from __future__ import annotations

from collections.abc import Callable, Sequence

import numpy as np
import pyqtgraph as pg
from PySide6.QtCore import Qt
from PySide6.QtGui import QFont

from coatgui.records import Event, RatingCourse
from coatgui.window.axis import Plot
from coatgui.window.palette import Colours, formulation_look

_ROW = 22
_AROUND = 34  # the time axis and its margin, px
_MOST_ROWS = 8


def event_lines(
    events: Sequence[Event], across: Callable[[np.ndarray], np.ndarray], tone: Colours
) -> list[pg.InfiniteLine]:
    """An upright line where events are known to have happened by, with their names along it; dotted
    where only one reading shows them."""
    lines = []
    dated: dict[float, list[Event]] = {}
    for event in events:
        if event.by_h is not None:
            dated.setdefault(event.by_h, []).append(event)
    for by_h, those in sorted(dated.items()):
        confirmed = any(event.confirmed for event in those)
        style = Qt.PenStyle.DashLine if confirmed else Qt.PenStyle.DotLine
        line = pg.InfiniteLine(
            float(across(np.array([by_h]))[0]),
            angle=90,
            pen=pg.mkPen(tone.amber, width=1, style=style),
            label=", ".join(event.code.replace("_", " ") for event in those),
            labelOpts={
                "position": 0.02,
                "color": tone.amber,
                "rotateAxis": (1, 0),
                "anchors": [(0, 0), (0, 1)],
            },
        )
        font = QFont()
        font.setPixelSize(11)
        line.label.setFont(font)
        lines.append(line)
    return lines


class RatingsStrip(Plot):
    """A row for each scale and formulation, a mark and the grade at each inspection that was rated.
    The grades are as the scale writes them: the best and, where panels differ, the worst."""

    def __init__(self) -> None:
        super().__init__("Ratings over exposure time", ("", None), ("", None))
        self.rows: list[tuple[str, str]] = []
        self.setMouseEnabled(y=False)
        self.hide()

    def show_ratings(
        self,
        ratings: Sequence[RatingCourse],
        names: Sequence[str],
        longest_h: float,
        across: Callable[[np.ndarray], np.ndarray],
        tone: Colours,
    ) -> None:
        """`names` are the formulations in the campaign's order, `longest_h` is where the time axis
        ends."""
        from coatgui.assessment.ratings import scales  # late: it brings all of assessment

        self.clear()
        self.paint_in(tone.ground, tone.second, tone.line)
        order = {name: place for place, name in enumerate(names)}
        self.rows = sorted(
            {(r.scale, r.formulation) for r in ratings}, key=lambda row: (row[0], order[row[1]])
        )[:_MOST_ROWS]
        self.setVisible(bool(self.rows))
        if not self.rows:
            return
        ticks = []
        for place, (scale, formulation) in enumerate(self.rows):
            name = str(scales().get(scale, {}).get("name", scale))
            ticks.append((-place, name.partition(",")[0]))
            colour, shape = formulation_look(order[formulation], tone.dark)
            own = [r for r in ratings if (r.scale, r.formulation) == (scale, formulation)]
            x = across(np.array([r.exposure_h for r in own]))
            ends = x.min(), across(np.array([longest_h]))[0]
            marks = pg.ScatterPlotItem(
                x, np.full(len(own), -float(place)), symbol=shape, size=8,
                pen=pg.mkPen(colour), brush=None,
            )  # fmt: skip
            self.addItem(marks)
            for at, rating in zip(x, own, strict=True):
                words = grades(rating)
                # At the right end there is room at the left only.
                at_end = at > ends[0] + 0.9 * (ends[1] - ends[0]) or at == ends[1]
                text = pg.TextItem(words, color=tone.ink, anchor=(1.2 if at_end else -0.2, 0.5))
                text.setPos(float(at), -float(place))
                self.addItem(text, ignoreBounds=True)
        self.getPlotItem().getAxis("left").setTicks([ticks])
        self.setYRange(-len(self.rows) + 0.5, 0.5, padding=0)
        self.setFixedHeight(_ROW * len(self.rows) + _AROUND)
        self.setAccessibleDescription(
            "; ".join(f"{r.formulation}, {r.exposure_h:g} h, {r.scale}: {grades(r)}"
                      for r in ratings)
        )  # fmt: skip


def grades(rating: RatingCourse) -> str:
    return rating.best if rating.best == rating.worst else f"{rating.best} … {rating.worst}"
