"""Method notes: one key away, opened at what is looked at, and found by any word in them."""

from __future__ import annotations

import pytest

pytest.importorskip("PySide6")

from PySide6.QtCore import Qt
from PySide6.QtTest import QTest

from coatgui.notes import glossary, method_notes
from coatgui.window.actions import ACTIONS
from coatgui.window.help import NotesWindow
from coatgui.window.main_window import MainWindow


def shown(notes: NotesWindow) -> list[str]:
    branches = [notes.list.topLevelItem(i) for i in range(notes.list.topLevelItemCount())]
    return [
        branch.child(i).text(0)
        for branch in branches
        for i in range(branch.childCount())
        if not branch.child(i).isHidden()
    ]


def picked(window: MainWindow) -> str:
    notes = window.help.notes
    assert notes is not None
    assert notes.isVisible()
    item = notes.list.currentItem()
    assert item is not None
    return item.text(0)


def test_one_key_opens_the_notes() -> None:
    assert {e.shortcut for e in ACTIONS if e.method == "show_notes"} == {"F1"}


def test_notes_open_at_what_is_looked_at(sample: MainWindow) -> None:
    assessment = sample.desk.assessment
    assert assessment is not None
    for place, title in (
        ("Map", "Modulus at low frequency"),
        ("Water", "Apparent water uptake"),
        ("Comparison", "Comparison of formulations"),
        ("Course", "Trend and projection"),
    ):
        sample.go_to(place)
        sample.help.show_notes()
        assert picked(sample).startswith(title)
    closed = next(r for r in assessment.readings if r.fit and r.fit.model == "pores_to_metal")
    sample.desk.select(closed.reading_id)
    sample.go_to("Reading")
    sample.help.show_notes()
    assert picked(sample) == "Pores reaching the metal"


def test_a_doubt_has_its_note(sample: MainWindow) -> None:
    sample.go_to("Doubts")
    place = sample.open_place()
    row = next(
        i for i, d in enumerate(place.doubts) if d.finding and d.finding.code == "wild_point"
    )
    place.list.setCurrentRow(row)
    sample.help.show_notes()
    assert picked(sample).startswith("Wild points")


def test_any_word_finds_its_pages(window: MainWindow) -> None:
    notes = NotesWindow(window)
    notes.show()
    assert len(shown(notes)) == len(method_notes()) + len(glossary())
    QTest.keyClicks(notes.search, "turnbull")
    assert any("Turnbull" in title for title in shown(notes))
    assert len(shown(notes)) < 5
    assert "Turnbull" in notes.text.toPlainText()
    notes.search.setText("no such word anywhere")
    assert shown(notes) == []
    assert "no such word anywhere" in notes.text.toPlainText()
    QTest.keyClick(notes.search, Qt.Key.Key_A, Qt.KeyboardModifier.ControlModifier)
    QTest.keyClicks(notes.search, "C_dl")
    assert "double-layer capacitance" in shown(notes)
    notes.search.clear()
    assert len(shown(notes)) == len(method_notes()) + len(glossary())
    notes.close()
    notes.deleteLater()
