"""A plot that paints itself in one go, for places where every pick draws new data.

It knows curves, marks and lines, axes of decades or of amounts, and the hand's ways of moving
about: drag, wheel, and a box drawn with Shift. What is on it is kept and given other data.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, field

import numpy as np
from PySide6.QtCore import QPointF, QRectF, Qt, Signal
from PySide6.QtGui import (
    QColor,
    QFontMetricsF,
    QMouseEvent,
    QPainter,
    QPainterPath,
    QPaintEvent,
    QPen,
    QPixmap,
    QPolygonF,
    QTransform,
    QWheelEvent,
)
from PySide6.QtWidgets import QSizePolicy, QWidget

from coatgui.window.axis import decade_ticks
from coatgui.window.numbers import prefixed

_LEFT, _BOTTOM, _TOP, _RIGHT = 88.0, 46.0, 10.0, 14.0
_ROOM = {"bottom": 64.0, "left": 26.0}  # for the words of a tick, in pixels
_GRID = 0.25  # of the way from the ground to a line
_FARTHEST = 1e7  # pixels; what lies beyond is as good as there

Numbers = Sequence[float] | np.ndarray


@dataclass(eq=False)
class Curve:
    """Points joined by a line; `behind` what else is drawn."""

    behind: bool = False
    pen: QPen = field(default_factory=QPen)
    across: np.ndarray = field(default_factory=lambda: np.empty(0))
    up: np.ndarray = field(default_factory=lambda: np.empty(0))

    def show(self, across: Numbers, up: Numbers, pen: QPen | None = None) -> None:
        self.across, self.up = np.asarray(across, float), np.asarray(up, float)
        self.pen = self.pen if pen is None else pen


@dataclass(eq=False)
class Marks(Curve):
    """Points marked by "o", "x" or "t" (a triangle that points down), `size` pixels wide."""

    symbol: str = "o"
    size: float = 7.0
    is_shown: bool = True


@dataclass(eq=False)
class Shade:
    """An area in the plot's own coordinates, behind all else."""

    path: QPainterPath = field(default_factory=QPainterPath)
    colour: QColor = field(default_factory=QColor)


@dataclass(eq=False)
class Line:
    """A line across the plot at one value, upright or level."""

    upright: bool
    value: float = 0.0
    pen: QPen = field(default_factory=QPen)
    is_shown: bool = True


@dataclass(eq=False)
class _Range:
    """What is seen along an axis; plots may share one."""

    low: float = 0.0
    high: float = 1.0
    seen_by: list[Canvas] = field(default_factory=list)


class Canvas(QWidget):
    """`boxed` carries a box drawn with Shift, in the plot's own coordinates. Axes are a title and a
    unit each; with `decades`, values on an axis with a unit are log10. `even`: one unit is as long
    upwards as it is across."""

    boxed = Signal(QRectF)

    def __init__(
        self,
        name: str,
        bottom: tuple[str, str | None],
        left: tuple[str, str | None],
        *,
        decades: bool = True,
        even: bool = False,
    ) -> None:
        super().__init__()
        self.setAccessibleName(name)
        self.setSizePolicy(QSizePolicy.Policy.Expanding, QSizePolicy.Policy.Expanding)
        self.setMinimumSize(160, 110)
        self.setMouseTracking(True)
        self.setAttribute(Qt.WidgetAttribute.WA_OpaquePaintEvent)
        self._axes = {"bottom": bottom, "left": left}
        self._decades, self._even = decades, even
        self._across, self._up = _Range(seen_by=[self]), _Range(seen_by=[self])
        self._ground, self._ink, self._line = (QColor("#FFFFFF"), QColor("#000000"), QColor("#888"))
        self._items: list[Curve | Line] = []
        self._shades: list[Shade] = []
        self._stamps: dict[tuple[object, ...], QPixmap] = {}
        self._held: QPointF | None = None
        self._box: QRectF | None = None

    def add(self, *items: Curve | Line | Shade) -> None:
        for item in items:
            if isinstance(item, Shade):
                self._shades.append(item)
            else:
                self._items.append(item)

    def share_across(self, other: Canvas) -> None:
        """See the same stretch of the bottom axis as another plot, whichever is moved."""
        self._across = other._across
        self._across.seen_by.append(self)

    def paint_in(self, ground: str, ink: str, line: str) -> None:
        self._ground, self._ink, self._line = QColor(ground), QColor(ink), QColor(line)
        self._stamps.clear()
        self.update()

    def viewport(self) -> QWidget:
        """What the mouse moves over: the plot itself."""
        return self

    # --- where things are ------------------------------------------------------------------

    def area(self) -> QRectF:
        """The part between the axes, in pixels."""
        return QRectF(
            _LEFT,
            _TOP,
            max(self.width() - _LEFT - _RIGHT, 1.0),
            max(self.height() - _TOP - _BOTTOM, 1.0),
        )

    def show_range(
        self,
        across: tuple[float, float] | None,
        up: tuple[float, float] | None,
        padding: float = 0.04,
    ) -> None:
        """See these stretches of the axes and a little more; None leaves an axis as it is."""
        for axis, wanted in ((self._across, across), (self._up, up)):
            if wanted is not None:
                low, high = wanted
                more = padding * (high - low) or 0.5
                axis.low, axis.high = low - more, high + more
                for plot in axis.seen_by:
                    plot.update()

    def seen(self) -> tuple[tuple[float, float], tuple[float, float]]:
        """The stretches of the axes that are seen, across and up."""
        across, up = self._across, self._up
        if not self._even:
            return (across.low, across.high), (up.low, up.high)
        area = self.area()
        unit = max((across.high - across.low) / area.width(), (up.high - up.low) / area.height())
        middle = (across.low + across.high) / 2, (up.low + up.high) / 2
        half = unit * area.width() / 2, unit * area.height() / 2
        return (
            (middle[0] - half[0], middle[0] + half[0]),
            (middle[1] - half[1], middle[1] + half[1]),
        )

    def on_screen(self, across: Numbers, up: Numbers) -> np.ndarray:
        """Where points stand, in pixels, (N, 2)."""
        area, ((left, right), (low, high)) = self.area(), self.seen()
        x = area.left() + (np.asarray(across) - left) / (right - left) * area.width()
        y = area.bottom() - (np.asarray(up) - low) / (high - low) * area.height()
        return np.clip(np.stack([x, y], axis=-1), -_FARTHEST, _FARTHEST)

    def _to_screen(self) -> QTransform:
        area, ((left, right), (low, high)) = self.area(), self.seen()
        x, y = area.width() / (right - left), area.height() / (high - low)
        return QTransform(x, 0.0, 0.0, -y, area.left() - left * x, area.bottom() + low * y)

    def at(self, where: QPointF) -> QPointF:
        """The place under a pixel, in the plot's own coordinates."""
        area, ((left, right), (low, high)) = self.area(), self.seen()
        return QPointF(
            left + (where.x() - area.left()) / area.width() * (right - left),
            low + (area.bottom() - where.y()) / area.height() * (high - low),
        )

    # --- painting --------------------------------------------------------------------------

    def paintEvent(self, event: QPaintEvent) -> None:
        painter = QPainter(self)
        self.paint_on(painter)
        painter.end()

    def paint_on(self, painter: QPainter, *, as_shapes: bool = False) -> None:
        """Paint the plot; `as_shapes` for paper, where marks are no small pictures."""
        area = self.area()
        painter.fillRect(self.rect(), self._ground)
        painter.setFont(self.font())
        (across, up) = self.seen()
        self._paint_axis(painter, "bottom", across, area)
        self._paint_axis(painter, "left", up, area)
        painter.save()
        painter.setClipRect(area)
        painter.setRenderHint(QPainter.RenderHint.Antialiasing)
        painter.setBrush(Qt.BrushStyle.NoBrush)
        for surface in self._shades:
            painter.fillPath(self._to_screen().map(surface.path), surface.colour)
        for item in sorted(self._items, key=lambda item: not getattr(item, "behind", False)):
            if isinstance(item, Line):
                self._paint_line(painter, item, area)
            elif not item.across.size:
                continue
            elif isinstance(item, Marks):
                self._paint_marks(painter, item, as_shapes)
            else:
                painter.setPen(item.pen)
                places = self.on_screen(item.across, item.up).tolist()
                painter.drawPolyline(QPolygonF([QPointF(x, y) for x, y in places]))
        if self._box is not None:
            painter.setPen(QPen(self._ink, 1, Qt.PenStyle.DashLine))
            shade = QColor(self._ink)
            shade.setAlpha(30)
            painter.setBrush(shade)
            painter.drawRect(self._box)
        painter.restore()

    def _ticks(self, side: str, low: float, high: float, size: float) -> list[tuple[float, str]]:
        unit = self._axes[side][1]
        if unit is not None and self._decades:
            spacing, values = decade_ticks(low, high, size)
            digits = 1 if spacing >= 0.3 else 4
            return [(value, _power(value, unit, digits)) for value in values]
        step = _step(high - low, max(size / _ROOM[side], 2.0))
        first = math.ceil(low / step - 1e-9)
        values = [step * k for k in range(first, math.floor(high / step + 1e-9) + 1)]
        if unit is not None:
            words = ["0" if abs(v) < 1e-9 * step else prefixed(v, unit, 2) for v in values]
        else:
            places = max(-math.floor(math.log10(step) + 1e-9), 0)
            words = [f"{value:.{places}f}" for value in values]
        return [(v, word.replace("-", "−")) for v, word in zip(values, words, strict=True)]

    def _paint_axis(
        self, painter: QPainter, side: str, seen: tuple[float, float], area: QRectF
    ) -> None:
        is_bottom = side == "bottom"
        ticks = self._ticks(side, *seen, area.width() if is_bottom else area.height())
        grid = _between(self._ground, self._line, _GRID)
        title = self._axes[side][0]
        flag = Qt.AlignmentFlag
        line = QFontMetricsF(painter.font()).height()
        painter.setPen(self._ink)
        for value, words in ticks:
            share = (value - seen[0]) / (seen[1] - seen[0])
            if is_bottom:
                x = round(area.left() + share * area.width())
                # Filled, not drawn: it takes a tenth of the time.
                painter.fillRect(QRectF(x, area.top(), 1, area.height()), grid)
                painter.drawText(
                    QRectF(x - 50, area.bottom() + 4, 100, line), flag.AlignHCenter, words
                )
            else:
                y = round(area.bottom() - share * area.height())
                painter.fillRect(QRectF(area.left(), y, area.width(), 1), grid)
                painter.drawText(
                    QRectF(line, y - line / 2, _LEFT - line - 6, line),
                    flag.AlignRight | flag.AlignVCenter,
                    words,
                )
        if is_bottom:
            painter.fillRect(QRectF(area.left(), area.bottom(), area.width(), 1), self._line)
            below = QRectF(area.left(), self.height() - line - 2, area.width(), line)
            painter.drawText(below, flag.AlignHCenter, title)
        else:
            painter.fillRect(QRectF(area.left(), area.top(), 1, area.height()), self._line)
            painter.save()
            painter.translate(2, area.center().y())
            painter.rotate(-90)
            half = area.height() / 2
            painter.drawText(QRectF(-half, 0, 2 * half, line), flag.AlignHCenter, title)
            painter.restore()

    def _paint_line(self, painter: QPainter, item: Line, area: QRectF) -> None:
        if not item.is_shown:
            return
        at = item.value
        (x, y) = self.on_screen([at], [at])[0].tolist()
        painter.setPen(item.pen)
        if item.upright:
            painter.drawLine(QPointF(x, area.top()), QPointF(x, area.bottom()))
        else:
            painter.drawLine(QPointF(area.left(), y), QPointF(area.right(), y))

    def _paint_marks(self, painter: QPainter, item: Marks, as_shapes: bool) -> None:
        if not item.is_shown:
            return
        places = self.on_screen(item.across, item.up)
        places = places[np.isfinite(places).all(axis=1)]
        if as_shapes:
            painter.setPen(item.pen)
            for x, y in places.tolist():
                _draw_mark(painter, item.symbol, item.size, QPointF(x, y))
            return
        ratio = self.devicePixelRatioF()
        width = math.ceil(item.size + item.pen.widthF()) + 2
        stamp = self._stamp(item, width, ratio)
        # On whole pixels of the screen, or the little pictures blur.
        corners = np.round((places - width / 2) * ratio) / ratio
        for x, y in corners.tolist():
            painter.drawPixmap(QPointF(x, y), stamp)

    def _stamp(self, item: Marks, width: int, ratio: float) -> QPixmap:
        """A mark as a small picture."""
        pen = item.pen
        key = (item.symbol, item.size, pen.color().rgba(), pen.widthF(), ratio)
        stamp = self._stamps.get(key)
        if stamp is None:
            stamp = self._stamps[key] = QPixmap(math.ceil(width * ratio), math.ceil(width * ratio))
            stamp.setDevicePixelRatio(ratio)
            stamp.fill(Qt.GlobalColor.transparent)
            painter = QPainter(stamp)
            painter.setRenderHint(QPainter.RenderHint.Antialiasing)
            painter.setPen(pen)
            _draw_mark(painter, item.symbol, item.size, QPointF(width / 2, width / 2))
            painter.end()
        return stamp

    # --- the hand --------------------------------------------------------------------------

    def mousePressEvent(self, event: QMouseEvent) -> None:
        if event.button() == Qt.MouseButton.LeftButton:
            self._held = event.position()
            if event.modifiers() & Qt.KeyboardModifier.ShiftModifier:
                self._box = QRectF(self._held, self._held)

    def mouseMoveEvent(self, event: QMouseEvent) -> None:
        if self._held is None:
            return
        if self._box is not None:
            self._box = QRectF(self._held, event.position()).normalized()
            self.update()
            return
        was, now = self.at(self._held), self.at(event.position())
        (left, right), (low, high) = self.seen()
        by = was - now
        self._held = event.position()
        self.show_range((left + by.x(), right + by.x()), (low + by.y(), high + by.y()), 0.0)

    def mouseReleaseEvent(self, event: QMouseEvent) -> None:
        box, self._box, self._held = self._box, None, None
        if box is not None:
            self.update()
            if box.width() >= 2 and box.height() >= 2:
                corners = self.at(box.topLeft()), self.at(box.bottomRight())
                self.boxed.emit(QRectF(*corners).normalized())

    def wheelEvent(self, event: QWheelEvent) -> None:
        about, factor = self.at(event.position()), 1.15 ** (-event.angleDelta().y() / 120)
        (left, right), (low, high) = self.seen()
        x, y = about.x(), about.y()
        self.show_range(
            (x + (left - x) * factor, x + (right - x) * factor),
            (y + (low - y) * factor, y + (high - y) * factor),
            0.0,
        )
        event.accept()


def _draw_mark(painter: QPainter, symbol: str, size: float, middle: QPointF) -> None:
    half = size / 2
    if symbol == "o":
        painter.drawEllipse(middle, half, half)
    elif symbol == "t":
        corners = ((-half, -half), (half, -half), (0.0, half))
        painter.drawPolygon(QPolygonF([middle + QPointF(x, y) for x, y in corners]))
    else:
        for way in (1, -1):
            arm = QPointF(half, way * half)
            painter.drawLine(middle - arm, middle + arm)


def _between(one: QColor, other: QColor, share: float) -> QColor:
    """A colour that is a share of the way from one to another."""
    return QColor.fromRgbF(
        one.redF() + share * (other.redF() - one.redF()),
        one.greenF() + share * (other.greenF() - one.greenF()),
        one.blueF() + share * (other.blueF() - one.blueF()),
    )


def _power(value: float, unit: str, digits: int) -> str:
    return prefixed(10.0**value, unit, digits)


def _step(width: float, most: float) -> float:
    """The smallest of 1, 2 and 5 times a power of ten that is found at most so often."""
    least = max(width, 1e-300) / most
    power = 10.0 ** math.floor(math.log10(least))
    return next(power * k for k in (1, 2, 5, 10) if power * k >= least * (1 - 1e-9))
