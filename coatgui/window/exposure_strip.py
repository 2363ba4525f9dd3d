"""The ruler of a panel's inspections: one mark for each reading, the picked one filled. Arrow keys,
clicks and dragging go along it."""

from __future__ import annotations

import math

from PySide6.QtCore import QPointF, QRectF, QSize, Qt, Signal
from PySide6.QtGui import QColor, QFont, QKeyEvent, QMouseEvent, QPainter, QPaintEvent, QPen
from PySide6.QtWidgets import QSizePolicy, QWidget

from coatgui.window.desk import Desk
from coatgui.window.palette import Colours
from coatgui.window.tree_model import state_of

_SIDE, _NAME = 28.0, 92.0
_ROOM = 56.0  # for the words of one time


class ExposureStrip(QWidget):
    """`picked` carries a reading's id."""

    picked = Signal(str)

    def __init__(self, desk: Desk, tone: Colours) -> None:
        super().__init__()
        self.desk, self.tone = desk, tone
        self.setFocusPolicy(Qt.FocusPolicy.StrongFocus)
        self.setSizePolicy(QSizePolicy.Policy.Expanding, QSizePolicy.Policy.Fixed)
        self.setAccessibleName("Exposure time of this panel's readings")
        self.stops: list[tuple[str, float, str]] = []  # reading's id, hours, shape
        self.panel = ""

    def sizeHint(self) -> QSize:
        return QSize(400, 44)

    def refresh(self) -> None:
        """Follow the desk's selection."""
        campaign, reading = self.desk.campaign, self.desk.reading()
        self.stops, self.panel = [], ""
        if campaign is not None and reading is not None:
            own = self.desk.inspections(reading.panel_id)
            for each in own:
                found = self.desk.judged(each.reading_id)
                self.stops.append((each.reading_id, each.exposure_h, state_of(found)[0]))
            self.panel = next(
                (p.name for p in campaign.panels if p.panel_id == reading.panel_id), ""
            )
            place = own.index(reading) + 1
            word = state_of(self.desk.judged(reading.reading_id))[1]
            self.setAccessibleDescription(
                f"{self.panel}, {reading.exposure_h:g} h {word}, {place} of {len(own)}"
            )
        self.update()

    def places(self) -> list[float]:
        """Across, for every inspection."""
        number = len(self.stops)
        width = self.width() - _NAME - 2 * _SIDE - 12
        return [_NAME + _SIDE + width * i / max(number - 1, 1) for i in range(number)]

    def paintEvent(self, event: QPaintEvent) -> None:
        painter = QPainter(self)
        painter.setRenderHint(QPainter.RenderHint.Antialiasing)
        tone, places = self.tone, self.places()
        font = QFont(self.font())
        font.setPixelSize(11)
        painter.setFont(font)
        if places:
            painter.setPen(QColor(tone.second))
            name = painter.fontMetrics().elidedText(
                self.panel, Qt.TextElideMode.ElideRight, int(_NAME)
            )
            painter.drawText(QRectF(12, 2, _NAME, 20), Qt.AlignmentFlag.AlignVCenter, name)
            painter.setPen(QPen(QColor(tone.line), 2))
            painter.drawLine(QPointF(places[0], 12), QPointF(places[-1], 12))
        written = self._written(places)
        for number, ((key, hours, shape), x) in enumerate(zip(self.stops, places, strict=True)):
            here = key == self.desk.selection
            ink = QColor(tone.verdigris if here else tone.slate)
            if shape in ("▲", "■") and not here:
                ink = QColor(tone.amber if shape == "▲" else tone.rust)
            painter.setPen(QPen(ink, 1.6))
            painter.setBrush(ink if here else QColor(tone.ground))
            middle, size = QPointF(x, 12), 6.0 if here else 4.5
            if shape == "▲":
                painter.drawPolygon(
                    [
                        middle + QPointF(0, -size - 1),
                        middle + QPointF(size + 1, size - 1),
                        middle + QPointF(-size - 1, size - 1),
                    ]
                )
            elif shape == "■":
                painter.drawRect(
                    QRectF(x - size + 0.5, 12 - size + 0.5, 2 * size - 1, 2 * size - 1)
                )
            else:
                painter.drawEllipse(middle, size, size)
            if number not in written:
                continue
            painter.setPen(QColor(tone.ink if here else tone.second))
            font.setBold(here)
            painter.setFont(font)
            painter.drawText(
                QRectF(x - 32, 22, 64, 18), Qt.AlignmentFlag.AlignCenter, f"{hours:g} h"
            )
        if self.hasFocus():
            painter.setPen(QPen(QColor(tone.verdigris), 1))
            painter.setBrush(Qt.BrushStyle.NoBrush)
            painter.drawRoundedRect(QRectF(self.rect()).adjusted(1.5, 0.5, -1.5, -1.5), 3, 3)
        painter.end()

    def _written(self, places: list[float]) -> set[int]:
        """Those of the times that have room to be written: the picked one, and others apart."""
        picked = [i for i, stop in enumerate(self.stops) if stop[0] == self.desk.selection]
        written = set(picked)
        last = -math.inf
        for number, x in enumerate(places):
            apart = all(abs(x - places[i]) >= _ROOM for i in picked)
            if apart and x - last >= _ROOM:
                written.add(number)
                last = x
        return written

    def _pick_at(self, x: float) -> None:
        places = self.places()
        if places:
            nearest = min(range(len(places)), key=lambda i: abs(places[i] - x))
            self.picked.emit(self.stops[nearest][0])

    def mousePressEvent(self, event: QMouseEvent) -> None:
        self._pick_at(event.position().x())

    def mouseMoveEvent(self, event: QMouseEvent) -> None:
        self._pick_at(event.position().x())

    def keyPressEvent(self, event: QKeyEvent) -> None:
        keys = [key for key, _, _ in self.stops]
        here = keys.index(self.desk.selection) if self.desk.selection in keys else -1
        target = {
            Qt.Key.Key_Left: max(here - 1, 0),
            Qt.Key.Key_Right: min(here + 1, len(keys) - 1),
            Qt.Key.Key_Home: 0,
            Qt.Key.Key_End: len(keys) - 1,
        }.get(Qt.Key(event.key()))
        if target is None or not keys or event.modifiers():
            super().keyPressEvent(event)
        else:
            self.picked.emit(keys[target])
