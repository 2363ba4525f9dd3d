"""The project tree: what it shows, and that each change it makes is one that can be undone."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import pytest

pytest.importorskip("PySide6")

from PySide6.QtCore import QModelIndex, Qt
from PySide6.QtTest import QAbstractItemModelTester, QTest
from PySide6.QtWidgets import QApplication, QLineEdit

from coatgui.records import Campaign
from coatgui.window.main_window import MainWindow
from coatgui.window.tree_model import TreeModel

Wait = Callable[[Callable[[], bool]], None]


@pytest.fixture
def full(window: MainWindow, wait: Wait, small: Path) -> MainWindow:
    QAbstractItemModelTester(
        window.project.model, QAbstractItemModelTester.FailureReportingMode.Fatal, window
    )
    window.open_path(small)
    wait(lambda: window.desk.job is None and window.desk.assessment is not None)
    return window


def campaign(window: MainWindow) -> Campaign:
    assert window.desk.campaign is not None
    return window.desk.campaign


def texts(model: TreeModel, parent: QModelIndex | None = None) -> list[str]:
    """All rows, depth first."""
    found = []
    above = QModelIndex() if parent is None else parent
    for row in range(model.rowCount(above)):
        index = model.index(row, 0, above)
        found += [str(index.data()), *texts(model, index)]
    return found


def type_over(window: MainWindow, key: str, text: str) -> None:
    """F2, another name, return: as a person renames a row."""
    view = window.project.view
    view.setCurrentIndex(window.project.model.index_of(key))
    window.activateWindow()
    QTest.qWaitForWindowActive(window)
    view.setFocus()
    QTest.keyClick(view, Qt.Key.Key_F2)
    editor = next(e for e in view.findChildren(QLineEdit) if e.isVisible())
    editor.selectAll()
    QTest.keyClicks(editor, text)
    QTest.keyClick(editor, Qt.Key.Key_Return)
    for _ in range(3):
        QApplication.processEvents()


def test_states_stand_there_by_shape_word_and_colour(full: MainWindow) -> None:
    model = full.project.model
    rows = texts(model)
    assert "336 h   ▲ doubt" in rows
    assert "P2   ▲ 1" in rows
    reading = next(
        r for r in campaign(full).readings if r.exposure_h == 336 and "P2" in r.source.file
    )
    index = model.index_of(reading.reading_id)
    assert index.data(Qt.ItemDataRole.ForegroundRole).color().name() == full.tone.amber.lower()
    assert index.data(Qt.ItemDataRole.AccessibleTextRole) == "reading 336 h ▲ doubt"


@pytest.mark.parametrize(
    ("words", "shown"),
    [
        ("p1", ["two panels", "P waterborne", "P1", "1 h"]),
        ("doubt", ["two panels", "P waterborne", "P2   ▲ 1", "336 h   ▲ doubt"]),
        ("p1 168", ["two panels", "P waterborne", "P1", "168 h"]),
        ("nowhere", ["two panels"]),
    ],
)
def test_words_filter_the_tree(full: MainWindow, words: str, shown: list[str]) -> None:
    QTest.keyClicks(full.project.filter, words)
    assert texts(full.project.model)[:4] == shown
    full.project.filter.clear()
    assert len(texts(full.project.model)) == 2 + 2 + 14


def test_rows_are_renamed_in_place(full: MainWindow) -> None:
    panel = campaign(full).panels[0]
    type_over(full, panel.panel_id, "P1 left edge")
    assert campaign(full).panels[0].name == "P1 left edge"
    assert "P1 left edge" in texts(full.project.model)
    # The name of another panel is refused with a sentence, and nothing changes.
    type_over(full, panel.panel_id, "P2")
    assert campaign(full).panels[0].name == "P1 left edge"
    assert full.trouble.isVisible()
    full.undo()
    assert campaign(full).panels[0].name == panel.name


def test_a_reading_goes_by_its_exposure_time(full: MainWindow) -> None:
    reading = next(r for r in campaign(full).readings if r.exposure_h == 672)
    type_over(full, reading.reading_id, "30 d")
    found = {r.reading_id: r for r in campaign(full).readings}
    assert found[reading.reading_id].exposure_h == 720
    type_over(full, reading.reading_id, "next week")
    assert "exposure time" in full.trouble.words.text()
    assert found[reading.reading_id].exposure_h == 720


def test_panels_are_dragged_to_another_formulation(full: MainWindow) -> None:
    model = full.project.model
    full.project.add_formulation()
    made = campaign(full).formulations[-1]
    assert made.name == "Formulation 1"
    panel = campaign(full).panels[1]
    data = model.mimeData([model.index_of(panel.panel_id)])
    goal = model.index_of(made.formulation_id)
    move = Qt.DropAction.MoveAction
    assert model.canDropMimeData(data, move, -1, -1, goal)
    # Not where it lies already, and not onto a reading or the campaign.
    for wrong in (panel.formulation_id, campaign(full).readings[0].reading_id):
        assert not model.canDropMimeData(data, move, -1, -1, model.index_of(wrong))
    model.dropMimeData(data, move, -1, -1, goal)
    QApplication.processEvents()
    assert campaign(full).panels[1].formulation_id == made.formulation_id
    full.undo()
    assert campaign(full).panels[1].formulation_id == panel.formulation_id


def test_a_reading_is_dragged_to_another_panel(full: MainWindow) -> None:
    model = full.project.model
    reading = next(r for r in campaign(full).readings if r.exposure_h == 672)
    other = next(p for p in campaign(full).panels if p.panel_id != reading.panel_id)
    data = model.mimeData([model.index_of(reading.reading_id)])
    model.dropMimeData(data, Qt.DropAction.MoveAction, -1, -1, model.index_of(other.panel_id))
    QApplication.processEvents()
    moved = next(r for r in campaign(full).readings if r.reading_id == reading.reading_id)
    assert moved.panel_id == other.panel_id


def test_delete_removes_and_undo_brings_back(full: MainWindow, wait: Wait) -> None:
    panel = campaign(full).panels[0]
    view = full.project.view
    view.setCurrentIndex(full.project.model.index_of(panel.panel_id))
    QTest.keyClick(view, Qt.Key.Key_Delete)
    assert [p.name for p in campaign(full).panels] == ["P2"]
    wait(lambda: full.desk.job is None)
    # The picked reading went with its panel; another is picked, and every place goes on.
    assert full.desk.reading() is not None
    # A formulation that has panels stays, and the window says why.
    view.setCurrentIndex(full.project.model.index_of(panel.formulation_id))
    QTest.keyClick(view, Qt.Key.Key_Delete)
    assert "still has panels" in full.trouble.words.text()
    full.undo()
    assert [p.name for p in campaign(full).panels] == ["P1", "P2"]
    wait(lambda: full.desk.job is None)
    # All readings gone: the places say what to do.
    for each in campaign(full).panels:
        view.setCurrentIndex(full.project.model.index_of(each.panel_id))
        QTest.keyClick(view, Qt.Key.Key_Delete)
    wait(lambda: full.desk.job is None)
    assert full.places[0].headline.text().startswith("No readings yet")  # type: ignore[attr-defined]


def test_what_was_open_stays_open_after_an_edit(full: MainWindow) -> None:
    view, model = full.project.view, full.project.model
    panel = campaign(full).panels[1]
    view.expand(model.index_of(panel.panel_id))
    type_over(full, panel.panel_id, "another name")
    assert view.isExpanded(model.index_of(panel.panel_id))
