"""Comparison: the words, the picture and the tables say the same, whatever is asked."""

from __future__ import annotations

from collections.abc import Callable

import pytest

pytest.importorskip("PySide6")

import pyqtgraph as pg
from PySide6.QtWidgets import QApplication, QComboBox, QTableWidget

from coatgui.campaign import operations
from coatgui.records import Judge, VisualRating
from coatgui.window.main_window import MainWindow
from coatgui.window.numbers import said
from coatgui.window.places.comparison_place import ComparisonPlace

Wait = Callable[[Callable[[], bool]], None]


def place_of(window: MainWindow) -> ComparisonPlace:
    window.go_to("Comparison")
    QApplication.processEvents()
    place = window.places[window.stack.currentIndex()]
    assert isinstance(place, ComparisonPlace)
    return place


def choose(chooser: QComboBox, words: str) -> None:
    index = chooser.findText(words)
    assert index >= 0
    chooser.setCurrentIndex(index)
    chooser.activated.emit(index)
    QApplication.processEvents()


def cell(table: QTableWidget, row: int, column: int) -> str:
    item = table.item(row, column)
    assert item is not None
    return item.text()


def test_the_usual_question_is_answered_as_in_the_files(sample: MainWindow) -> None:
    place = place_of(sample)
    assessment = sample.desk.assessment
    assert assessment is not None
    assert place.comparison is assessment.comparison
    whole = f"{place.words.text()} {place.judged.text()}"
    assert whole == assessment.ranking_text
    assert [cell(place.ranks, row, 0) for row in range(3)] == [
        rank.formulation for rank in assessment.ranking
    ]
    assert place.more.text().count("◦") >= len(assessment.limit_studies) + len(assessment.trends)


def test_the_picture_stands_on_the_pairs_of_the_table(sample: MainWindow) -> None:
    place = place_of(sample)
    assert place.comparison is not None
    pairs = place.comparison.pairs
    marks = [i for i in place.plot.items() if isinstance(i, pg.ScatterPlotItem)]
    drawn = sorted(float(m.getData()[0][0]) for m in marks)
    assert drawn == pytest.approx(sorted(float(p.difference.value) for p in pairs if p.difference))
    for row, pair in enumerate(pairs):
        assert cell(place.pairs, row, 1) == said(pair.difference)
        assert "mdec" not in cell(place.pairs, row, 1)
        assert cell(place.pairs, row, 2) == ("told apart" if pair.differ else "not told apart")
    assert len(place.data_rows()) == len(pairs) + 1


def test_another_quantity_and_time_can_be_asked_for(sample: MainWindow) -> None:
    place = place_of(sample)
    choose(place.quantity, "Apparent water uptake")
    choose(place.time, "24 h")
    assert place.comparison is not None
    assert place.comparison.question.quantity == "water_uptake"
    assert place.comparison.exposure_h == 24.0
    assert "24 h" in place.judged.text()
    assert "vol-%" in cell(place.pairs, 0, 1)
    choose(place.judge, "Over the whole course")
    assert place.comparison.question.judge is Judge.AREA_UNDER_COURSE
    assert not place.time.isEnabled()


def test_by_ranks_there_is_no_picture_but_words(sample: MainWindow) -> None:
    place = place_of(sample)
    choose(place.judge, "Time to Barrier limit (10 MΩ cm²)")
    assert place.comparison is not None
    assert place.comparison.question.judge is Judge.TIME_TO_LIMIT
    assert not place.plot.isVisible()
    assert place.figure() == []
    assert "cannot be told apart" in place.words.text()
    assert not place.quantity.isEnabled()


def test_what_was_asked_stays_asked_after_an_edit(sample: MainWindow, wait: Wait) -> None:
    place = place_of(sample)
    choose(place.quantity, "Pore resistance")
    choose(place.time, "72 h")
    before = place.comparison
    reading = sample.desk.reading()
    assert reading is not None
    sample.desk.edit(operations.leave_out_points, reading.reading_id, [0], "to see")
    wait(lambda: sample.desk.job is None)
    assert place.quantity.currentText() == "Pore resistance"
    assert place.time.currentText() == "72 h"
    assert place.comparison is not None
    assert before is not None
    assert place.comparison.question == before.question


def test_a_comparison_is_kept_taken_up_and_dropped(sample: MainWindow, wait: Wait) -> None:
    place = place_of(sample)
    assert not place.keep.isVisible()  # the usual one is kept anyway
    choose(place.quantity, "Film capacitance")
    choose(place.method, "Games–Howell")
    question = place.asked()
    assert place.comparison is not None
    text = place.comparison.text
    assert place.keep.isVisible()
    place.keep.click()
    wait(lambda: sample.desk.job is None)
    assert sample.desk.campaign is not None
    assert sample.desk.campaign.settings.comparisons == (question,)
    assert sample.desk.assessment is not None
    (further,) = sample.desk.assessment.further_comparisons
    assert place.comparison is further
    assert further.text == text
    assert not place.keep.isVisible()
    choose(place.kept, "The usual comparison")
    assert place.comparison is sample.desk.assessment.comparison
    choose(place.kept, place.kept.itemText(1))
    assert place.kept.itemText(1).endswith("coating capacitance at the last shared inspection, "
                                           "Games–Howell")  # fmt: skip
    assert place.comparison is further
    place.drop.click()
    wait(lambda: sample.desk.job is None)
    assert not sample.desk.campaign.settings.comparisons
    sample.undo()
    assert sample.desk.campaign.settings.comparisons == (question,)


def test_formulations_are_compared_by_what_was_seen(sample: MainWindow, wait: Wait) -> None:
    campaign = sample.desk.campaign
    assert campaign is not None
    seen = [
        VisualRating(p.panel_id, 672.0, "astm_d610", str(9 - 2 * place))
        for place, f in enumerate(campaign.formulations)
        for p in campaign.panels
        if p.formulation_id == f.formulation_id
    ]
    sample.desk.edit(operations.add_ratings, seen)
    wait(lambda: sample.desk.job is None)
    place = place_of(sample)
    choose(place.judge, "Rating: rust grade, ASTM D610")
    assert place.asked().judge is Judge.RATING
    assert place.asked().scale == "astm_d610"
    assert place.comparison is not None
    assert place.comparison.ranks
    assert not place.quantity.isEnabled()
