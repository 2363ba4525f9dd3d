"""Map: panels × exposure time, one shaded, numbered cell for each reading."""

from __future__ import annotations

import math
from bisect import bisect_right
from collections.abc import Callable
from operator import attrgetter

import numpy as np
from PySide6.QtCore import QPoint, QRect, QSize, Qt, Signal
from PySide6.QtGui import (
    QColor,
    QFont,
    QKeyEvent,
    QMouseEvent,
    QPainter,
    QPaintEvent,
    QPen,
    QWheelEvent,
)
from PySide6.QtWidgets import QComboBox, QHBoxLayout, QScrollArea, QWidget

from coatgui.records import Bound, Campaign, Quantity, Reading, ReadingAssessment, Severity
from coatgui.window.desk import Desk
from coatgui.window.numbers import said
from coatgui.window.palette import Colours, ramp
from coatgui.window.places.place import Place, plain_label, plain_tip
from coatgui.window.tree_model import same_outline, state_of

_LABEL_WIDTH, _ROW, _HEAD, _BAND, _CELL = 84, 30, 26, 24, 52
_SMALLEST, _LARGEST = 0.3, 2.0
_LEGIBLE = 0.6  # smaller cells show their shade and mark only; the number is in the tip
QUANTITIES = {
    "|Z|·A at 0.1 Hz": "modulus_0.1",
    "|Z|·A at 0.01 Hz": "modulus_0.01",
    "Pore resistance": "pore_resistance",
    "Film capacitance": "coating_capacitance",
    "Apparent water uptake": "water_uptake",
}
_RISING_IS_WORSE = ("coating_capacitance", "water_uptake")


def amount_of(code: str) -> Callable[[ReadingAssessment], Quantity | None]:
    """What gives the quantity that a code names, of one reading."""
    if code.startswith("modulus_"):
        frequency_hz = float(code.removeprefix("modulus_"))

        def at(reading: ReadingAssessment) -> Quantity | None:
            for modulus in reading.modulus:
                if modulus.frequency_hz == frequency_hz:
                    return modulus.quantity
            return None

        return at
    if code == "water_uptake":
        return lambda reading: reading.water_uptake.quantity if reading.water_uptake else None
    return attrgetter(code)


def amount(reading: ReadingAssessment, code: str) -> Quantity | None:
    """The quantity a code names, of one reading."""
    return amount_of(code)(reading)


def short(quantity: Quantity | None, code: str) -> str:
    """The number in a cell: log10 of a resistance or modulus, pF/cm² or vol-% elsewhere."""
    if quantity is None or quantity.value is None:
        return "∅"
    sign = {Bound.AT_LEAST: "≥", Bound.AT_MOST: "≤"}.get(quantity.bound, "")
    if code == "water_uptake":
        return f"{sign}{quantity.value:.1f}"
    if code == "coating_capacitance":
        return f"{sign}{quantity.value * 1e12:.3g}"
    return f"{sign}{math.log10(quantity.value):.1f}" if quantity.value > 0 else "∅"


def story(cell: ReadingAssessment | str, code: str) -> str:
    """What a reading says in three lines: the quantity, the circuit and the water, the worst that
    was found."""
    if isinstance(cell, str):
        return "not judged yet"
    name = next(name for name, each in QUANTITIES.items() if each == code)
    first = f"{cell.panel}, {cell.exposure_h:g} h: {name} {said(amount(cell, code))}"
    second = cell.fit.model_name if cell.fit else "not fitted"
    if cell.water_uptake is not None and code != "water_uptake":
        second += f"; water {said(cell.water_uptake.quantity)}"
    order = (Severity.REJECT, Severity.DOUBT)
    found = [f.text for severity in order for f in cell.findings if f.severity is severity]
    more = f" (and {len(found) - 1} more)" if len(found) > 1 else ""
    third = f"{state_of(cell)[0]} {found[0]}{more}" if found else "Nothing speaks against it."
    return "\n".join((first, second, third))


class Cells(QWidget):
    """The painted map. `picked` carries a reading's id; `opened` asks for the reading's place,
    `zoomed` for larger or smaller cells, by a factor and about a point."""

    picked = Signal(str)
    opened = Signal()
    zoomed = Signal(float, QPoint)

    def __init__(self, tone: Colours) -> None:
        super().__init__()
        self.tone = tone
        self.setFocusPolicy(Qt.FocusPolicy.StrongFocus)
        self.setAccessibleName("Exposure map: panels by exposure time")
        self.setAccessibleDescription(
            "Arrow keys go from cell to cell, return opens the reading, + and - change the size"
        )
        self.setMouseTracking(True)
        self.rows: list[tuple[str, str]] = []  # (kind, text): formulation bands and panels
        self.times: list[float] = []
        self.cells: dict[tuple[int, int], ReadingAssessment | str] = {}
        self.code = "modulus_0.1"
        self.selection = ""
        self.shades: dict[tuple[int, int], float] = {}
        self.places: dict[str, tuple[int, int]] = {}  # row and column by the reading's id
        self._laid_out: Campaign | None = None
        self.scale = 1.0
        self._row, self._band = _ROW, _BAND

    def show(self, campaign: Campaign, known: dict[str, ReadingAssessment], code: str) -> None:  # type: ignore[override]
        """Lay out a campaign; readings not assessed yet stand as empty cells."""
        self.code = code
        if not same_outline(self._laid_out, campaign):
            self._lay_out(campaign)
        self._laid_out = campaign
        self.cells = {place: known.get(key, key) for key, place in self.places.items()}
        self._shade()
        self.resize_to(self.scale)

    def _lay_out(self, campaign: Campaign) -> None:
        """A row for each panel, a column for each exposure time."""
        self.times = sorted({r.exposure_h for r in campaign.readings})
        column = {hours: i for i, hours in enumerate(self.times)}
        self.rows, self.places = [], {}
        readings: dict[str, list[Reading]] = {}
        for reading in campaign.readings:
            readings.setdefault(reading.panel_id, []).append(reading)
        for formulation in campaign.formulations:
            panels = [p for p in campaign.panels if p.formulation_id == formulation.formulation_id]
            if not panels:
                continue
            self.rows.append(("formulation", formulation.name))
            for panel in panels:
                self.rows.append(("panel", panel.name))
                for reading in readings.get(panel.panel_id, ()):
                    place = (len(self.rows) - 1, column[reading.exposure_h])
                    self.places[reading.reading_id] = place

    def resize_to(self, scale: float) -> None:
        """Make the cells larger or smaller than they are at first (1)."""
        self.scale = min(max(scale, _SMALLEST), _LARGEST)
        self._row, self._band = round(_ROW * self.scale), max(round(_BAND * self.scale), 14)
        tops = self._tops()
        across = round(_CELL * self.scale) * max(len(self.times), 1)
        self.setMinimumSize(QSize(_LABEL_WIDTH + across, tops[-1] + 8))
        self.update()

    def _shade(self) -> None:
        places, amounts = [], []
        wanted, plain = amount_of(self.code), self.code == "water_uptake"
        for place, cell in self.cells.items():
            if isinstance(cell, ReadingAssessment) and cell.counts:
                quantity = wanted(cell)
                if quantity is not None and quantity.value is not None:
                    places.append(place)
                    amounts.append(quantity.value)
        self.shades = {}
        values = np.array(amounts)
        shown = np.ones(values.size, bool) if plain else values > 0
        if not shown.any():
            return
        values = values if plain else np.log10(np.where(shown, values, 1.0))
        low, high = values[shown].min(), values[shown].max()
        shares = (values - low) / max(high - low, 1e-9)
        if self.code in _RISING_IS_WORSE:
            shares = 1.0 - shares
        told = zip(places, shares.tolist(), shown.tolist(), strict=True)
        self.shades = {place: share for place, share, is_shown in told if is_shown}

    def _tops(self) -> list[int]:
        """The top of every row, and the bottom of the last."""
        tops, top = [], _HEAD
        for kind, _ in self.rows:
            tops.append(top)
            top += self._band if kind == "formulation" else self._row
        return [*tops, top]

    def _width(self) -> float:
        return (self.width() - _LABEL_WIDTH - 4) / max(len(self.times), 1)

    def _rect(self, row: int, column: int, tops: list[int]) -> QRect:
        width = self._width()
        left = _LABEL_WIDTH + round(column * width)
        right = _LABEL_WIDTH + round((column + 1) * width)
        return QRect(left + 1, tops[row] + 1, right - left - 2, self._row - 2)

    def _id(self, cell: ReadingAssessment | str) -> str:
        return cell.reading_id if isinstance(cell, ReadingAssessment) else cell

    def paintEvent(self, event: QPaintEvent) -> None:
        painter = QPainter(self)
        tone, tops = self.tone, self._tops()
        painter.fillRect(self.rect(), QColor(tone.ground))
        small = QFont(self.font())
        small.setPixelSize(11)
        painter.setFont(small)
        painter.setPen(QColor(tone.second))
        width = self._width()
        seen = event.rect()
        first = bisect_right(tops, seen.top()) - 1
        rows = range(max(first, 0), min(bisect_right(tops, seen.bottom()), len(self.rows)))
        before = max(int((seen.left() - _LABEL_WIDTH) / width), 0)
        columns = range(
            before, min(int((seen.right() - _LABEL_WIDTH) / width) + 1, len(self.times))
        )
        for i in columns:
            hours = self.times[i]
            place = QRect(_LABEL_WIDTH + round(i * width), 0, round(width), _HEAD)
            painter.drawText(place, Qt.AlignmentFlag.AlignCenter, f"{hours:g} h")
        for row in rows:
            (kind, text), top = self.rows[row], tops[row]
            if kind == "formulation":
                painter.setPen(QColor(tone.ink))
                painter.drawText(
                    QRect(0, top, self.width(), self._band), Qt.AlignmentFlag.AlignVCenter, text
                )
            else:
                painter.setPen(QColor(tone.second))
                name = painter.fontMetrics().elidedText(
                    text, Qt.TextElideMode.ElideRight, _LABEL_WIDTH - 18
                )
                painter.drawText(
                    QRect(12, top, _LABEL_WIDTH - 16, self._row),
                    Qt.AlignmentFlag.AlignVCenter,
                    name,
                )
        cell_font = QFont(self.font())
        cell_font.setPixelSize(max(min(round(12 * self.scale), 16), 7))
        painter.setFont(cell_font)
        for row in rows:
            for column in columns:
                cell = self.cells.get((row, column))
                if cell is not None:
                    rect = self._rect(row, column, tops)
                    self._paint_cell(painter, (row, column), cell, rect)
        painter.end()

    def _paint_cell(
        self, painter: QPainter, place: tuple[int, int], cell: ReadingAssessment | str, rect: QRect
    ) -> None:
        tone = self.tone
        text, mark = "…", ""
        ground, ink = QColor(tone.panel), QColor(tone.second)
        if isinstance(cell, ReadingAssessment):
            mark = state_of(cell)[0]
            text = short(amount(cell, self.code), self.code) if cell.counts else ""
            if place in self.shades:
                ground, ink = ramp(self.shades[place], tone.dark)
        painter.fillRect(rect, ground)
        painter.setPen(ink)
        if self.scale >= _LEGIBLE:
            painter.drawText(rect, Qt.AlignmentFlag.AlignCenter, text)
        if mark in ("▲", "■"):
            painter.setPen(QColor(tone.rust) if mark == "■" else ink)
            corner = rect.adjusted(0, 0, -9, 0)
            where = Qt.AlignmentFlag.AlignRight | Qt.AlignmentFlag.AlignVCenter
            if mark == "■":
                where = Qt.AlignmentFlag.AlignCenter
            painter.drawText(corner, where, mark)
        if self._id(cell) == self.selection:
            # Two lines, so that the frame shows on pale and on deep cells.
            painter.setPen(QPen(QColor(tone.ground), 2))
            painter.drawRect(rect.adjusted(4, 4, -5, -5))
            painter.setPen(QPen(QColor(tone.verdigris), 3))
            painter.drawRect(rect.adjusted(1, 1, -2, -2))
            if self.hasFocus():
                painter.setPen(QPen(QColor(tone.ink), 1, Qt.PenStyle.DotLine))
                painter.drawRect(rect.adjusted(-1, -1, 0, 0))

    def _at(self, point: QPoint) -> tuple[int, int] | None:
        row = bisect_right(self._tops(), point.y()) - 1
        column = int((point.x() - _LABEL_WIDTH) // self._width())
        return (row, column) if (row, column) in self.cells else None

    def wheelEvent(self, event: QWheelEvent) -> None:
        if event.modifiers() & Qt.KeyboardModifier.ControlModifier:
            by = 1.15 if event.angleDelta().y() > 0 else 1 / 1.15
            self.zoomed.emit(by, event.position().toPoint())
            event.accept()
        else:
            super().wheelEvent(event)

    def mousePressEvent(self, event: QMouseEvent) -> None:
        place = self._at(event.position().toPoint())
        if place is not None:
            self.picked.emit(self._id(self.cells[place]))

    def mouseMoveEvent(self, event: QMouseEvent) -> None:
        place = self._at(event.position().toPoint())
        cell = self.cells.get(place) if place is not None else None
        self.setToolTip(plain_tip(story(cell, self.code)) if cell is not None else "")

    def mouseDoubleClickEvent(self, event: QMouseEvent) -> None:
        if self._at(event.position().toPoint()) is not None:
            self.opened.emit()

    def keyPressEvent(self, event: QKeyEvent) -> None:
        if event.key() in (Qt.Key.Key_Return, Qt.Key.Key_Enter):
            self.opened.emit()
            return
        if event.text() in ("+", "-"):
            self.zoomed.emit(1.15 if event.text() == "+" else 1 / 1.15, QPoint(_LABEL_WIDTH, _HEAD))
            return
        step = {
            Qt.Key.Key_Left: (0, -1),
            Qt.Key.Key_Right: (0, 1),
            Qt.Key.Key_Up: (-1, 0),
            Qt.Key.Key_Down: (1, 0),
        }.get(Qt.Key(event.key()))
        now = self.places.get(self.selection)
        if step is None or now is None:
            super().keyPressEvent(event)
            return
        row, column = now
        for _ in range(len(self.rows) + len(self.times)):
            row, column = row + step[0], column + step[1]
            if (row, column) in self.cells:
                self.picked.emit(self._id(self.cells[row, column]))
                return


class MapPlace(Place):
    noun, question = "Map", "Where does the campaign stand?"
    needs = "readings"
    promise = "Here a map will show every panel at every exposure time, a cell for each reading."
    note = "modulus"
    leaves_facts = True

    def __init__(self, desk: Desk, tone: Colours) -> None:
        super().__init__(desk, tone)
        self.headline = plain_label("headline")
        self.ranking = plain_label()
        self.column.addWidget(self.headline)
        self.column.addWidget(self.ranking)
        bar = QHBoxLayout()
        self.chooser = QComboBox()
        self.chooser.setAccessibleName("Quantity shown in the map")
        self.chooser.setAccessibleDescription("What the cells are shaded by and numbered with")
        self.chooser.addItems(list(QUANTITIES))
        self.chooser.currentIndexChanged.connect(self.show_campaign)
        self.legend = plain_label("small")
        bar.addWidget(self.chooser)
        bar.addWidget(self.legend, 1)
        self.column.addLayout(bar)
        self.cells = Cells(tone)
        self.cells.picked.connect(desk.select)
        self.area = QScrollArea()
        self.area.setWidgetResizable(True)
        self.area.setFrameShape(QScrollArea.Shape.NoFrame)
        self.area.setWidget(self.cells)
        self.column.addWidget(self.area, 1)
        self.cells.zoomed.connect(self.zoom)

    def zoom(self, by: float, about: QPoint) -> None:
        """Make the map larger or smaller about a place in it, which stays where it is seen."""
        bars = self.area.horizontalScrollBar(), self.area.verticalScrollBar()
        seen = about.x() - bars[0].value(), about.y() - bars[1].value()
        before = self.cells.scale
        self.cells.resize_to(before * by)
        grown = self.cells.scale / before
        self.cells.resize(self.cells.minimumSize().expandedTo(self.area.viewport().size()))
        bars[0].setValue(round((about.x() - _LABEL_WIDTH) * grown + _LABEL_WIDTH - seen[0]))
        bars[1].setValue(round((about.y() - _HEAD) * grown + _HEAD - seen[1]))

    def show_campaign(self) -> None:
        campaign, assessment = self.desk.campaign, self.desk.assessment
        code = QUANTITIES[self.chooser.currentText()]
        self.cells.tone = self.tone
        if campaign is None:
            return
        known = {r.reading_id: r for r in assessment.readings} if assessment else {}
        self.headline.setText(assessment.headline if assessment else self.desk.unjudged_words())
        self.ranking.setText(assessment.ranking_text if assessment else "")
        unit = {
            "water_uptake": "Numbers in vol-%",
            "coating_capacitance": "Numbers in pF/cm²",
        }.get(code, "Numbers are log₁₀ of Ω cm²")
        self.legend.setText(
            f"{unit}; deeper is the better barrier.  ▲ doubt  ■ rejected  ≥ at least"
        )
        self.cells.show(campaign, known, code)
        self.show_selection()

    def figure(self) -> list[QWidget]:
        return [self.cells] if self.desk.assessment else []

    def caption(self) -> str:
        title = self.desk.assessment.title if self.desk.assessment else ""
        return f"{title}: {self.chooser.currentText()}. {self.legend.text()}"

    def data_rows(self) -> list[list[object]]:
        """Panels by exposure time, as on the map, in the quantity's own unit."""
        cells, code = self.cells, self.cells.code
        rows: list[list[object]] = [["panel", *(f"{hours:g} h" for hours in cells.times)]]
        for number, (kind, name) in enumerate(cells.rows):
            if kind != "panel":
                continue
            row: list[object] = [name]
            for column in range(len(cells.times)):
                cell = cells.cells.get((number, column))
                counts = isinstance(cell, ReadingAssessment) and cell.counts
                quantity = amount(cell, code) if counts else None  # type: ignore[arg-type]
                row.append(None if quantity is None else quantity.value)
            rows.append(row)
        return rows

    def show_selection(self) -> None:
        self.cells.selection = self.desk.selection
        self.cells.update()
