"""The question "Where does this number come from?" beside the place that is open."""

from __future__ import annotations

from PySide6.QtWidgets import QComboBox, QFrame, QVBoxLayout, QWidget

from coatgui.campaign import CampaignFileError
from coatgui.window.desk import Desk
from coatgui.window.facts import Fact, FactsView
from coatgui.window.origin import Number, numbers_of, trace
from coatgui.window.places.place import plain_label


class OriginView(QWidget):
    """A chooser of the picked reading's numbers, and the trace of the chosen one."""

    def __init__(self, desk: Desk) -> None:
        super().__init__()
        self.desk = desk
        column = QVBoxLayout(self)
        column.setContentsMargins(0, 8, 0, 0)
        self.question = plain_label("small")
        self.question.setContentsMargins(12, 0, 12, 0)
        self.question.setText("Where does this number come from?")
        self.chooser = QComboBox()
        self.chooser.setAccessibleName("Number whose origin is shown")
        self.chooser.setAccessibleDescription("The numbers of the picked reading")
        self.chooser.setSizeAdjustPolicy(
            QComboBox.SizeAdjustPolicy.AdjustToMinimumContentsLengthWithIcon
        )
        self.chooser.setMinimumContentsLength(12)
        holder = QVBoxLayout()
        holder.setContentsMargins(12, 0, 12, 0)
        holder.addWidget(self.chooser)
        self.steps = FactsView()
        self.steps.setAccessibleName("Steps from the file to the number")
        self.steps.setFrameShape(QFrame.Shape.NoFrame)
        column.addWidget(self.question)
        column.addLayout(holder)
        column.addWidget(self.steps, 1)
        self.steps.show_facts([Fact("note", "No reading is picked.")])
        self.numbers: list[Number] = []
        self.chooser.currentIndexChanged.connect(self._show)

    def refresh(self) -> None:
        """Follow the desk's selection; the same number stays chosen."""
        known = self.desk.reading_assessment()
        chosen = self.chooser.currentData()
        self.numbers = [] if known is None else numbers_of(known)
        self.chooser.blockSignals(True)
        self.chooser.clear()
        for number in self.numbers:
            self.chooser.addItem(number.name, number.code)
        self.chooser.setCurrentIndex(max(self.chooser.findData(chosen), 0))
        self.chooser.blockSignals(False)
        self._show()

    def ask(self, code: str) -> None:
        """Show the origin of one number."""
        place = self.chooser.findData(code)
        if place >= 0:
            self.chooser.setCurrentIndex(place)

    def _show(self) -> None:
        reading, known = self.desk.reading(), self.desk.reading_assessment()
        campaign, assessment = self.desk.campaign, self.desk.assessment
        place = self.chooser.currentIndex()
        if reading is None or known is None or campaign is None or assessment is None:
            self.steps.show_facts([Fact("note", self.desk.unjudged_words())])
            return
        if not 0 <= place < len(self.numbers):
            self.steps.show_facts([Fact("note", "This reading gave no number.")])
            return
        panel = next((p for p in campaign.panels if p.panel_id == reading.panel_id), None)
        of_panel = next((p for p in assessment.panels if p.panel_id == reading.panel_id), None)
        taken = campaign.settings.take_leads_away
        lines = []
        for step in trace(self.numbers[place], reading, known, panel, of_panel, taken):
            text = step.text
            if step.title == "File":
                text += f"\n{self._kept(reading.source.sha256)}"
            lines += [Fact("name", step.title), Fact("value", text)]
        self.steps.show_facts(lines)

    def _kept(self, sha256: str) -> str:
        """Whether the bytes are in the campaign and still what they were."""
        try:
            data = None if self.desk.file is None else self.desk.file.raw(sha256)
        except CampaignFileError as problem:
            return str(problem)
        if data is None:
            return "The campaign does not hold the bytes of this file."
        return f"{len(data)} bytes are kept in the campaign, and their hash is this one."

    def text(self) -> str:
        return self.steps.text()
