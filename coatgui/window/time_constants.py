"""Time constants of a panel against its exposure time, by the relaxation outline of each reading.

Exploratory: no result of the program rests on it. The outlines are computed in the background and
kept per spectrum, for each takes a noticeable fraction of a second.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise

import numpy as np
import pyqtgraph as pg
from PySide6.QtCore import QObject, QPointF, QTimer, Signal
from PySide6.QtGui import QPainterPath, QPolygonF
from PySide6.QtWidgets import QGraphicsPathItem

from coatgui.fitting.relaxation import RelaxationOutline, relaxation_outline
from coatgui.jobs import Job, run_in_background
from coatgui.progress import Progress
from coatgui.records import BoolArray, Spectrum
from coatgui.window.axis import Plot
from coatgui.window.palette import Colours

_POLL_MS = 150
_MOST_KEPT = 2000
# Columns may be so wide, as a share of the way to the nearest inspection.
_COLUMN = 0.8
_WIDEST = 0.1  # of the whole width
_FAINT = 0.004  # of the largest: less than this is not drawn


@dataclass(frozen=True, eq=False)
class Wanted:
    """One reading to be outlined; `used` (N,) says which points count."""

    reading_id: str
    exposure_h: float
    spectrum: Spectrum
    used: BoolArray

    @property
    def key(self) -> tuple[str, bytes]:
        return self.spectrum.content_key(), np.packbits(self.used).tobytes()


Kept = dict[tuple[str, bytes], RelaxationOutline | None]


def _outline(items: Sequence[Wanted], kept: Kept, progress: Progress) -> None:
    for done, item in enumerate(items):
        progress.at("Spreading time constants", done, len(items))
        kept[item.key] = relaxation_outline(
            item.spectrum.frequency_hz, item.spectrum.impedance_ohm, item.used
        )


class Outlines(QObject):
    """Computes outlines one after another; `came` is sent whenever more of them are there."""

    came = Signal()

    def __init__(self, parent: QObject) -> None:
        super().__init__(parent)
        self._kept: Kept = {}
        self._job: Job | None = None
        self._wanted: tuple[tuple[str, bytes], ...] = ()
        self._count = 0
        self.trouble = ""
        self._timer = QTimer(self)
        self._timer.setInterval(_POLL_MS)
        self._timer.timeout.connect(self._poll)

    @property
    def busy(self) -> bool:
        return self._job is not None

    def want(self, items: Sequence[Wanted]) -> None:
        """Have these ready, as soon as may be; what was wanted before is given up."""
        missing = [item for item in items if item.key not in self._kept]
        keys = tuple(item.key for item in missing)
        if self._job is not None and set(keys) <= set(self._wanted):
            return
        self.stop()
        if not missing:
            return
        if len(self._kept) > _MOST_KEPT:
            self._kept.clear()
            missing = list(items)
        self._wanted, self.trouble, self._count = keys, "", len(self._kept)
        self._job = run_in_background(_outline, missing, self._kept)
        self._timer.start()

    def of(self, item: Wanted) -> RelaxationOutline | None:
        return self._kept.get(item.key)

    def has(self, item: Wanted) -> bool:
        return item.key in self._kept

    def stop(self) -> None:
        """Give up the work under way; what is there already stays."""
        self._timer.stop()
        if self._job is not None:
            self._job.cancel()
            self._job = None

    def _poll(self) -> None:
        job = self._job
        if job is not None and job.done:
            self._job = None
            self._timer.stop()
            if job.error is not None and not job.cancelled:
                self.trouble = f"The time constants could not be computed: {job.error}"
            self.came.emit()
        elif len(self._kept) != self._count:
            self._count = len(self._kept)
            self.came.emit()


class TimeConstantsPlot(Plot):
    """A column for each reading, as wide as resistance belongs to a time constant, with its 95 %
    band; circles mark the humps, with the share of the resistance as their size."""

    def __init__(self) -> None:
        super().__init__(
            "Time constants over exposure time, exploratory",
            ("", None),
            ("time constant", "s"),
        )

    def show_outlines(
        self,
        columns: Sequence[tuple[float, RelaxationOutline]],
        picked: float | None,
        tone: Colours,
    ) -> None:
        """`columns` are places on the axis of exposure time, with what stands there; `picked` is
        the place of the reading in hand."""
        self.clear()
        self.paint_in(tone.ground, tone.second, tone.line)
        places = sorted(x for x, _ in columns)
        gaps = [b - a for a, b in pairwise(places)]
        widest = _WIDEST * (places[-1] - places[0]) if gaps else 0.2
        for x, outline in columns:
            near = [
                gap
                for a, gap in zip(places[:-1], gaps, strict=True)
                if x == a or abs(x - a - gap) < 1e-9 * abs(gap)
            ]
            half = 0.5 * min(_COLUMN * min(near, default=widest), widest)
            self._column(x, half, outline, x == picked, tone)

    def _column(
        self, x: float, half: float, outline: RelaxationOutline, picked: bool, tone: Colours
    ) -> None:
        # The upper end of the band fills the column.
        largest = float(outline.high_ohm.max())
        if largest <= 0:
            return
        high = outline.high_ohm / largest
        shown = np.flatnonzero(high > _FAINT)
        part = slice(max(int(shown[0]) - 1, 0), min(int(shown[-1]) + 2, high.size))
        height = np.log10(outline.time_constant_s[part])
        colour = pg.mkColor(tone.verdigris if picked else tone.slate)
        band = _outlined(x, half * high[part], height, half * outline.low_ohm[part] / largest)
        itself = _outlined(x, half * outline.density_ohm[part] / largest, height)
        for path, is_band in ((band, True), (itself, False)):
            shape = QGraphicsPathItem(path)
            shape.setPen(pg.mkPen(None) if is_band else pg.mkPen(colour, width=1))
            fill = pg.mkColor(colour)
            fill.setAlpha(70 if is_band else 40)
            shape.setBrush(pg.mkBrush(fill))
            self.addItem(shape)
        peaks = outline.peaks
        if peaks:
            self.addItem(
                pg.ScatterPlotItem(
                    [x] * len(peaks),
                    [float(np.log10(p.time_constant_s)) for p in peaks],
                    size=[5.0 + 9.0 * float(np.sqrt(p.share)) for p in peaks],
                    pen=pg.mkPen(tone.verdigris if picked else tone.ink, width=1.4),
                    brush=pg.mkBrush(tone.ground),
                )
            )


def _outlined(
    x: float, reach: np.ndarray, height: np.ndarray, inner: np.ndarray | None = None
) -> QPainterPath:
    """A column about `x` that reaches so far to both sides at each height; without what is nearer
    than `inner`."""
    path = QPainterPath()  # odd and even: what is covered twice is left free
    for each in (reach, inner):
        if each is None:
            continue
        left = [QPointF(x - r, y) for r, y in zip(each, height, strict=True)]
        right = [QPointF(x + r, y) for r, y in zip(each[::-1], height[::-1], strict=True)]
        path.addPolygon(QPolygonF([*left, *right]))
        path.closeSubpath()
    return path
