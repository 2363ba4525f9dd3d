"""Reading: what one spectrum says. Plots left, the fitted parameters right, findings below."""

from __future__ import annotations

from typing import Any

import numpy as np
import pyqtgraph as pg
from PySide6.QtCore import Qt
from PySide6.QtWidgets import (
    QAbstractItemView,
    QComboBox,
    QGridLayout,
    QHBoxLayout,
    QHeaderView,
    QLabel,
    QTableWidget,
    QTableWidgetItem,
    QVBoxLayout,
)

from coatgui.campaign import operations
from coatgui.circuits import catalogue
from coatgui.records import Reading, ReadingAssessment
from coatgui.window.axis import Plot
from coatgui.window.desk import Desk
from coatgui.window.numbers import WORDS, prefixed, said
from coatgui.window.palette import Colours
from coatgui.window.places.place import Place, plain_label

_AUTOMATIC = "Model chosen by the data"


class ReadingPlace(Place):
    noun, question = "Reading", "What does this spectrum say?"

    def __init__(self, desk: Desk, tone: Colours) -> None:
        super().__init__(desk, tone)
        self.about = plain_label()
        self.column.addWidget(self.about)
        row = QHBoxLayout()
        row.setSpacing(12)
        self.column.addLayout(row, 1)
        self.modulus = Plot(
            "Bode plot of the modulus", ("frequency", "Hz"), ("|Z| of the specimen", "Ω")
        )
        self.phase = Plot("Bode plot of the phase", ("frequency", "Hz"), ("phase / °", None))
        self.plane = Plot("Complex plane", ("Z′", "Ω"), ("−Z″", "Ω"), decades=False)
        self.plane.setAspectLocked(True)
        self.residual = Plot("Residuals", ("frequency", "Hz"), ("residual / %", None))
        self.phase.setXLink(self.modulus)
        self.residual.setXLink(self.modulus)
        grid = QGridLayout()
        grid.setSpacing(6)
        for place, plot in enumerate((self.modulus, self.plane, self.phase, self.residual)):
            grid.addWidget(plot, place // 2, place % 2)
        row.addLayout(grid, 4)
        side = QVBoxLayout()
        self.model = QComboBox()
        self.model.setAccessibleName("Coating model of this reading")
        self.model.addItem(_AUTOMATIC, "")
        for name, model in catalogue().items():
            self.model.addItem(model.name, name)
        self.model.activated.connect(self._pin)
        side.addWidget(self.model)
        self.table = QTableWidget(0, 2)
        self.table.setAccessibleName("Fitted parameters with limits")
        self.table.setHorizontalHeaderLabels(["", "value (95 % limits)"])
        self.table.verticalHeader().hide()
        self.table.setEditTriggers(QAbstractItemView.EditTrigger.NoEditTriggers)
        self.table.setShowGrid(False)
        header = self.table.horizontalHeader()
        header.setSectionResizeMode(QHeaderView.ResizeMode.ResizeToContents)
        header.setStretchLastSection(True)
        self.table.setWordWrap(True)
        side.addWidget(self.table, 1)
        self.findings = plain_label()
        side.addWidget(self.findings)
        row.addLayout(side, 2)
        self.read_out = QLabel()
        self.read_out.setObjectName("small")
        self.column.addWidget(self.read_out)
        self.cursors = [
            pg.InfiniteLine(angle=90, movable=False)
            for _ in (self.modulus, self.phase, self.residual)
        ]
        self.modulus.scene().sigMouseMoved.connect(self._moved)
        self._points: dict[Any, np.ndarray] = {}

    def show_campaign(self) -> None:
        self.show_selection()

    def show_selection(self) -> None:
        reading, known = self.desk.reading(), self.desk.reading_assessment()
        for plot in (self.modulus, self.phase, self.plane, self.residual):
            plot.clear()
            plot.paint_in(self.tone.ground, self.tone.second, self.tone.line)
        self.table.setRowCount(0)
        self.findings.setText("")
        if reading is None:
            self.about.setText("No reading is picked: pick one in the tree or on the map.")
            return
        self._say(reading, known)
        self._draw(reading, known)
        self.model.setCurrentIndex(max(self.model.findData(reading.pinned_model), 0))
        if known is not None:
            self._tabulate(known)

    def _say(self, reading: Reading, known: ReadingAssessment | None) -> None:
        if known is None:
            self.about.setText(f"{reading.exposure_h:g} h: not judged yet.")
            return
        text = f"{known.panel} of {known.formulation} at {known.exposure_h:g} h: "
        if known.fit is None:
            text += "not fitted; the findings say why."
        else:
            text += (
                f"{known.fit.model_name}, residual {known.fit.residual_rms_percent:.2f} %, "
                f"{known.points_used} of {known.points_read} points used; {known.fit.message}."
            )
        self.about.setText(text)
        marks = {"note": "◦", "doubt": "▲", "reject": "■"}
        lines = [f"{marks[f.severity.value]} {f.text}" for f in known.findings]
        self.findings.setText("\n".join(lines[:6]) or "◦ Nothing to say against this reading.")

    def _draw(self, reading: Reading, known: ReadingAssessment | None) -> None:
        tone, z = self.tone, reading.spectrum.impedance_ohm
        x = np.log10(reading.spectrum.frequency_hz)
        fit = known.fit if known else None
        used = fit.used if fit is not None else np.ones(x.size, dtype=bool)
        series = {
            self.modulus: (x, np.log10(np.abs(z))),
            self.phase: (x, np.degrees(np.angle(z))),
            self.plane: (z.real, -z.imag),
        }
        if fit is not None:
            model = fit.modelled_ohm
            pen = pg.mkPen(tone.verdigris, width=1.6)
            self.modulus.plot(x, np.log10(np.abs(model)), pen=pen)
            self.phase.plot(x, np.degrees(np.angle(model)), pen=pen)
            self.plane.plot(model.real, -model.imag, pen=pen)
            off = 100.0 * (z - model) / np.abs(z)
            self.residual.plot([x.min(), x.max()], [0, 0], pen=pg.mkPen(tone.line))
            for part, symbol, colour in ((off.real, "o", tone.slate), (off.imag, "t", tone.amber)):
                self.residual.plot(
                    x[used], part[used], pen=None, symbol=symbol, symbolSize=5,
                    symbolPen=pg.mkPen(colour), symbolBrush=None,
                )  # fmt: skip
        for plot, (across, up) in series.items():
            shown = plot.plot(
                across[used], up[used], pen=None, symbol="o", symbolSize=7,
                symbolPen=pg.mkPen(tone.slate, width=1.2), symbolBrush=None,
                data=np.nonzero(used)[0],
            )  # fmt: skip
            shown.sigPointsClicked.connect(self._clicked)
            if not used.all():
                crosses = plot.plot(
                    across[~used], up[~used], pen=None, symbol="x", symbolSize=7,
                    symbolPen=pg.mkPen(tone.second), symbolBrush=None,
                    data=np.nonzero(~used)[0],
                )  # fmt: skip
                crosses.sigPointsClicked.connect(self._clicked)
        for plot, cursor in zip(
            (self.modulus, self.phase, self.residual), self.cursors, strict=True
        ):
            cursor.setPen(pg.mkPen(tone.second, width=1))
            cursor.hide()
            plot.addItem(cursor, ignoreBounds=True)
        for plot in (self.modulus, self.phase, self.plane, self.residual):
            plot.autoRange()

    def _tabulate(self, known: ReadingAssessment) -> None:
        rows = [(p.symbol, p.meaning, p.quantity) for p in known.parameters]
        for name, quantity in (
            ("C film", known.coating_capacitance),
            ("|Z| 0.1 Hz", q.quantity if (q := known.modulus_at(0.1)) else None),
            ("water", known.water_uptake.quantity if known.water_uptake else None),
        ):
            if quantity is not None:
                rows.append((name, quantity.method, quantity))
        self.table.setRowCount(len(rows))
        for i, (symbol, meaning, quantity) in enumerate(rows):
            cells = (symbol, said(quantity))
            for j, text in enumerate(cells):
                item = QTableWidgetItem(text)
                item.setToolTip(f"{meaning} ({WORDS[quantity.bound]}). {quantity.method}")
                self.table.setItem(i, j, item)
        self.table.resizeRowsToContents()

    def _clicked(self, _item: Any, points: Any) -> None:
        reading, known = self.desk.reading(), self.desk.reading_assessment()
        if reading is None or not len(points):
            return
        place = int(points[0].data())
        fit = known.fit if known else None
        left_out = fit is not None and not fit.used[place]
        if left_out:
            self.desk.edit(operations.take_back_points, reading.reading_id, [place])
        else:
            reason = "left out by hand"
            self.desk.edit(operations.leave_out_points, reading.reading_id, [place], reason)

    def _pin(self, index: int) -> None:
        reading = self.desk.reading()
        name = self.model.itemData(index)
        if reading is not None and name != reading.pinned_model:
            self.desk.edit(operations.pin_model, [reading.reading_id], name)

    def _moved(self, position: Any) -> None:
        reading = self.desk.reading()
        if reading is None:
            return
        x = float(self.modulus.getPlotItem().vb.mapSceneToView(position).x())
        logs = np.log10(reading.spectrum.frequency_hz)
        place = int(np.abs(logs - x).argmin())
        for cursor in self.cursors:
            cursor.setValue(float(logs[place]))
            cursor.show()
        z = reading.spectrum.impedance_ohm[place]
        frequency = float(reading.spectrum.frequency_hz[place])
        self.read_out.setText(
            f"{prefixed(frequency, 'Hz')}   |Z| {prefixed(float(abs(z)), 'Ω')}   "
            f"phase {float(np.degrees(np.angle(z))):.1f}°"
        )
        self.read_out.setTextFormat(Qt.TextFormat.PlainText)
