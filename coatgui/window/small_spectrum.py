"""A spectrum as a small picture in a tip: |Z| as circles, its fit as a line, both in decades."""

from __future__ import annotations

from base64 import b64encode

import numpy as np
from PySide6.QtCore import QBuffer, QIODevice, QPointF, QRectF, Qt
from PySide6.QtGui import QColor, QImage, QPainter, QPen, QPolygonF

from coatgui.records import Fit, Spectrum
from coatgui.window.numbers import prefixed
from coatgui.window.palette import Colours

_WIDE, _HIGH, _SCALE = 210, 110, 2
_AREA = QRectF(8, 16, _WIDE - 16, _HIGH - 32)


def small_spectrum(spectrum: Spectrum, fit: Fit | None, tone: Colours) -> QImage:
    """The picture, twice as fine as it is shown."""
    image = QImage(_WIDE * _SCALE, _HIGH * _SCALE, QImage.Format.Format_RGB32)
    image.fill(QColor(tone.panel))
    painter = QPainter(image)
    painter.setRenderHint(QPainter.RenderHint.Antialiasing)
    painter.scale(_SCALE, _SCALE)
    x = np.log10(spectrum.frequency_hz)
    sizes = np.abs(spectrum.impedance_ohm)
    y = np.log10(np.maximum(sizes, 1e-30))
    ends = (float(x.min()), float(x.max()), float(y.min()), float(y.max()))
    painter.setPen(QPen(QColor(tone.slate), 1))
    for point in _places(x, y, ends):
        painter.drawEllipse(point, 2.0, 2.0)
    if fit is not None:
        model = np.log10(np.maximum(np.abs(fit.modelled_ohm), 1e-30))
        painter.setPen(QPen(QColor(tone.verdigris), 1.4))
        painter.drawPolyline(QPolygonF(_places(x, model, ends)))
    font = painter.font()
    font.setPixelSize(10)
    painter.setFont(font)
    painter.setPen(QColor(tone.second))
    flag = Qt.AlignmentFlag
    highest, lowest = prefixed(float(sizes.max()), "Ω", 2), prefixed(float(sizes.min()), "Ω", 2)
    low, high = (prefixed(10.0**value, "Hz", 1) for value in ends[:2])
    painter.drawText(QRectF(8, 2, 194, 12), flag.AlignLeft, f"|Z|  {lowest} to {highest}")
    below = QRectF(8, _HIGH - 14, _WIDE - 16, 12)
    painter.drawText(below, flag.AlignLeft, low)
    painter.drawText(below, flag.AlignRight, high)
    painter.end()
    return image


def as_markup(image: QImage) -> str:
    """The picture for a tip: it holds its own bytes, so nothing is loaded."""
    held = QBuffer()
    held.open(QIODevice.OpenModeFlag.WriteOnly)
    image.save(held, "PNG")  # type: ignore[call-overload]
    content = b64encode(held.data().data()).decode("ascii")
    return f'<img src="data:image/png;base64,{content}" width="{_WIDE}" height="{_HIGH}">'


def _places(x: np.ndarray, y: np.ndarray, ends: tuple[float, float, float, float]) -> list[QPointF]:
    left, right, low, high = ends
    across = _AREA.left() + (x - left) / max(right - left, 1e-9) * _AREA.width()
    up = _AREA.bottom() - (y - low) / max(high - low, 1e-9) * _AREA.height()
    return [QPointF(a, b) for a, b in zip(across, up, strict=True)]
