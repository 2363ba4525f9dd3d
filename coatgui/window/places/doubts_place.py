"""Doubts: what needs a person's eye, across the campaign."""

from __future__ import annotations

from PySide6.QtCore import Qt
from PySide6.QtWidgets import QListWidget, QListWidgetItem

from coatgui.records import Severity
from coatgui.window.desk import Desk
from coatgui.window.palette import Colours
from coatgui.window.places.place import Place, plain_label

_MARKS = {Severity.REJECT: "■", Severity.DOUBT: "▲"}


class DoubtsPlace(Place):
    noun, question = "Doubts", "What needs a person's eye?"

    def __init__(self, desk: Desk, tone: Colours) -> None:
        super().__init__(desk, tone)
        self.counted = plain_label()
        self.column.addWidget(self.counted)
        self.list = QListWidget()
        self.list.setAccessibleName("Findings to settle")
        self.list.setWordWrap(True)
        self.list.setAlternatingRowColors(True)
        self.list.itemActivated.connect(self._picked)
        self.list.itemClicked.connect(self._picked)
        self.column.addWidget(self.list, 1)

    def show_campaign(self) -> None:
        self.list.clear()
        campaign, assessment = self.desk.campaign, self.desk.assessment
        if campaign is None:
            return
        for refusal in campaign.refused:
            self.list.addItem(QListWidgetItem(f"■  {refusal.file}, refused: {refusal.reason}"))
        number = 0
        for reading in assessment.readings if assessment else ():
            for finding in reading.findings:
                if finding.severity is Severity.NOTE:
                    continue
                number += 1
                where = f"{reading.panel}, {reading.exposure_h:g} h"
                item = QListWidgetItem(f"{_MARKS[finding.severity]}  {where}: {finding.text}")
                item.setData(Qt.ItemDataRole.UserRole, reading.reading_id)
                self.list.addItem(item)
        refused = len(campaign.refused)
        self.counted.setText(
            f"{number} findings on readings, {refused} files refused. Pick one to see its spectrum."
            if assessment
            else self.desk.unjudged_words()
        )

    def _picked(self, item: QListWidgetItem) -> None:
        reading_id = item.data(Qt.ItemDataRole.UserRole)
        if reading_id:
            self.desk.select(str(reading_id))
