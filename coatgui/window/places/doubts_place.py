"""Doubts: what needs a person's eye, across the campaign. The list left, the evidence right, and
beneath it what can be done about it."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from PySide6.QtCore import Qt, Signal
from PySide6.QtGui import QBrush, QColor, QPen
from PySide6.QtWidgets import (
    QHBoxLayout,
    QInputDialog,
    QListWidget,
    QListWidgetItem,
    QPushButton,
    QSizePolicy,
    QSplitter,
    QVBoxLayout,
    QWidget,
)

from coatgui.campaign import operations
from coatgui.records import Finding, ReadingAssessment, Refusal, Severity
from coatgui.window.canvas import Canvas, Marks
from coatgui.window.desk import Desk
from coatgui.window.palette import Colours
from coatgui.window.places.place import Place, plain_label

_MARKS = {Severity.REJECT: "■", Severity.DOUBT: "▲"}


@dataclass(frozen=True, eq=False)
class Doubt:
    """A line of the list: a finding on a reading, or a file that was refused."""

    text: str
    reading: ReadingAssessment | None = None
    finding: Finding | None = None
    refusal: Refusal | None = None

    @property
    def rejects(self) -> bool:
        return self.finding is None or self.finding.severity is Severity.REJECT


class DoubtsPlace(Place):
    """`opened` asks for the reading's own place."""

    noun, question = "Doubts", "What needs a person's eye?"
    promise = "Findings to settle, and files that were refused, stand here."
    note = "kramers_kronig"
    has_strip = False
    opened = Signal()

    def __init__(self, desk: Desk, tone: Colours) -> None:
        self.doubts: list[Doubt] = []
        super().__init__(desk, tone)
        self.counted = plain_label()
        self.column.addWidget(self.counted)
        self.list = QListWidget()
        self.list.setAccessibleName("Findings to settle")
        self.list.setAccessibleDescription("Up and down pick a finding, return opens its spectrum")
        self.list.setWordWrap(True)
        self.list.setSpacing(3)
        self.list.setHorizontalScrollBarPolicy(Qt.ScrollBarPolicy.ScrollBarAlwaysOff)
        self.list.currentRowChanged.connect(self._show_evidence)
        self.list.itemActivated.connect(lambda _item: self._open())
        splitter = QSplitter()
        splitter.setHandleWidth(1)
        splitter.addWidget(self.list)
        splitter.addWidget(self._evidence())
        splitter.setSizes([440, 380])
        self.column.addWidget(splitter, 1)

    def _evidence(self) -> QWidget:
        page = QWidget()
        column = QVBoxLayout(page)
        column.setContentsMargins(12, 0, 0, 0)
        self.heading = plain_label("question")
        self.words = plain_label()
        self.numbers = plain_label("small")
        self.plot = Canvas("Evidence: modulus", ("frequency", "Hz"), ("|Z| of the specimen", "Ω"))
        self._points, self._meant = Marks(size=6), Marks(size=12)
        self.plot.add(self._points, self._meant)
        for label in (self.heading, self.words, self.numbers):
            label.setSizePolicy(QSizePolicy.Policy.Preferred, QSizePolicy.Policy.Maximum)
            column.addWidget(label)
        column.addWidget(self.plot, 1000)
        column.addStretch(1)
        row = QHBoxLayout()
        self.see = QPushButton("Open the spectrum")
        self.leave = QPushButton("Leave these points out")
        self.overrule = QPushButton("Use it all the same…")
        self.dismiss = QPushButton("Dismiss")
        for button, call, tip in (
            (self.see, self._open, "Show this reading with its fit"),
            (self.leave, self._leave_out, "Leave out the points this finding is about"),
            (self.overrule, self._overrule, "Give a reason for using a rejected reading"),
            (self.dismiss, self._dismiss, "Take the refused file off the list; it can be undone"),
        ):
            button.clicked.connect(lambda _checked=False, do=call: do())
            button.setAccessibleDescription(tip)
            button.setToolTip(tip)
            row.addWidget(button)
        row.addStretch(1)
        column.addLayout(row)
        return page

    def show_campaign(self) -> None:
        campaign, assessment = self.desk.campaign, self.desk.assessment
        row = self.list.currentRow()
        self.list.blockSignals(True)
        self.list.clear()
        self.doubts = []
        for refusal in campaign.refused if campaign else ():
            self.doubts.append(Doubt(f"{refusal.file}: {refusal.reason}", refusal=refusal))
        for reading in assessment.readings if assessment else ():
            for finding in reading.findings:
                if finding.severity is not Severity.NOTE:
                    where = f"{reading.panel}, {reading.exposure_h:g} h"
                    self.doubts.append(Doubt(f"{where}: {finding.text}", reading, finding))
        for doubt in self.doubts:
            mark = _MARKS[doubt.finding.severity] if doubt.finding else "■"
            item = QListWidgetItem(f"{mark}  {doubt.text}")
            item.setForeground(QBrush(QColor(self.tone.rust if doubt.rejects else self.tone.ink)))
            self.list.addItem(item)
        self.list.blockSignals(False)
        self._count()
        self.settle()
        self.list.setCurrentRow(min(max(row, 0), len(self.doubts) - 1))
        self._show_evidence()

    def settle(self) -> None:
        """An empty list says what would be on it."""
        campaign = self.desk.campaign
        if campaign is None or campaign.refused or (self.desk.assessment and self.doubts):
            self.show_content()
        elif not campaign.readings:
            self.lack_files()
        elif self.desk.assessment is None:
            self.lack_judging()
        else:
            self.show_empty(f"Nothing needs a person's eye. {self.promise}", "", None)

    def _count(self) -> None:
        refused = sum(1 for doubt in self.doubts if doubt.refusal)
        number = len(self.doubts) - refused
        findings = "1 finding" if number == 1 else f"{number} findings"
        files = "1 file refused" if refused == 1 else f"{refused} files refused"
        if self.desk.assessment is None:
            self.counted.setText(f"{self.desk.unjudged_words()} {files}." if refused else "")
        elif self.doubts:
            self.counted.setText(f"{findings} on readings, {files}.")
        else:
            self.counted.setText("Nothing needs a person's eye.")

    def _doubt(self) -> Doubt | None:
        row = self.list.currentRow()
        return self.doubts[row] if 0 <= row < len(self.doubts) else None

    def topic(self) -> str:
        doubt = self._doubt()
        return doubt.finding.code if doubt is not None and doubt.finding is not None else self.note

    def _show_evidence(self, _row: int = -1) -> None:
        doubt = self._doubt()
        reading = doubt.reading if doubt else None
        finding = doubt.finding if doubt else None
        self.see.setVisible(reading is not None)
        self.leave.setVisible(finding is not None and bool(self._still_used(doubt)))
        self.overrule.setVisible(finding is not None and finding.severity is Severity.REJECT)
        self.dismiss.setVisible(doubt is not None and doubt.refusal is not None)
        self.plot.setVisible(reading is not None)
        self.heading.setText("")
        self.words.setText("")
        self.numbers.setText("")
        if doubt is None:
            return
        if doubt.refusal is not None:
            self.heading.setText(doubt.refusal.file)
            self.words.setText(doubt.refusal.reason)
            return
        if reading is None or finding is None:
            return
        self.heading.setText(f"{reading.panel}, {reading.exposure_h:g} h")
        self.words.setText(finding.text)
        self.numbers.setText(
            "   ".join(f"{name.replace('_', ' ')} {value:.3g}" for name, value in finding.evidence)
        )
        self._draw(reading, finding)

    def _draw(self, reading: ReadingAssessment, finding: Finding) -> None:
        campaign, tone = self.desk.campaign, self.tone
        record = (
            next((r for r in campaign.readings if r.reading_id == reading.reading_id), None)
            if campaign
            else None
        )
        self.plot.paint_in(tone.ground, tone.second, tone.line)
        if record is None:
            return
        x = np.log10(record.spectrum.frequency_hz)
        y = np.log10(np.maximum(np.abs(record.spectrum.impedance_ohm), 1e-30))
        meant = np.array([p for p in finding.points if p < x.size], dtype=int)
        self._points.show(x, y, QPen(QColor(tone.slate), 1))
        self._meant.show(x[meant], y[meant], QPen(QColor(tone.rust), 2))
        self.plot.show_range(
            (float(x.min()), float(x.max())), (float(y.min()), float(y.max())), 0.06
        )

    # --- what can be done ------------------------------------------------------------------

    def _still_used(self, doubt: Doubt | None) -> list[int]:
        """The finding's points that no one has left out yet."""
        if doubt is None or doubt.finding is None or doubt.reading is None:
            return []
        campaign = self.desk.campaign
        records = campaign.readings if campaign else ()
        record = next((r for r in records if r.reading_id == doubt.reading.reading_id), None)
        gone = {point for point, _ in record.left_out} if record else set()
        return [point for point in doubt.finding.points if point not in gone]

    def _open(self) -> None:
        doubt = self._doubt()
        if doubt is not None and doubt.reading is not None:
            self.desk.select(doubt.reading.reading_id)
            self.opened.emit()

    def _leave_out(self) -> None:
        doubt = self._doubt()
        points = self._still_used(doubt)
        if doubt is not None and doubt.reading is not None and doubt.finding is not None and points:
            reason = doubt.finding.code.replace("_", " ")
            self.desk.edit(operations.leave_out_points, doubt.reading.reading_id, points, reason)

    def _overrule(self) -> None:
        doubt = self._doubt()
        if doubt is None or doubt.reading is None:
            return
        reason, given = QInputDialog.getText(
            self, "Use it all the same", f"Why {doubt.reading.panel} at "
            f"{doubt.reading.exposure_h:g} h may be used:",
        )  # fmt: skip
        if given and reason.strip():
            self.desk.edit(operations.overrule, doubt.reading.reading_id, reason)

    def _dismiss(self) -> None:
        doubt = self._doubt()
        if doubt is not None and doubt.refusal is not None:
            self.desk.edit(operations.dismiss_refusals, [doubt.refusal])
