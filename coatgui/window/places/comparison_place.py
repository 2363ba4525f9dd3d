"""Comparison: the formulations side by side, in words first, then as intervals, then in tables."""

from __future__ import annotations

from PySide6.QtCore import Qt
from PySide6.QtGui import QColor
from PySide6.QtWidgets import (
    QComboBox,
    QHBoxLayout,
    QScrollArea,
    QTableWidget,
    QTableWidgetItem,
    QVBoxLayout,
    QWidget,
)

from coatgui.assessment.ranking import answer
from coatgui.assessment.rules import default_criteria
from coatgui.records import (
    Assessment,
    Comparison,
    Criterion,
    Judge,
    Limit,
    Question,
    ReadingAssessment,
    Settings,
)
from coatgui.window.desk import Desk
from coatgui.window.difference_plot import DifferencePlot
from coatgui.window.numbers import said
from coatgui.window.palette import Colours
from coatgui.window.places.place import Place, plain_label, plain_tip
from coatgui.window.sheet import sheet
from coatgui.window.typed import written

_OTHERS = {
    "Pore resistance": "pore_resistance",
    "Film capacitance": "coating_capacitance",
    "Apparent water uptake": "water_uptake",
}
_AT_TIME, _AREA = "At one inspection", "Over the whole course"
_LAST = "The last that all share"
_PAIR_ROWS = 6


def by_formulation(assessment: Assessment) -> dict[str, list[ReadingAssessment]]:
    """The readings of each formulation that has any that count."""
    found: dict[str, list[ReadingAssessment]] = {}
    for formulation in assessment.formulations:
        own = [r for r in assessment.readings if r.formulation == formulation.formulation]
        if any(r.counts for r in own):
            found[formulation.formulation] = own
    return found


class ComparisonPlace(Place):
    noun, question = "Comparison", "Which is better, and are we sure?"
    note = "welch"
    has_strip = False

    def __init__(self, desk: Desk, tone: Colours) -> None:
        super().__init__(desk, tone)
        self.comparison: Comparison | None = None
        bar = QHBoxLayout()
        self.quantity = _chooser("Compared by which quantity", "What the formulations are held by")
        self.judge = _chooser("Compared how", "At one time, over the course, or by a limit")
        self.time = _chooser("Compared at which exposure time", "The inspection that is compared")
        for chooser in (self.quantity, self.judge, self.time):
            chooser.activated.connect(self._answer)
            bar.addWidget(chooser)
        bar.addStretch(1)
        self.column.addLayout(bar)
        self.words = plain_label("headline")
        self.judged = plain_label("small")
        self.column.addWidget(self.words)
        self.column.addWidget(self.judged)
        self.plot = DifferencePlot()
        self.column.addWidget(self.plot, 3)
        tables = QHBoxLayout()
        tables.setSpacing(12)
        self.ranks = sheet(
            ("formulation", "place", "group", "in 95 of 100 draws"),
            "Places of the formulations",
            "Formulations that share a letter cannot be told apart",
        )
        self.pairs = sheet(
            ("pair", "difference", "", "p corrected", "p alone"),
            "Pairs of formulations",
            "Difference of the first less the second, and how probable it is by chance",
        )
        tables.addWidget(self.ranks, 5)
        tables.addWidget(self.pairs, 9)
        self.column.addLayout(tables, 2)
        page = QWidget()
        column = QVBoxLayout(page)
        column.setContentsMargins(0, 0, 8, 0)
        self.more = plain_label()
        self.more.setAlignment(Qt.AlignmentFlag.AlignTop)
        column.addWidget(self.more)
        column.addStretch(1)
        area = QScrollArea()
        area.setWidget(page)
        area.setWidgetResizable(True)
        area.setAccessibleName("Limits, courses, what to do next")
        area.setAccessibleDescription("Up and down scroll")
        self.column.addWidget(area, 3)

    # --- the question ----------------------------------------------------------------------

    def _settings(self) -> Settings:
        return Settings() if self.desk.campaign is None else self.desk.campaign.settings

    def _offer(self, assessment: Assessment) -> None:
        """Refill the choices, keeping what was chosen where it is still there."""
        frequencies = self._settings().modulus_frequencies_hz
        criteria = self._settings().criteria or default_criteria()
        times = sorted({r.exposure_h for r in assessment.readings if r.counts})
        for chooser, entries in (
            (
                self.quantity,
                [
                    *((f"|Z|·A at {f:g} Hz", ("modulus", f)) for f in frequencies),
                    *((name, (code, None)) for name, code in _OTHERS.items()),
                ],
            ),
            (
                self.judge,
                [
                    (_AT_TIME, Judge.AT_TIME),
                    (_AREA, Judge.AREA_UNDER_COURSE),
                    *((f"Time to {c.name} ({written(c.ohm_cm2, 'Ω cm²')})", c) for c in criteria),
                ],
            ),
            (self.time, [(_LAST, None), *((f"{t:g} h", t) for t in times)]),
        ):
            before = chooser.currentText()
            chooser.clear()
            for name, data in entries:
                chooser.addItem(name, data)
            chooser.setCurrentIndex(max(chooser.findText(before), 0))

    def asked(self) -> Question:
        """The question as it is chosen."""
        quantity, frequency = self.quantity.currentData()
        chosen = self.judge.currentData()
        if isinstance(chosen, Criterion):
            limit = Limit.of_criterion(chosen)
            return Question("modulus", limit.frequency_hz, Judge.TIME_TO_LIMIT, limit=limit)
        judge = Judge(chosen)  # Qt keeps it as a text
        time = self.time.currentData() if judge is Judge.AT_TIME else None
        return Question(quantity, frequency, judge, exposure_h=time)

    def show_campaign(self) -> None:
        assessment = self.desk.assessment
        if assessment is None:
            self.comparison = None
            self.words.setText(self.desk.unjudged_words())
            self.judged.setText("")
            self._show([])
            return
        self._offer(assessment)
        self._answer()

    def _answer(self) -> None:
        assessment = self.desk.assessment
        if assessment is None:
            return
        question = self.asked()
        by_limit = question.judge is Judge.TIME_TO_LIMIT
        self.quantity.setEnabled(not by_limit)
        self.time.setEnabled(question.judge is Judge.AT_TIME)
        usual = assessment.comparison
        if usual is not None and usual.question == question:
            self.comparison = usual
        else:
            try:
                self.comparison = answer(question, by_formulation(assessment))
            except ValueError as error:
                self.comparison = Comparison(question, "", None, (), (), str(error))
        # The first sentence says who is ahead; what it was judged by stands smaller.
        first, parting, rest = self.comparison.text.partition(". Judged by ")
        self.words.setText(first + ("." if parting else ""))
        self.judged.setText(f"Judged by {rest}" if parting else "")
        self._show(_more(assessment, self.comparison))

    # --- what is shown ---------------------------------------------------------------------

    def _show(self, more: list[str]) -> None:
        found = self.comparison
        pairs = () if found is None else found.pairs
        self.plot.show_pairs(pairs, self.tone)
        self.more.setText("\n".join(more))
        ranks = () if found is None else found.ranks
        _fill(
            self.ranks,
            [
                (
                    (r.formulation, _span(r.rank_low, r.rank_high), r.group,
                     _span(r.bootstrap_low, r.bootstrap_high)),
                    True,
                )
                for r in ranks
            ],
            self.tone,
        )  # fmt: skip
        _fill(
            self.pairs,
            [
                (
                    (f"{p.first} − {p.second}", said(p.difference),
                     "told apart" if p.differ else "not told apart", f"{p.adjusted:.2g}",
                     f"{p.probability:.2g}"),
                    p.differ,
                )
                for p in pairs
            ],
            self.tone,
        )  # fmt: skip
        for table in (self.ranks, self.pairs):
            table.setVisible(table.rowCount() > 0)

    def figure(self) -> list[QWidget]:
        return [self.plot] if self.plot.isVisible() else []

    def caption(self) -> str:
        return "" if self.comparison is None else self.comparison.text

    def data_rows(self) -> list[list[object]]:
        rows: list[list[object]] = [
            ["first", "second", "difference", "low", "high", "unit", "probability", "adjusted",
             "told_apart"]
        ]  # fmt: skip
        for p in () if self.comparison is None else self.comparison.pairs:
            q = p.difference
            numbers = (q.value, q.low, q.high, q.unit) if q else (None, None, None, "")
            apart = "yes" if p.differ else "no"
            rows.append([p.first, p.second, *numbers, p.probability, p.adjusted, apart])
        return rows


def _more(assessment: Assessment, comparison: Comparison) -> list[str]:
    """What it would take, what to do next, the limits, the courses: a line each."""
    lines = [*comparison.effort]
    if assessment.next_inspection is not None:
        lines.append(assessment.next_inspection.text)
    lines += [study.text for study in assessment.limit_studies]
    lines += [trend.text for trend in assessment.trends]
    return [f"◦  {line}" for line in lines if line]


def _span(low: int | None, high: int | None) -> str:
    if low is None or high is None:
        return "–"
    return f"{low}" if low == high else f"{low} to {high}"


def _fill(table: QTableWidget, rows: list[tuple[tuple[str, ...], bool]], tone: Colours) -> None:
    table.setRowCount(len(rows))
    for i, (texts, strong) in enumerate(rows):
        for j, text in enumerate(texts):
            item = QTableWidgetItem(text)
            item.setForeground(QColor(tone.ink if strong else tone.second))
            item.setToolTip(plain_tip(text))
            table.setItem(i, j, item)
    table.setFixedHeight(36 + 24 * max(min(len(rows), _PAIR_ROWS), 1))


def _chooser(name: str, description: str) -> QComboBox:
    chooser = QComboBox()
    chooser.setAccessibleName(name)
    chooser.setAccessibleDescription(description)
    return chooser
