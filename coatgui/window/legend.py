"""A row of formulations with their marks, as they stand in the plots."""

from __future__ import annotations

from PySide6.QtCore import QPointF, QRectF, QSize, Qt
from PySide6.QtGui import QColor, QFont, QFontMetricsF, QPainter, QPaintEvent, QPen, QPolygonF
from PySide6.QtWidgets import QSizePolicy, QWidget

from coatgui.window.palette import Colours, formulation_look

_CORNERS = {
    "s": ((-1, -1), (1, -1), (1, 1), (-1, 1)),
    "d": ((0, -1.3), (1.0, 0), (0, 1.3), (-1.0, 0)),
    "t": ((-1.1, -0.9), (1.1, -0.9), (0, 1.1)),
    "t1": ((-1.1, 0.9), (1.1, 0.9), (0, -1.1)),
    "p": ((0, -1.2), (1.1, -0.35), (0.7, 1.0), (-0.7, 1.0), (-1.1, -0.35)),
}
_LINE, _GAP, _MARK = 20.0, 18.0, 18.0


class Legend(QWidget):
    """Names wrap to further lines where the width does not hold them."""

    def __init__(self, tone: Colours) -> None:
        super().__init__()
        self.tone = tone
        self.names: list[str] = []
        self.setAccessibleName("Formulations in the plots")
        self.setSizePolicy(QSizePolicy.Policy.Expanding, QSizePolicy.Policy.Fixed)

    def show_names(self, names: list[str], tone: Colours) -> None:
        self.names, self.tone = names, tone
        self.setAccessibleDescription(", ".join(names))
        self.updateGeometry()
        self.update()

    def sizeHint(self) -> QSize:
        lines = max((int(y / _LINE) for _, y, _ in self._laid_out()), default=0) + 1
        return QSize(200, round(lines * _LINE))

    def resizeEvent(self, event: object) -> None:
        self.updateGeometry()

    def _font(self) -> QFont:
        font = QFont(self.font())
        font.setPixelSize(12)
        return font

    def _laid_out(self) -> list[tuple[float, float, str]]:
        measure = QFontMetricsF(self._font())
        x, y, places = 2.0, 0.0, []
        for name in self.names:
            shown = measure.elidedText(name, Qt.TextElideMode.ElideRight, 240.0)
            width = _MARK + measure.horizontalAdvance(shown)
            if x > 2.0 and x + width > max(self.width(), 200):
                x, y = 2.0, y + _LINE
            places.append((x, y, shown))
            x += width + _GAP
        return places

    def paintEvent(self, event: QPaintEvent) -> None:
        painter = QPainter(self)
        painter.setRenderHint(QPainter.RenderHint.Antialiasing)
        painter.setFont(self._font())
        for number, (x, y, name) in enumerate(self._laid_out()):
            colour, shape = formulation_look(number, self.tone.dark)
            painter.setPen(QPen(QColor(colour), 2))
            middle = QPointF(x + 6, y + _LINE / 2)
            if shape == "o":
                painter.drawEllipse(middle, 4.5, 4.5)
            else:
                painter.drawPolygon(
                    QPolygonF([middle + QPointF(4.5 * a, 4.5 * b) for a, b in _CORNERS[shape]])
                )
            painter.setPen(QColor(self.tone.ink))
            where = QRectF(x + _MARK, y, self.width(), _LINE)
            painter.drawText(where, Qt.AlignmentFlag.AlignVCenter, name)
        painter.end()
