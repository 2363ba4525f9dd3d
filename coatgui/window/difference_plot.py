"""Pairs of formulations as a picture: each difference with its limits, about a line at nothing."""

from __future__ import annotations

from collections.abc import Sequence

import pyqtgraph as pg
from PySide6.QtCore import Qt
from PySide6.QtGui import QFont, QFontMetricsF

from coatgui.records import PairTest
from coatgui.window.axis import Plot
from coatgui.window.palette import Colours

_MOST_WIDTH, _SIGNS = 320, 40


def pair_name(pair: PairTest) -> str:
    return f"{pair.first} − {pair.second}"


class DifferencePlot(Plot):
    def __init__(self) -> None:
        super().__init__("Differences between formulations", ("", None), ("", None))
        self.setMouseEnabled(x=False, y=False)

    def show_pairs(self, pairs: Sequence[PairTest], tone: Colours) -> None:
        """Pairs without a difference (by ranks) are not drawn."""
        self.clear()
        shown = [p for p in pairs if p.difference is not None and p.difference.value is not None]
        unit = shown[0].difference.unit if shown and shown[0].difference else ""
        self._titles["bottom"] = f"difference of the means / {unit}" if unit else ""
        self.paint_in(tone.ground, tone.second, tone.line)
        names = [pair_name(p) if len(pair_name(p)) <= _SIGNS else f"{pair_name(p)[:_SIGNS]}…"
                 for p in shown]  # fmt: skip
        ticks = [(-float(i), name) for i, name in enumerate(names)]
        axis = self.getPlotItem().getAxis("left")
        axis.setTicks([ticks])
        font = QFont(self.font())
        font.setPixelSize(12)
        measure = QFontMetricsF(font)
        wide = max((measure.horizontalAdvance(name) for name in names), default=60.0)
        axis.setWidth(min(wide * 1.1 + 18, _MOST_WIDTH))
        self.setVisible(bool(shown))
        if not shown:
            return
        self.addItem(
            pg.InfiniteLine(0.0, angle=90, pen=pg.mkPen(tone.second, style=Qt.PenStyle.DashLine))
        )
        ends = [0.0]
        for place, pair in enumerate(shown):
            q = pair.difference
            if q is None or q.value is None:
                continue
            colour = tone.verdigris if pair.differ else tone.slate
            low = q.value if q.low is None else q.low
            high = q.value if q.high is None else q.high
            ends += [low, high]
            self.addItem(
                pg.PlotCurveItem([low, high], [-place, -place], pen=pg.mkPen(colour, width=2))
            )
            # Told apart: filled. The shape says it where the colour does not.
            self.addItem(
                pg.ScatterPlotItem(
                    [q.value], [-place], symbol="s" if pair.differ else "o", size=10,
                    pen=pg.mkPen(colour, width=1.6),
                    brush=pg.mkBrush(colour if pair.differ else tone.ground),
                )
            )  # fmt: skip
        width = max(max(ends) - min(ends), 1e-9)
        self.setXRange(min(ends) - 0.04 * width, max(ends) + 0.04 * width, padding=0)
        self.setYRange(-len(shown) + 0.4, 0.6, padding=0)
