"""Axes of decades. Plots carry log10 of their data, so the axis writes 10^x with a prefix."""

from __future__ import annotations

import math
from typing import Any

import numpy as np
import pyqtgraph as pg
from PySide6.QtCore import QRectF, Qt, Signal

from coatgui.window.numbers import prefixed


def decade_ticks(low: float, high: float, size: float) -> tuple[float, list[float]]:
    """Spacing and places of the ticks, as log10, on an axis `size` pixels long: at least two
    wherever the view has a width."""
    low, high = min(low, high), max(low, high)
    decades = [float(d) for d in range(math.ceil(low), math.floor(high) + 1)]
    room = max(size / 46.0, 2.0)
    if len(decades) >= 2:
        step = max(math.ceil(len(decades) / room), 1)
        kept = [d for d in decades if d % step == 0] if step > 1 else decades
        return 1.0, kept if len(kept) >= 2 else decades[:: len(decades) - 1]
    inner = [
        d + math.log10(m)
        for d in range(math.floor(low), math.ceil(high) + 1)
        for m in (1, 2, 3, 5, 7)
        if low <= d + math.log10(m) <= high
    ]
    if len(inner) >= 2:
        return 0.3, inner
    width = high - low
    return width / 3, [low + width * f for f in (0.15, 0.5, 0.85)]


class DecadeAxis(pg.AxisItem):  # type: ignore[misc, unused-ignore]
    """An axis for log10 values: a tick at each decade, or finer where less than two would show."""

    def __init__(self, orientation: str, unit: str) -> None:
        super().__init__(orientation)
        self.unit = unit
        self.enableAutoSIPrefix(False)

    def tickValues(self, low: float, high: float, size: float) -> list[tuple[float, list[float]]]:
        return [decade_ticks(low, high, size)]

    def tickStrings(self, values: list[float], scale: float, spacing: float) -> list[str]:
        digits = 1 if spacing >= 0.3 else 4
        return [prefixed(10.0**value, self.unit, digits) for value in values]


class AmountAxis(pg.AxisItem):  # type: ignore[misc, unused-ignore]
    """An axis for plain values, its ticks written with engineering prefixes."""

    def __init__(self, orientation: str, unit: str) -> None:
        super().__init__(orientation)
        self.unit = unit
        self.enableAutoSIPrefix(False)

    def tickValues(self, low: float, high: float, size: float) -> list[tuple[float, list[float]]]:
        """The coarsest ticks alone, and of them so many as have room for their words."""
        spacing, values = super().tickValues(low, high, size)[0]
        values = list(values)
        step = max(int(np.ceil(len(values) * 64.0 / max(size, 1.0))), 1)
        return [(spacing, values[::step])]

    def tickStrings(self, values: list[float], scale: float, spacing: float) -> list[str]:
        texts = ["0" if abs(v) < 1e-9 * spacing else prefixed(v, self.unit, 2) for v in values]
        return [text.replace("-", "−") for text in texts]


class PlainAxis(pg.AxisItem):  # type: ignore[misc, unused-ignore]
    """An axis of plain numbers: no prefix hidden in its title, and a minus that is one."""

    def __init__(self, orientation: str) -> None:
        super().__init__(orientation)
        self.enableAutoSIPrefix(False)

    def tickValues(self, low: float, high: float, size: float) -> list[tuple[float, list[float]]]:
        ticks = super().tickValues(low, high, size)
        return [ticks[0]] if len(ticks[0][1]) >= 2 else list(ticks[:2])

    def tickStrings(self, values: list[float], scale: float, spacing: float) -> list[str]:
        return [s.replace("-", "−") for s in super().tickStrings(values, 1.0, spacing)]


class BoxView(pg.ViewBox):  # type: ignore[misc, unused-ignore]
    """A view in which dragging with Shift draws a box, reported in the plot's own coordinates."""

    boxed = Signal(QRectF)

    def mouseDragEvent(self, ev: Any, axis: int | None = None) -> None:
        if not ev.modifiers() & Qt.KeyboardModifier.ShiftModifier:
            super().mouseDragEvent(ev, axis)
            return
        ev.accept()
        if ev.isFinish():
            self.rbScaleBox.hide()
            area = QRectF(ev.buttonDownPos(), ev.pos()).normalized()
            self.boxed.emit(self.childGroup.mapRectFromParent(area).normalized())
        else:
            self.updateScaleBox(ev.buttonDownPos(), ev.pos())


class Plot(pg.PlotWidget):  # type: ignore[misc, unused-ignore]
    """A plot with decade axes where a unit is given, plain ones elsewhere, in our colours."""

    def __init__(
        self,
        name: str,
        bottom: tuple[str, str | None],
        left: tuple[str, str | None],
        *,
        decades: bool = True,
    ) -> None:
        axes: dict[str, Any] = {}
        for side, (_, unit) in (("bottom", bottom), ("left", left)):
            if unit is not None:
                axes[side] = (DecadeAxis if decades else AmountAxis)(side, unit)
            else:
                axes[side] = PlainAxis(side)
        view = BoxView()
        super().__init__(axisItems=axes, viewBox=view)
        self.boxed = view.boxed
        self._worn: tuple[str, str, str] | None = None
        self._titles = {"bottom": bottom[0], "left": left[0]}
        self.setAccessibleName(name)
        self.setMenuEnabled(False)
        self.hideButtons()
        self.getPlotItem().getAxis("left").setWidth(88)

    def paint_in(self, ground: str, ink: str, line: str) -> None:
        """Take on the window's colours; drawing anew in the same ones would cost every axis."""
        if (ground, ink, line) == self._worn:
            return
        self._worn = (ground, ink, line)
        self.setBackground(ground)
        for side, title in self._titles.items():
            axis = self.getPlotItem().getAxis(side)
            axis.setPen(line)
            axis.setTextPen(ink)
            axis.setLabel(title, color=ink)
        self.showGrid(x=True, y=True, alpha=0.12)
        box = self.getPlotItem().vb.rbScaleBox
        box.setPen(pg.mkPen(ink, width=1, style=Qt.PenStyle.DashLine))
        shade = pg.mkColor(ink)
        shade.setAlpha(30)
        box.setBrush(shade)
