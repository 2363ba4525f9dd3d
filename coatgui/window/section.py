"""The coating as it lies on the metal: solution, film, pores, interface, metal, from the outside
inwards, each with the values that were fitted there and their limits.

What is drawn says no more than the numbers beside it. A pore's width follows log10 of 1/R_po; where
the pore resistance is only known to be large the pore is dashed. Water tints the film by its
uptake. Rust stands under a pore where the fitted circuit has a reaction there.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass

from PySide6.QtCore import QPointF, QRectF, QSize, Qt, Signal
from PySide6.QtGui import (
    QBrush,
    QColor,
    QFont,
    QFontMetricsF,
    QMouseEvent,
    QPainter,
    QPaintEvent,
    QPen,
)
from PySide6.QtWidgets import QSizePolicy, QWidget

from coatgui.circuits import CoatingModel, catalogue
from coatgui.records import Bound, Panel, Quantity, ReadingAssessment
from coatgui.window.numbers import said
from coatgui.window.palette import Colours

# Own choice: the drawing tells pore resistances apart between these, log10 of Ω cm².
_WIDEST_PORE, _NARROWEST_PORE = 4.0, 11.0
# Own choice: at this uptake, in vol-%, the film has the solution's full tint.
_FULL_TINT = 12.0

_ROLES = {
    "film": ("film", "Film"),
    "film_1": ("film", "Outer film"),
    "film_2": ("film", "Inner film"),
    "porous_layer": ("film", "Porous layer"),
    "interface": ("interface", "Interface"),
}


@dataclass(frozen=True)
class Band:
    """One layer of the section: `kind` is solution, film, interface or metal; `layer` is its place
    in the model, as in `Parameter`; −1 for the metal."""

    kind: str
    title: str
    lines: tuple[str, ...] = ()
    layer: int = 0


@dataclass(frozen=True)
class Section:
    """A section ready to be drawn. `pore` is from 0 (narrow) to 1 (wide), None without a pore."""

    bands: tuple[Band, ...]
    pore: float | None = None
    pore_is_bound: bool = False
    water: float = 0.0
    reacts: bool = False
    picked: int = 0

    def in_words(self) -> str:
        return "; ".join(
            f"{band.title}: {', '.join(band.lines)}" if band.lines else band.title
            for band in self.bands
        )


def section_of(
    known: ReadingAssessment | None,
    panel: Panel | None,
    models: Mapping[str, CoatingModel] | None = None,
) -> Section | None:
    """The section of a reading, or None where it was not fitted. `models` are those of the campaign
    by id, None for the catalogue's alone; one of them that was just removed is not drawn."""
    if known is None or known.fit is None:
        return None
    by_symbol = {p.symbol: p.quantity for p in known.parameters}
    model = (catalogue() if models is None else models).get(known.fit.model)
    if model is None:
        return None
    bands = [Band("solution", "Solution", _lines(("R_s", by_symbol.get("R_s"))))]
    films = [(i, layer) for i, layer in enumerate(model.layers, 1) if layer.role != "interface"]
    for place, layer in films:
        if len(films) > 1:
            own = [
                (p.symbol, p.quantity)
                for p in known.parameters
                if p.layer == place and p.symbol[0] in "CQR"
            ]
            bands.append(Band("film", _ROLES[layer.role][1], _lines(*own)))
            continue
        thickness = f", {panel.thickness_um:g} µm" if panel and panel.thickness_um else ""
        water = known.water_uptake.quantity if known.water_uptake else None
        bands.append(
            Band(
                "film",
                f"Film{thickness}",
                _lines(
                    ("C", known.coating_capacitance),
                    ("water", water),
                    ("R_po", known.pore_resistance or by_symbol.get("R_po")),
                ),
            )
        )
    if any(layer.role == "interface" for layer in model.layers):
        wanted = [
            (symbol, by_symbol[symbol])
            for symbol in ("C_dl", "R_ct", "σ", "R_D")
            if symbol in by_symbol
        ]
        bands.append(Band("interface", "Interface", _lines(*wanted)))
    substrate = panel.substrate if panel and panel.substrate else "metal"
    bands.append(Band("metal", substrate[:1].upper() + substrate[1:]))
    pore = (known.pore_resistance or by_symbol.get("R_po")) if films else None
    width = None
    if pore is not None and pore.value and pore.value > 0:
        share = (_NARROWEST_PORE - math.log10(pore.value)) / (_NARROWEST_PORE - _WIDEST_PORE)
        width = min(max(share, 0.0), 1.0)
    water_value = known.water_uptake.quantity.value if known.water_uptake else None
    reaction = by_symbol.get("R_ct")
    return Section(
        tuple(bands),
        width,
        pore is not None and pore.bound is Bound.AT_LEAST,
        min(max((water_value or 0.0) / _FULL_TINT, 0.0), 1.0),
        reaction is not None and reaction.bound in (Bound.TWO_SIDED, Bound.AT_MOST),
    )


def section_of_model(model: CoatingModel, picked: int) -> Section:
    """The section of a model alone: what each layer is called and by which parameters it stands.
    `picked` is the layer in hand."""
    free = set(model.symbols)
    names: dict[int, list[str]] = {}
    for spec in model.all_parameters:
        held = "" if spec.symbol in free else " held"
        names.setdefault(spec.layer, []).append(f"{spec.symbol}{held}")
    bands = [Band("solution", "Solution and leads", (", ".join(names.get(0, ())),))]
    for place, layer in enumerate(model.layers, start=1):
        kind, title = _ROLES[layer.role]
        bands.append(Band(kind, title, (", ".join(names.get(place, ())),), place))
    bands.append(Band("metal", "Metal", (), -1))
    pore = any(layer.ionic == "resistor" and layer.role != "interface" for layer in model.layers)
    reacts = any(layer.ionic == "resistor" and layer.role == "interface" for layer in model.layers)
    # A model has no number for the pore's width: the middle of the drawing's range.
    return Section(tuple(bands), 0.4 if pore else None, reacts=reacts, picked=picked)


def _lines(*named: tuple[str, Quantity | None]) -> tuple[str, ...]:
    return tuple(f"{name} {said(quantity)}" for name, quantity in named if quantity is not None)


_WEIGHTS = {"solution": 1.0, "film": 2.0, "interface": 1.3, "metal": 0.9}


class SectionView(QWidget):
    """Draws a `Section`; the drawing left, the words beside the layers they belong to. `clicked`
    carries the layer under the mouse, 0 for the solution."""

    clicked = Signal(int)

    def __init__(self, tone: Colours) -> None:
        super().__init__()
        self.tone = tone
        self.section: Section | None = None
        self.setAccessibleName("Section through the coating")
        self.setSizePolicy(QSizePolicy.Policy.Expanding, QSizePolicy.Policy.Preferred)
        self.setMinimumHeight(190)
        self.setMaximumHeight(320)

    def sizeHint(self) -> QSize:
        return QSize(340, 230)

    def show_section(self, section: Section | None, tone: Colours) -> None:
        self.section, self.tone = section, tone
        self.setAccessibleDescription(section.in_words() if section else "")
        self.update()

    def areas(self) -> list[tuple[Band, QRectF]]:
        """Where each layer stands, over the whole width."""
        if self.section is None:
            return []
        line = QFontMetricsF(self._font(11)).height() + 1
        needed = [max(22.0, 20.0 + line * len(b.lines)) for b in self.section.bands]
        spare = max(self.height() - sum(needed) - 2, 0.0)
        weights = [_WEIGHTS[b.kind] for b in self.section.bands]
        areas, top = [], 1.0
        for band, least, weight in zip(self.section.bands, needed, weights, strict=True):
            height = least + spare * weight / sum(weights)
            areas.append((band, QRectF(0.0, top, float(self.width()), height)))
            top += height
        return areas

    def _font(self, pixels: int, *, strong: bool = False) -> QFont:
        font = QFont(self.font())
        font.setPixelSize(pixels)
        font.setBold(strong)
        return font

    def paintEvent(self, event: QPaintEvent) -> None:
        painter = QPainter(self)
        painter.setRenderHint(QPainter.RenderHint.Antialiasing)
        if self.section is not None:
            for band, area in self.areas():
                drawing = QRectF(area.left(), area.top(), self.width() * 0.30, area.height())
                self._paint_band(painter, band, drawing)
                self._paint_words(painter, band, area.adjusted(drawing.width() + 12, 0, 0, 0))
            self._paint_pore(painter)
            for band, area in self.areas():
                if self.section.picked > 0 and band.layer == self.section.picked:
                    painter.setPen(QPen(QColor(self.tone.verdigris), 2))
                    painter.setBrush(Qt.BrushStyle.NoBrush)
                    painter.drawRect(area.adjusted(1, 1, -2, -1))
        painter.end()

    def mousePressEvent(self, event: QMouseEvent) -> None:
        for band, area in self.areas():
            if area.contains(event.position()) and band.layer >= 0:
                self.clicked.emit(band.layer)
                return

    def _mixed(self, share: float) -> QColor:
        """The film's paper, tinted with the solution by a share from 0 to 1."""
        paper, water = QColor(self.tone.panel), self._water()
        return QColor(
            *(
                round(a + (b - a) * share)
                for a, b in zip(paper.getRgb()[:3], water.getRgb()[:3], strict=True)  # type: ignore[index]
            )
        )

    def _water(self) -> QColor:
        slate, ground = QColor(self.tone.slate), QColor(self.tone.ground)
        mix = [
            round(0.45 * a + 0.55 * b)
            for a, b in zip(slate.getRgb()[:3], ground.getRgb()[:3], strict=True)  # type: ignore[index]
        ]
        return QColor(*mix)

    def _paint_band(self, painter: QPainter, band: Band, area: QRectF) -> None:
        assert self.section is not None
        tone = self.tone
        if band.kind == "solution":
            painter.fillRect(area, self._water())
        elif band.kind == "film":
            painter.fillRect(area, self._mixed(self.section.water))
        elif band.kind == "interface":
            painter.fillRect(area, self._mixed(self.section.water * 0.5))
            painter.setPen(QPen(QColor(tone.ink), 1.4))
            painter.drawLine(area.bottomLeft(), area.bottomRight())
        else:
            painter.fillRect(area, QColor(tone.ground))
            painter.fillRect(area, QBrush(QColor(tone.ink), Qt.BrushStyle.BDiagPattern))
        painter.setPen(QPen(QColor(tone.second), 1))
        painter.setBrush(Qt.BrushStyle.NoBrush)
        painter.drawRect(area)

    def _paint_words(self, painter: QPainter, band: Band, area: QRectF) -> None:
        top = area.top() + 3
        painter.setPen(QColor(self.tone.ink))
        painter.setFont(self._font(12, strong=True))
        heading = QFontMetricsF(painter.font())
        title = heading.elidedText(band.title, Qt.TextElideMode.ElideRight, area.width())
        painter.drawText(QPointF(area.left(), top + heading.ascent()), title)
        top += heading.height()
        painter.setFont(self._font(11))
        small = QFontMetricsF(painter.font())
        for line in band.lines:
            text = small.elidedText(line, Qt.TextElideMode.ElideRight, area.width())
            painter.drawText(QPointF(area.left(), top + small.ascent()), text)
            top += small.height() + 1

    def _paint_pore(self, painter: QPainter) -> None:
        section = self.section
        films = [area for band, area in self.areas() if band.kind == "film"]
        if section is None or section.pore is None or not films:
            return
        full = self.width() * 0.30
        width = 1.5 + section.pore * 0.32 * full
        pore = QRectF(
            full / 2 - width / 2, films[0].top(), width, films[-1].bottom() - films[0].top()
        )
        pen = QPen(QColor(self.tone.second), 1)
        if section.pore_is_bound:
            pen.setStyle(Qt.PenStyle.DashLine)
            painter.setBrush(Qt.BrushStyle.NoBrush)
        else:
            painter.setBrush(self._water())
        painter.setPen(pen)
        painter.drawRect(pore)
        below = next((a for b, a in self.areas() if b.kind == "interface"), None)
        if below is None or section.pore_is_bound:
            return
        foot = QRectF(pore.left(), below.top(), pore.width(), below.height())
        painter.setPen(Qt.PenStyle.NoPen)
        painter.setBrush(self._water())
        painter.drawRect(foot)
        if section.reacts:
            painter.setBrush(QColor(self.tone.rust))
            depth = min(10.0, below.height() * 0.4)
            spread = pore.width() / 2 + 6
            middle = QPointF(full / 2, below.bottom())
            painter.drawEllipse(middle, spread, depth)
