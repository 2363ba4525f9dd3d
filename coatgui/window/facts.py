"""The facts of the selection, in sentences with limits."""

from __future__ import annotations

from dataclasses import dataclass

from PySide6.QtCore import QEvent, QObject, Qt, Signal
from PySide6.QtWidgets import QLabel, QScrollArea, QVBoxLayout, QWidget

from coatgui.records import Assessment, Bound, Campaign, Quantity, Reading, ReadingAssessment
from coatgui.window.numbers import said
from coatgui.window.places.place import plain_label
from coatgui.window.seen import rating_words


@dataclass(frozen=True)
class Fact:
    """A line of the column: `kind` is title, name, value, note or caution. `code` names the number
    in it whose origin can be asked for."""

    kind: str
    text: str
    code: str = ""


def facts(reading: ReadingAssessment | None, assessment: Assessment | None) -> list[Fact]:
    """What a colleague would say about the picked reading and its panel."""
    if reading is None or assessment is None:
        return []
    lines = [
        Fact("title", f"{reading.panel}, {reading.exposure_h:g} h"),
        Fact("note", reading.formulation),
    ]
    if not reading.counts:
        lines.append(Fact("value", "■ This reading is kept out of every conclusion."))
    for modulus in reading.modulus:
        name = f"|Z|·A at {modulus.frequency_hz:g} Hz"
        if modulus.quantity is None:
            lines += [Fact("name", name), Fact("value", "not reached by the sweep")]
        else:
            status = modulus.status.value.replace("_", " ")
            lines += _said(name, modulus.quantity, f"modulus_{modulus.frequency_hz:g}", status)
    lines += _said("Film capacitance", reading.coating_capacitance, "coating_capacitance")
    water = reading.water_uptake.quantity if reading.water_uptake else None
    lines += _said("Apparent water uptake", water, "water_uptake")
    pores = reading.pore_resistance
    if pores is not None:
        note = pores.method if pores.bound is Bound.AT_LEAST else ""
        lines += _said("Pore resistance", pores, "pore_resistance", note)
    panel = next((p for p in assessment.panels if p.panel_id == reading.panel_id), None)
    if panel is not None:
        told = [event.text for event in panel.events]
        told += [crossing.text for crossing in panel.limit_crossings]
        if told:
            lines.append(Fact("name", f"Panel {panel.panel} so far"))
            lines += [Fact("value", text) for text in told]
    lines += [Fact("caution", text) for text in assessment.cautions[:1]]
    return lines


def seen_facts(campaign: Campaign, reading: Reading) -> list[Fact]:
    """What was seen on the panel at this inspection."""
    here = reading.panel_id, reading.exposure_h
    lines = [
        Fact("value", rating_words(r.seen).partition(": ")[2].replace("\n", "; "))
        for r in campaign.ratings
        if (r.seen.panel_id, r.seen.exposure_h) == here
    ]
    for photograph in campaign.photographs:
        if (photograph.panel_id, photograph.exposure_h) == here:
            name = photograph.caption or photograph.file
            lines.append(Fact("value", f"Photograph: {name}" if name else "A photograph"))
    if not lines:
        return []
    note = Fact("note", "Ctrl+R shows ratings and photographs.")
    return [Fact("name", "Seen at this inspection"), *lines, note]


def _said(name: str, quantity: Quantity | None, code: str, note: str | None = None) -> list[Fact]:
    if quantity is None:
        return []
    note = quantity.method if note is None else note
    lines = [Fact("name", name), Fact("value", said(quantity), code)]
    return [*lines, Fact("note", note)] if note else lines


class FactsView(QScrollArea):
    """The column of facts, as labels that can be selected and copied. `asked` carries the code of a
    number that was clicked: where does it come from?"""

    asked = Signal(str)

    def __init__(self) -> None:
        super().__init__()
        self.setWidgetResizable(True)
        self.setObjectName("facts")
        self.setHorizontalScrollBarPolicy(Qt.ScrollBarPolicy.ScrollBarAlwaysOff)
        self.setAccessibleName("Facts of the selection")
        page = QWidget()
        self._column = QVBoxLayout(page)
        self._column.setContentsMargins(12, 12, 12, 12)
        self._column.setSpacing(0)
        self._column.addStretch(1)
        self._labels: list[QLabel] = []
        self._shown: list[Fact] = []
        self.setWidget(page)

    def show_facts(self, lines: list[Fact]) -> None:
        self._shown = lines
        while len(self._labels) < len(lines):
            label = plain_label()
            label.installEventFilter(self)
            self._column.insertWidget(len(self._labels), label)
            self._labels.append(label)
        for number, label in enumerate(self._labels):
            label.setVisible(number < len(lines))
            if number >= len(lines):
                continue
            fact = lines[number]
            if label.objectName() != f"fact_{fact.kind}":
                label.setObjectName(f"fact_{fact.kind}")
                label.style().unpolish(label)
                label.style().polish(label)
            top = {"title": 0, "name": 12, "value": 2, "note": 2, "caution": 16}[fact.kind]
            label.setContentsMargins(0, top, 0, 0)
            label.setText(fact.text)
            label.setToolTip("Click: where does this number come from?" if fact.code else "")
        self.setAccessibleDescription(self.text())

    def eventFilter(self, watched: QObject, event: QEvent) -> bool:
        if event.type() == QEvent.Type.MouseButtonRelease and watched in self._labels:
            label = self._labels[self._labels.index(watched)]
            fact = self._shown[self._labels.index(label)]
            if fact.code and not label.hasSelectedText():
                self.asked.emit(fact.code)
        return False

    def text(self) -> str:
        """All of it, a line each."""
        return "\n".join(fact.text for fact in self._shown)
