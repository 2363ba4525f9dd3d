"""What was tried on a spectrum: every model with how well it fits, and why it was taken or left."""

from __future__ import annotations

from collections.abc import Mapping

from PySide6.QtGui import QColor, QFont
from PySide6.QtWidgets import QTableWidgetItem, QVBoxLayout, QWidget

from coatgui.circuits import CoatingModel
from coatgui.records import Fit
from coatgui.window.palette import Colours
from coatgui.window.places.place import plain_label, plain_tip
from coatgui.window.sheet import sheet

_ROW, _MOST_ROWS = 22, 4


class TrialsTable(QWidget):
    def __init__(self) -> None:
        super().__init__()
        column = QVBoxLayout(self)
        column.setContentsMargins(0, 0, 0, 0)
        column.setSpacing(4)
        self.note = plain_label("small")
        self.table = sheet(
            ("model", "parameters", "residual / %", "AICc", "remark"),
            "Models that were tried",
            "A row for each model that was laid on this spectrum; up and down scroll",
        )
        self.table.verticalHeader().setDefaultSectionSize(_ROW)
        column.addWidget(self.note)
        column.addWidget(self.table)

    def show_trials(
        self, fit: Fit | None, models: Mapping[str, CoatingModel], tone: Colours
    ) -> None:
        trials = () if fit is None else fit.trials
        self.note.setText(
            "The lowest AICc describes the points best for its number of parameters."
            if len(trials) > 1
            else "One model was laid on this spectrum."
            if trials
            else "No model was laid on this spectrum."
        )
        self.table.setRowCount(len(trials))
        for row, trial in enumerate(trials):
            texts = (
                models[trial.model].name if trial.model in models else trial.model,
                str(trial.parameters),
                "–" if trial.residual_rms_percent is None else f"{trial.residual_rms_percent:.2f}",
                "–" if trial.aicc is None else f"{trial.aicc:.1f}".replace("-", "−"),
                trial.remark,
            )
            taken = fit is not None and trial.model == fit.model
            for column, text in enumerate(texts):
                item = QTableWidgetItem(text)
                item.setToolTip(plain_tip(text))
                item.setForeground(QColor(tone.ink if taken else tone.second))
                font = QFont(self.table.font())
                font.setBold(taken)
                item.setFont(font)
                self.table.setItem(row, column, item)
                if taken and column == 0:
                    self.table.setCurrentItem(item)
        rows = min(max(len(trials), 1), _MOST_ROWS)
        self.table.setFixedHeight(34 + rows * _ROW)
