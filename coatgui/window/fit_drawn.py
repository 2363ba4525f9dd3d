"""What is drawn beside the curve of a fit when it is asked for: its 95 % band and its parts."""

from __future__ import annotations

from collections.abc import Sequence
from itertools import pairwise
from typing import Any

import numpy as np
from PySide6.QtCore import QPointF, Qt
from PySide6.QtGui import QColor, QPainterPath, QPen, QPolygonF

from coatgui.assessment.leads import leads_of
from coatgui.circuits import CoatingModel
from coatgui.fitting.views import FitBand, Part, fit_band, fit_parts
from coatgui.quality import leads_admittance
from coatgui.records import Campaign, Fit, FloatArray
from coatgui.window.canvas import Canvas, Curve, Shade
from coatgui.window.key import Entry
from coatgui.window.palette import Colours, formulation_look

_POINTS = 200
_DASHES = (
    Qt.PenStyle.DashLine,
    Qt.PenStyle.DotLine,
    Qt.PenStyle.DashDotLine,
    Qt.PenStyle.DashDotDotLine,
)


def band_of(
    fit: Fit, model: CoatingModel, campaign: Campaign, frequency_hz: FloatArray
) -> FitBand | None:
    """The band of a fit as its curve is shown: with the leads put back where they were taken
    away. None where the fit has none, or belongs to a model that was changed since."""
    leads = leads_of(campaign)
    parallel = None
    if leads.taken_away and leads.measured is not None:
        parallel = leads_admittance(leads.measured, frequency_hz)
    try:
        return fit_band(fit, model, frequency_hz, parallel_s=parallel)
    except ValueError:
        return None


def parts_of(fit: Fit, model: CoatingModel, frequency_hz: FloatArray) -> tuple[Part, ...]:
    """The parts of a fit; none where it belongs to a model that was changed since."""
    try:
        return fit_parts(fit, model, frequency_hz)
    except ValueError:
        return ()


def between(frequency_hz: FloatArray) -> FloatArray:
    """Frequencies for a smooth curve within those that were measured."""
    ends = np.log10(frequency_hz.max()), np.log10(frequency_hz.min())
    return np.asarray(np.logspace(*ends, _POINTS))


def _log(values: Any) -> Any:
    return np.log10(np.maximum(np.abs(values), 1e-30))


class FitDrawn:
    """Items in the plots of modulus, phase and complex plane that keep and take other data."""

    def __init__(self, modulus: Canvas, phase: Canvas, plane: Canvas) -> None:
        self.plots = (modulus, phase, plane)
        self.shades = [Shade() for _ in self.plots]
        for plot, shade in zip(self.plots, self.shades, strict=True):
            plot.add(shade)
        self.curves: list[tuple[Curve, ...]] = []
        self.band: FitBand | None = None
        self.parts: tuple[Part, ...] = ()

    def show(
        self,
        band: FitBand | None,
        parts: Sequence[Part],
        frequency_hz: FloatArray,
        tone: Colours,
    ) -> None:
        """Draw a band and parts, at `frequency_hz`; nothing takes them away."""
        self.band, self.parts = band, tuple(parts)
        self._draw_band(band, tone)
        while len(self.curves) < len(parts):
            # Under the fit itself and the points.
            curves = tuple(Curve(behind=True) for _ in self.plots)
            for plot, curve in zip(self.plots, curves, strict=True):
                plot.add(curve)
            self.curves.append(curves)
        x = np.log10(frequency_hz)
        for number, curves in enumerate(self.curves):
            z = parts[number].impedance_ohm if number < len(parts) else None
            if z is None:
                for curve in curves:
                    curve.show([], [])
                continue
            pen = part_pen(number, tone)
            for curve, (across, up) in zip(
                curves,
                ((x, _log(z)), (x, np.degrees(np.angle(z))), (z.real, -z.imag)),
                strict=True,
            ):
                curve.show(across, up, pen)
        for plot in self.plots:
            plot.update()

    def _draw_band(self, band: FitBand | None, tone: Colours) -> None:
        colour = QColor(tone.verdigris)
        colour.setAlpha(60)
        for shade in self.shades:
            shade.colour, shade.path = colour, QPainterPath()
        if band is None:
            return
        x = np.log10(band.frequency_hz)
        self.shades[0].path = _ribbon(x, *_logs(band), band.holds)
        self.shades[1].path = _ribbon(x, band.phase_low_deg, band.phase_high_deg, band.holds)
        # In the complex plane the limits of both parts make a box at each frequency; neighbours are
        # joined.
        path = QPainterPath()
        path.setFillRule(Qt.FillRule.WindingFill)
        boxes = [_corners(band, place) if band.holds[place] else None for place in range(x.size)]
        for box, after in pairwise([*boxes, None]):
            if box is not None:
                path.addPolygon(QPolygonF(_hull(box if after is None else [*box, *after])))
                path.closeSubpath()
        self.shades[2].path = path

    def entries(self, tone: Colours) -> list[Entry]:
        """What stands in the key."""
        found = []
        if self.band is not None:
            found.append(Entry("band", tone.verdigris, "95 % band"))
        for number, part in enumerate(self.parts):
            if part.impedance_ohm is None:
                continue
            at = f" (at the bound of {', '.join(part.bounds)})" if part.bounds else ""
            pen = part_pen(number, tone)
            found.append(Entry("line", pen.color().name(), f"{part.name}{at}", pen.style()))
        return found

    def words(self) -> str:
        """What must be said beside the plots."""
        said = [self.band.text] if self.band is not None and self.band.text else []
        hidden = [part.name for part in self.parts if part.impedance_ohm is None]
        if hidden:
            said.append(f"Cannot be determined, so not drawn: {', '.join(hidden)}.")
        return " ".join(said)


def part_pen(number: int, tone: Colours) -> QPen:
    """Colour and dashes of a part: each has its own of both."""
    pen = QPen(QColor(formulation_look(number, tone.dark)[0]), 1.3)
    pen.setStyle(_DASHES[number % len(_DASHES)])
    return pen


def _logs(band: FitBand) -> tuple[FloatArray, FloatArray]:
    return _log(band.modulus_low_ohm), _log(band.modulus_high_ohm)


def _corners(band: FitBand, place: int) -> list[QPointF]:
    across = (float(band.real_low_ohm[place]), float(band.real_high_ohm[place]))
    up = (-float(band.imaginary_low_ohm[place]), -float(band.imaginary_high_ohm[place]))
    return [QPointF(x, y) for x in across for y in up]


def _hull(points: Sequence[QPointF]) -> list[QPointF]:
    """The corners of the convex hull, round about (Andrew's monotone chain)."""
    ordered = sorted(points, key=lambda p: (p.x(), p.y()))
    whole: list[QPointF] = []
    for way in (ordered, ordered[::-1]):
        chain: list[QPointF] = []
        for p in way:
            while len(chain) >= 2 and _turn(chain[-2], chain[-1], p) <= 0:
                chain.pop()
            chain.append(p)
        whole += chain[:-1]
    return [*whole, whole[0]] if whole else list(points)


def _turn(a: QPointF, b: QPointF, c: QPointF) -> float:
    return (b.x() - a.x()) * (c.y() - a.y()) - (b.y() - a.y()) * (c.x() - a.x())


def _ribbon(x: FloatArray, low: FloatArray, high: FloatArray, holds: Any) -> QPainterPath:
    """The area between two curves, in pieces where it holds."""
    path = QPainterPath()
    edges = np.flatnonzero(np.diff(np.concatenate([[False], holds, [False]]).astype(int)))
    for first, last in zip(edges[::2], edges[1::2], strict=True):
        piece = slice(int(first), int(last))
        there = [QPointF(a, b) for a, b in zip(x[piece], low[piece], strict=True)]
        back = [QPointF(a, b) for a, b in zip(x[piece][::-1], high[piece][::-1], strict=True)]
        path.addPolygon(QPolygonF([*there, *back]))
        path.closeSubpath()
    return path
