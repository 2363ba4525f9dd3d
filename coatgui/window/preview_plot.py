"""Two small plots of a spectrum that is about to be brought in: what a wrong unit or sign shows."""

from __future__ import annotations

import numpy as np
import pyqtgraph as pg
from PySide6.QtWidgets import QVBoxLayout, QWidget

from coatgui.records import Spectrum
from coatgui.window.axis import Plot
from coatgui.window.palette import Colours


class PreviewPlot(QWidget):
    """Modulus above, phase below; the plots stay and get other data."""

    def __init__(self) -> None:
        super().__init__()
        column = QVBoxLayout(self)
        column.setContentsMargins(0, 0, 0, 0)
        column.setSpacing(4)
        self.modulus = Plot("Modulus of the proposal", ("frequency", "Hz"), ("|Z|", "Ω"))
        self.phase = Plot("Phase of the proposal", ("frequency", "Hz"), ("phase / °", None))
        self.phase.setXLink(self.modulus)
        self._points = [pg.ScatterPlotItem(size=5, symbol="o") for _ in range(2)]
        for plot, points in zip((self.modulus, self.phase), self._points, strict=True):
            plot.setMouseEnabled(x=False, y=False)
            plot.addItem(points)
            plot.setMinimumHeight(90)
            column.addWidget(plot)
        self.shown: Spectrum | None = None

    def show_spectrum(self, spectrum: Spectrum | None, tone: Colours) -> None:
        self.shown = spectrum
        for plot, points in zip((self.modulus, self.phase), self._points, strict=True):
            plot.paint_in(tone.ground, tone.second, tone.line)
            points.setPen(pg.mkPen(tone.slate, width=1.2))
            points.setBrush(None)
            if spectrum is None:
                points.setData([], [])
        if spectrum is None:
            return
        z, across = spectrum.impedance_ohm, np.log10(spectrum.frequency_hz)
        for plot, points, up in (
            (self.modulus, self._points[0], np.log10(np.maximum(np.abs(z), 1e-30))),
            (self.phase, self._points[1], np.degrees(np.angle(z))),
        ):
            points.setData(across, up)
            plot.setRange(
                xRange=(float(across.min()), float(across.max())),
                yRange=(float(up.min()), float(up.max())),
                padding=0.06,
            )
