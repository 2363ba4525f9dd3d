"""Settling doubts, and what the map says about a cell."""

from __future__ import annotations

from collections.abc import Callable

import pytest

pytest.importorskip("PySide6")

from PySide6.QtCore import QEvent, QPoint, QPointF, Qt, QTimer
from PySide6.QtGui import QMouseEvent
from PySide6.QtTest import QTest
from PySide6.QtWidgets import QApplication, QInputDialog

from coatgui.records import Campaign, ReadingAssessment
from coatgui.window.main_window import MainWindow
from coatgui.window.places.doubts_place import DoubtsPlace
from coatgui.window.places.map_place import MapPlace, story

Wait = Callable[[Callable[[], bool]], None]
LEFT = Qt.MouseButton.LeftButton


def campaign(window: MainWindow) -> Campaign:
    assert window.desk.campaign is not None
    return window.desk.campaign


def known(window: MainWindow, panel: str, hours: float) -> ReadingAssessment:
    assert window.desk.assessment is not None
    return next(
        r for r in window.desk.assessment.readings if (r.panel, r.exposure_h) == (panel, hours)
    )


def pick(place: DoubtsPlace, words: str) -> None:
    row = next(i for i, doubt in enumerate(place.doubts) if words in doubt.text)
    place.list.setCurrentRow(row)


def test_doubts_are_settled_where_they_stand(sample: MainWindow, wait: Wait) -> None:
    place = sample.places[5]
    assert isinstance(place, DoubtsPlace)
    sample.go(5)
    counted = sample.buttons.button(5).text()
    assert counted.split() == ["Doubts", str(len(place.doubts))]

    # A refused file: its reason, and off the list with an edit that can be undone.
    pick(place, "notes.txt")
    assert place.heading.text() == "notes.txt"
    number = len(campaign(sample).refused)
    QTest.mouseClick(place.dismiss, LEFT)
    assert len(campaign(sample).refused) == number - 1
    sample.undo()
    assert len(campaign(sample).refused) == number
    wait(lambda: sample.desk.job is None)

    # A wild point: marked in the plot, and left out with the check's own word as the reason.
    pick(place, "K2, 72 h")
    reading = known(sample, "K2", 72)
    finding = next(f for f in reading.findings if f.points)
    assert place._meant.across.size == len(finding.points)
    QTest.mouseClick(place.leave, LEFT)
    record = next(r for r in campaign(sample).readings if r.reading_id == reading.reading_id)
    assert dict(record.left_out) == {
        point: finding.code.replace("_", " ") for point in finding.points
    }
    wait(lambda: sample.desk.job is None)

    # A rejected reading is used after all, for a reason; without one nothing happens.
    for words, used in (("", False), ("measured twice with the same result", True)):
        pick(place, "breaks the Kramers")

        def answer(words: str = words) -> None:
            dialog = QApplication.activeModalWidget()
            assert isinstance(dialog, QInputDialog)
            dialog.setTextValue(words)
            dialog.accept()

        QTimer.singleShot(50, answer)
        QTest.mouseClick(place.overrule, LEFT)
        wait(lambda: sample.desk.job is None)
        assert known(sample, "P3", 504).counts is used

    # Opening one leads to its spectrum.
    pick(place, "P2, 336 h")
    QTest.mouseClick(place.see, LEFT)
    assert sample.stack.currentIndex() == 1
    assert "P2" in sample.places[1].about.text()  # type: ignore[attr-defined]


def test_a_cell_tells_its_story_in_three_lines(sample: MainWindow) -> None:
    place = sample.places[0]
    assert isinstance(place, MapPlace)
    lines = story(known(sample, "P2", 336), "modulus_0.1").split("\n")
    assert len(lines) == 3
    assert lines[0].startswith("P2, 336 h: |Z|·A at 0.1 Hz 18.8 MΩ cm² (")
    assert "Pores with reacting interface; water" in lines[1]
    assert lines[2].startswith("▲ ")
    assert story(known(sample, "K1", 1), "water_uptake").endswith("Nothing speaks against it.")
    # Hovering shows it, as plain text whatever a panel is called.
    cells = place.cells
    row = cells.rows.index(("panel", "P2"))
    centre = cells._rect(row, cells.times.index(336), cells._tops()).center()
    hover = QMouseEvent(
        QEvent.Type.MouseMove, QPointF(centre), QPointF(centre), Qt.MouseButton.NoButton,
        Qt.MouseButton.NoButton, Qt.KeyboardModifier.NoModifier,
    )  # fmt: skip
    QApplication.sendEvent(cells, hover)
    assert cells.toolTip().count("<br>") == 2


def test_a_rejected_reading_is_not_shaded(sample: MainWindow) -> None:
    place = sample.places[0]
    assert isinstance(place, MapPlace)
    cells = place.cells
    row = cells.rows.index(("panel", "P3"))
    assert (row, cells.times.index(504)) not in cells.shades
    assert (row, cells.times.index(336)) in cells.shades


def test_return_and_double_click_open_the_reading(sample: MainWindow) -> None:
    place = sample.places[0]
    assert isinstance(place, MapPlace)
    QTest.keyClick(place.cells, Qt.Key.Key_Return)
    assert sample.stack.currentIndex() == 1
    sample.go(0)
    row = place.cells.rows.index(("panel", "M2"))
    centre: QPoint = place.cells._rect(row, 2, place.cells._tops()).center()
    QTest.mouseDClick(place.cells, LEFT, pos=centre)
    assert sample.stack.currentIndex() == 1


def test_every_quantity_shades_the_map(sample: MainWindow) -> None:
    place = sample.places[0]
    assert isinstance(place, MapPlace)
    for number in range(place.chooser.count()):
        place.chooser.setCurrentIndex(number)
        assert place.cells.shades
        assert not place.cells.grab().isNull()
