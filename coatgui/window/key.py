"""The key of a plot: what its marks, lines and shades mean."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from PySide6.QtCore import QLineF, QPointF, QRectF, QSize, Qt
from PySide6.QtGui import QColor, QFont, QFontMetricsF, QPainter, QPaintEvent, QPen, QPolygonF
from PySide6.QtWidgets import QSizePolicy, QWidget

_LINE, _MARK, _GAP = 17.0, 26.0, 14.0


@dataclass(frozen=True)
class Entry:
    """`kind` is line, band, circle, triangle or cross."""

    kind: str
    colour: str
    text: str
    style: Qt.PenStyle = Qt.PenStyle.SolidLine


class Key(QWidget):
    """Entries one after another; they wrap to further lines where the width does not hold them."""

    def __init__(self, name: str) -> None:
        super().__init__()
        self.entries: list[Entry] = []
        self._ink = "#000000"
        self.setAccessibleName(name)
        self.setSizePolicy(QSizePolicy.Policy.Expanding, QSizePolicy.Policy.Fixed)

    def show_entries(self, entries: Sequence[Entry], ink: str) -> None:
        if (list(entries), ink) == (self.entries, self._ink):
            return  # or every pick of a reading would lay out the plots anew
        self.entries, self._ink = list(entries), ink
        self.setAccessibleDescription("; ".join(f"{e.kind}: {e.text}" for e in entries))
        self.updateGeometry()
        self.update()

    def sizeHint(self) -> QSize:
        lines = max((int(y / _LINE) for _, y, _ in self._laid_out()), default=0) + 1
        return QSize(200, round(lines * _LINE))

    def minimumSizeHint(self) -> QSize:
        return QSize(100, self.sizeHint().height())

    def resizeEvent(self, event: object) -> None:
        self.updateGeometry()

    def _font(self) -> QFont:
        font = QFont(self.font())
        font.setPixelSize(11)
        return font

    def _laid_out(self) -> list[tuple[float, float, Entry]]:
        measure = QFontMetricsF(self._font())
        x, y, places = 2.0, 0.0, []
        for entry in self.entries:
            width = _MARK + measure.horizontalAdvance(entry.text)
            if x > 2.0 and x + width > max(self.width(), 200):
                x, y = 2.0, y + _LINE
            places.append((x, y, entry))
            x += width + _GAP
        return places

    def paintEvent(self, event: QPaintEvent) -> None:
        painter = QPainter(self)
        painter.setRenderHint(QPainter.RenderHint.Antialiasing)
        painter.setFont(self._font())
        for x, y, entry in self._laid_out():
            _draw(painter, entry, QPointF(x + 10, y + _LINE / 2))
            painter.setPen(QColor(self._ink))
            where = QRectF(x + _MARK, y, self.width() - x - _MARK, _LINE)
            painter.drawText(where, Qt.AlignmentFlag.AlignVCenter, entry.text)
        painter.end()


def _draw(painter: QPainter, entry: Entry, middle: QPointF) -> None:
    painter.setPen(QPen(QColor(entry.colour), 1.6, entry.style))
    painter.setBrush(Qt.BrushStyle.NoBrush)
    if entry.kind == "line":
        painter.drawLine(QLineF(middle - QPointF(10, 0), middle + QPointF(10, 0)))
    elif entry.kind == "band":
        shade = QColor(entry.colour)
        shade.setAlpha(60)
        painter.fillRect(QRectF(middle.x() - 10, middle.y() - 4, 20, 8), shade)
    elif entry.kind == "circle":
        painter.drawEllipse(middle, 3.5, 3.5)
    elif entry.kind == "triangle":
        corners = (QPointF(-4, -3), QPointF(4, -3), QPointF(0, 4))
        painter.drawPolygon(QPolygonF([middle + corner for corner in corners]))
    else:
        for a, b in ((QPointF(-3, -3), QPointF(3, 3)), (QPointF(-3, 3), QPointF(3, -3))):
            painter.drawLine(QLineF(middle + a, middle + b))
