"""Comparison: the formulations side by side, in words first, then as intervals, then in tables."""

from __future__ import annotations

from PySide6.QtCore import Qt
from PySide6.QtGui import QColor
from PySide6.QtWidgets import (
    QComboBox,
    QHBoxLayout,
    QPushButton,
    QScrollArea,
    QTableWidget,
    QTableWidgetItem,
    QVBoxLayout,
    QWidget,
)

from coatgui.assessment.decide import answer_beside
from coatgui.assessment.ratings import scales
from coatgui.assessment.rules import default_criteria
from coatgui.campaign import operations
from coatgui.records import (
    Assessment,
    Comparison,
    Judge,
    Limit,
    Method,
    Question,
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
_RATING = "rating by "
_USUAL = "The usual comparison"
_METHODS = {
    "Welch, Holm": Method.WELCH,
    "Games–Howell": Method.GAMES_HOWELL,
    "Tukey–Kramer": Method.TUKEY,
    "Dunnett, against the first": Method.DUNNETT,
    "Ranks, exact": Method.RANKS,
    "Dunn, on ranks": Method.DUNN,
}


def in_words(question: Question) -> str:
    """A question as a short line."""
    what = question.quantity.replace("_", " ")
    if question.frequency_hz is not None:
        what = f"|Z|·A at {question.frequency_hz:g} Hz"
    when = "at the last shared inspection"
    if question.exposure_h is not None:
        when = f"at {question.exposure_h:g} h"
    if question.judge is Judge.AREA_UNDER_COURSE:
        when = "over the whole course"
    elif question.judge is Judge.TIME_TO_LIMIT:
        what, when = "time", f"to {question.limit.name}" if question.limit else ""
    elif question.judge is Judge.RATING:
        what = str(scales().get(question.scale, {}).get("name", question.scale))
    by = next((words for words, m in _METHODS.items() if m is question.method), "")
    return f"{what} {when}, {by}"


class ComparisonPlace(Place):
    noun, question = "Comparison", "Which is better, and are we sure?"
    needs = "assessment"
    promise = "Here the formulations will stand side by side, in words first."
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
        self.method = _chooser("Compared by which test", "How pairs of formulations are tested")
        self.method.activated.connect(self._answer)
        bar.addWidget(self.method)
        bar.addStretch(1)
        self.column.addLayout(bar)
        keeping = QHBoxLayout()
        self.kept = _chooser(
            "Comparisons that are kept", "Kept ones are answered in the summary and the workbook"
        )
        self.kept.activated.connect(self._take_up)
        self.keep = QPushButton("Keep this comparison")
        self.keep.setAccessibleDescription("Answer it in the summary and the workbook, too")
        self.keep.clicked.connect(lambda _checked=False: self._keep())
        self.drop = QPushButton("Keep it no longer")
        self.drop.setAccessibleDescription("Take this comparison out of the campaign")
        self.drop.clicked.connect(lambda _checked=False: self._drop())
        for widget in (self.kept, self.keep, self.drop):
            keeping.addWidget(widget)
        keeping.addStretch(1)
        self.column.addLayout(keeping)
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
        limits = self._settings().limits
        rated = {r.scale: str(scales()[r.scale]["name"]) for r in assessment.ratings}
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
                    *(
                        (f"Time to {c.name} ({written(c.ohm_cm2, 'Ω cm²')})", Limit.of_criterion(c))
                        for c in criteria
                    ),
                    *((f"Time to {c.name} ({c.value:g} {c.unit})", c) for c in limits),
                    *((f"Rating: {rated[r]}", f"{_RATING}{r}") for r in rated),
                ],
            ),
            (self.method, list(_METHODS.items())),
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
        chosen, method = self.judge.currentData(), Method(self.method.currentData())
        reference = self._reference() if method is Method.DUNNETT else ""
        time = self.time.currentData()
        if isinstance(chosen, Limit):
            return Question(
                chosen.quantity, chosen.frequency_hz, Judge.TIME_TO_LIMIT, method, None, chosen,
                reference=reference,
            )  # fmt: skip
        if str(chosen).startswith(_RATING):
            scale = str(chosen).removeprefix(_RATING)
            return Question(
                "modulus", frequency or self._settings().modulus_frequencies_hz[0], Judge.RATING,
                method, time, scale=scale, reference=reference,
            )  # fmt: skip
        judge = Judge(chosen)  # Qt keeps it as a text
        return Question(
            quantity, frequency, judge, method, time if judge is Judge.AT_TIME else None,
            reference=reference,
        )  # fmt: skip

    def _reference(self) -> str:
        """What the others are held against: the first formulation of the campaign."""
        campaign = self.desk.campaign
        return campaign.formulations[0].name if campaign and campaign.formulations else ""

    def _offer_kept(self) -> None:
        """The usual comparison and those that the campaign keeps."""
        kept = self._settings().comparisons
        row = self.kept.currentIndex()
        self.kept.clear()
        self.kept.addItem(_USUAL)
        self.kept.addItems([f"Kept: {in_words(question)}" for question in kept])
        self.kept.setVisible(bool(kept))
        self.kept.setCurrentIndex(row if 0 <= row < self.kept.count() else 0)

    def _take_up(self, row: int) -> None:
        """Choose what a kept comparison asks."""
        kept = self._settings().comparisons
        usual = self.desk.assessment.comparison if self.desk.assessment else None
        question = kept[row - 1] if row > 0 else usual.question if usual else Question()
        judge: object = question.judge
        if question.judge is Judge.TIME_TO_LIMIT:
            judge = question.limit
        elif question.judge is Judge.RATING:
            judge = f"{_RATING}{question.scale}"
        for chooser, wanted in (
            (self.quantity, (question.quantity, question.frequency_hz)),
            (self.judge, judge),
            (self.method, question.method),
            (self.time, question.exposure_h),
        ):
            found = [i for i in range(chooser.count()) if _same(chooser.itemData(i), wanted)]
            chooser.setCurrentIndex(found[0] if found else 0)
        self._answer()

    def _keep(self) -> None:
        kept = self._settings().comparisons
        question = self.asked()
        self.desk.edit(operations.edit_settings, comparisons=(*kept, question))
        now = self._settings().comparisons
        if question in now:
            self.kept.setCurrentIndex(1 + now.index(question))

    def _drop(self) -> None:
        question = self.asked()
        left = tuple(q for q in self._settings().comparisons if q != question)
        self.desk.edit(operations.edit_settings, comparisons=left)

    def show_campaign(self) -> None:
        assessment = self.desk.assessment
        if assessment is None:
            self.comparison = None
            self.words.setText(self.desk.unjudged_words())
            self.judged.setText("")
            self._show([])
            return
        self._offer(assessment)
        self._offer_kept()
        self._answer()

    def _answer(self) -> None:
        assessment = self.desk.assessment
        if assessment is None:
            return
        question = self.asked()
        measured = question.judge in (Judge.AT_TIME, Judge.AREA_UNDER_COURSE)
        self.quantity.setEnabled(measured)
        self.time.setEnabled(question.judge in (Judge.AT_TIME, Judge.RATING))
        kept = question in self._settings().comparisons
        usual = assessment.comparison
        self.drop.setVisible(kept)
        self.keep.setVisible(not kept and (usual is None or usual.question != question))
        known = [c for c in (usual, *assessment.further_comparisons) if c is not None]
        campaign = self.desk.campaign
        self.comparison = next((c for c in known if c.question == question), None)
        if self.comparison is None and campaign is not None:
            self.comparison = answer_beside(campaign, assessment, question)
        if self.comparison is None:
            return
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


def _same(data: object, wanted: object) -> bool:
    """Qt keeps a pair as a list."""
    if isinstance(data, (list, tuple)) and isinstance(wanted, tuple):
        return tuple(data) == wanted
    return data == wanted


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
