"""The window through the main job, as a person would: open, look, edit, undo, export, keep."""

from __future__ import annotations

import sys
from collections.abc import Callable
from pathlib import Path

import openpyxl
import pytest

pytest.importorskip("PySide6")

from PySide6.QtCore import QAbstractItemModel, Qt
from PySide6.QtTest import QAbstractItemModelTester, QTest
from PySide6.QtWidgets import QWidget

from coatgui.shipped import sample_panels
from coatgui.window import palette
from coatgui.window.axis import DecadeAxis
from coatgui.window.main_window import MainWindow
from coatgui.window.numbers import prefixed
from coatgui.window.tree_model import TreeModel

Wait = Callable[[Callable[[], bool]], None]


def settled(window: MainWindow) -> Callable[[], bool]:
    return lambda: window.desk.job is None and window.desk.assessment is not None


def test_the_whole_job(window: MainWindow, wait: Wait, tmp_path: Path) -> None:
    QAbstractItemModelTester(
        window.project.model, QAbstractItemModelTester.FailureReportingMode.Fatal
    )
    window.desk.open(sample_panels())
    wait(settled(window))
    desk = window.desk
    assert desk.assessment is not None
    assert len(desk.assessment.readings) == 107
    assert "12 panels" in window.places[0].headline.text()  # type: ignore[attr-defined]

    reading = next(r for r in desk.assessment.readings if r.panel == "P1" and r.exposure_h == 504)
    desk.select(reading.reading_id)
    assert "P1" in window.facts.text()
    assert window.project.model.node(window.project.view.currentIndex()).key == reading.reading_id

    from coatgui.campaign import operations

    desk.edit(operations.leave_out_points, reading.reading_id, [5], "tried by hand")
    wait(settled(window))
    after = desk.assessment.reading(reading.reading_id)
    assert after is not None
    assert after.points_used == reading.points_used - 1
    window.undo()
    wait(settled(window))
    back = desk.assessment.reading(reading.reading_id)
    assert back is not None
    assert back.points_used == reading.points_used
    window.redo()
    wait(settled(window))

    workbook = tmp_path / "out.xlsx"
    desk.export(workbook)
    wait(lambda: desk.job is None)
    assert "Readings" in openpyxl.load_workbook(workbook).sheetnames

    kept = tmp_path / "kept.coatgui"
    desk.save_as(kept)
    wait(lambda: desk.job is None)
    assert desk.is_saved
    desk.open(kept)
    wait(settled(window))
    again = desk.assessment.reading(reading.reading_id)
    assert again is not None
    assert again.points_used == reading.points_used - 1
    assert desk.file is not None
    assert desk.file.undo_name is not None
    for place in range(4):
        window.go(place)
        assert not window.grab().isNull()


def test_stepping_and_the_map_by_keyboard(window: MainWindow, wait: Wait) -> None:
    window.desk.open(sample_panels())
    wait(settled(window))
    assert window.desk.campaign is not None
    cells = window.places[0].cells  # type: ignore[attr-defined]
    first = window.desk.selection
    QTest.keyClick(cells, Qt.Key.Key_Right)
    second = window.desk.selection
    assert second != first
    window.earlier()
    assert window.desk.selection == first
    QTest.keyClick(cells, Qt.Key.Key_Down)
    assert window.desk.selection not in (first, second)


def test_stopping_leaves_nothing_behind(window: MainWindow, wait: Wait) -> None:
    told: list[str] = []
    window.desk.told.connect(told.append)
    window.desk.open(sample_panels())
    window.desk.stop()
    wait(lambda: window.desk.job is None)
    assert window.desk.file is None or window.desk.assessment is None


def test_a_folder_that_is_none_is_answered_in_a_sentence(
    window: MainWindow, wait: Wait, tmp_path: Path
) -> None:
    told: list[str] = []
    window.desk.failed.connect(told.append)
    window.desk.open(tmp_path)
    wait(lambda: window.desk.job is None)
    assert any("holds no file" in sentence for sentence in told)
    (tmp_path / "x.coatgui").write_text("not a campaign")
    window.desk.open(tmp_path / "x.coatgui")
    wait(lambda: window.desk.job is None)
    assert len(told) == 2
    assert window.trouble.isVisible()
    assert "x.coatgui" in window.trouble.words.text()
    assert window.desk.file is None


@pytest.mark.parametrize(("low", "high"), [(-2.0, 5.0), (3.1, 3.4), (9.0, 9.02), (-3.0, 11.0)])
def test_a_decade_axis_always_has_two_labels(application: object, low: float, high: float) -> None:
    axis = DecadeAxis("left", "Ω")
    ticks = [value for _, values in axis.tickValues(low, high, 300.0) for value in values]
    assert len(ticks) >= 2
    labels = axis.tickStrings(ticks, 1.0, 1.0 if high - low > 1 else 0.1)
    assert len(set(labels)) == len(labels)


@pytest.mark.parametrize(
    ("value", "unit", "digits", "text"),
    [
        (1.31e-9, "F/cm²", 3, "1.31 nF/cm²"),
        (0.01, "Hz", 1, "10 mHz"),
        (1e5, "Ω", 1, "100 kΩ"),
        (999.9e6, "Ω cm²", 3, "1.00 GΩ cm²"),
        (5.125, "vol-%", 3, "5.12 vol-%"),
    ],
)
def test_numbers_are_written_as_the_trade_does(
    value: float, unit: str, digits: int, text: str
) -> None:
    assert prefixed(value, unit, digits) == text


def test_the_tree_is_a_sound_model(application: object) -> None:
    model: QAbstractItemModel = TreeModel(palette.colours(False))
    QAbstractItemModelTester(model, QAbstractItemModelTester.FailureReportingMode.Fatal)


@pytest.mark.skipif(sys.version_info >= (3, 12), reason="None is immortal from Python 3.12 on")
def test_qt_calls_do_not_lose_none(application: object) -> None:
    """PySide6 6.12.0 loses a reference to None with every call that returns nothing."""
    widget = QWidget()
    before = sys.getrefcount(None)
    for _ in range(2000):
        widget.update()
    assert sys.getrefcount(None) > before - 1000
