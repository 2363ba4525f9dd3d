"""A place's plots as a picture, always on white, and their data as a table."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from contextlib import contextmanager
from dataclasses import replace
from pathlib import Path
from typing import Any

import pyqtgraph as pg
from PySide6.QtCore import QBuffer, QByteArray, QIODevice, QPoint, QRect, QRectF, QSize, Qt
from PySide6.QtGui import QColor, QFont, QImage, QPainter, QPen, QRegion
from PySide6.QtSvg import QSvgGenerator
from PySide6.QtWidgets import QWidget

from coatgui.output.whole import write_whole
from coatgui.window import palette
from coatgui.window.axis import Plot
from coatgui.window.canvas import Canvas
from coatgui.window.palette import Colours

_CAPTION = 28
# A picture has this many pixels for each on the screen, which is print quality for a half page.
SCALE = 3


def on_white() -> Colours:
    """The colours of paper."""
    return replace(palette.colours(False), ground="#FFFFFF")


def _area(widgets: Sequence[QWidget]) -> QRect:
    """What the widgets cover together, in their window."""
    area = QRect()
    for widget in widgets:
        area |= QRect(widget.mapTo(widget.window(), QPoint(0, 0)), widget.size())
    return area


@contextmanager
def _enlarged(widgets: Sequence[QWidget], scale: float) -> Iterator[None]:
    """Symbols drawn as shapes, not from the screen's store of small pictures, and lines and symbols
    as strong in a picture of more pixels as they are on the screen."""
    plots = [plot for plot in widgets if isinstance(plot, Plot)]
    items: list[Any] = [item for plot in plots for item in plot.scene().items()]
    symbols = [item for item in items if isinstance(item, pg.ScatterPlotItem)]
    drawn = [item for item in items if isinstance(item, (pg.PlotCurveItem, pg.ScatterPlotItem))]
    lines = [item for item in items if isinstance(item, pg.InfiniteLine)]
    pens = [(item, item.opts["pen"]) for item in drawn] + [(item, item.pen) for item in lines]
    for item in symbols:
        item.setExportMode(True, {"antialias": True, "resolutionScale": scale})
    for item, pen in pens:
        thick = QPen(pg.mkPen(pen))
        thick.setWidthF(max(thick.widthF(), 1.0) * scale)
        item.setPen(thick)
    try:
        yield
    finally:
        for item in symbols:
            item.setExportMode(False)
        for item, pen in pens:
            item.setPen(pen)


def _draw(painter: QPainter, widgets: Sequence[QWidget], caption: str, scale: float) -> None:
    area = _area(widgets)
    size = QSize(area.width(), area.height() + _CAPTION)
    painter.setRenderHint(QPainter.RenderHint.Antialiasing)
    painter.fillRect(QRectF(0, 0, size.width() * scale, size.height() * scale), QColor("#FFFFFF"))
    font = QFont(widgets[0].font())
    font.setPixelSize(round(13 * scale))
    painter.setFont(font)
    painter.setPen(QColor(on_white().ink))
    words = QRectF(8 * scale, 0, (size.width() - 16) * scale, _CAPTION * scale)
    painter.drawText(words, Qt.AlignmentFlag.AlignVCenter, caption)
    with _enlarged(widgets, scale):
        for widget in widgets:
            at = widget.mapTo(widget.window(), QPoint(0, 0)) - area.topLeft()
            target = QRectF(
                at.x() * scale,
                (at.y() + _CAPTION) * scale,
                widget.width() * scale,
                widget.height() * scale,
            )
            if isinstance(widget, Plot):
                widget.scene().render(painter, target, QRectF(widget.rect()))
            else:
                painter.save()
                painter.translate(target.topLeft())
                painter.scale(scale, scale)
                if isinstance(widget, Canvas):
                    widget.paint_on(painter, as_shapes=True)
                else:
                    flag = QWidget.RenderFlag.DrawChildren
                    widget.render(painter, QPoint(0, 0), QRegion(), flag)
                painter.restore()


def picture(widgets: Sequence[QWidget], caption: str) -> QImage:
    """The widgets as they stand beside one another, under a caption."""
    area = _area(widgets)
    image = QImage(
        area.width() * SCALE, (area.height() + _CAPTION) * SCALE, QImage.Format.Format_RGB32
    )
    painter = QPainter(image)
    _draw(painter, widgets, caption, SCALE)
    painter.end()
    return image


def drawing(widgets: Sequence[QWidget], caption: str) -> bytes:
    """The same as SVG."""
    area = _area(widgets)
    size = QSize(area.width(), area.height() + _CAPTION)
    held = QByteArray()
    buffer = QBuffer(held)
    buffer.open(QIODevice.OpenModeFlag.WriteOnly)
    generator = QSvgGenerator()
    generator.setOutputDevice(buffer)
    generator.setSize(size)
    # The axes are recorded at the screen's resolution; at another their text would go astray.
    generator.setResolution(widgets[0].logicalDpiX())
    generator.setViewBox(QRect(QPoint(0, 0), size))
    generator.setTitle(caption)
    painter = QPainter(generator)
    _draw(painter, widgets, caption, 1.0)
    painter.end()
    buffer.close()
    return bytes(held.data())


def save(widgets: Sequence[QWidget], caption: str, path: Path) -> None:
    """Write a picture, as SVG or PNG by the ending; whole or not at all. Raises OSError."""
    if path.suffix.lower() == ".svg":
        content = drawing(widgets, caption)
    else:
        held = QByteArray()
        buffer = QBuffer(held)
        buffer.open(QIODevice.OpenModeFlag.WriteOnly)
        picture(widgets, caption).save(buffer, "PNG")  # type: ignore[call-overload]
        buffer.close()
        content = bytes(held.data())
    write_whole(path, lambda file: file.write(content))


def as_text(rows: Sequence[Sequence[object]]) -> str:
    """Rows for a spreadsheet: cells parted by tabs, an empty one where there is nothing."""

    def cell(value: object) -> str:
        if value is None:
            return ""
        # A tab or a line break in a name would shift the cells behind it.
        return repr(value) if isinstance(value, float) else " ".join(str(value).split())

    return "\n".join("\t".join(cell(value) for value in row) for row in rows) + "\n"
