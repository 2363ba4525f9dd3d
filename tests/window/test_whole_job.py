"""The main job by mouse and keyboard alone, from the empty window to the campaign opened again.

Nothing here calls the desk to do anything: menus, buttons, dialogues, cells, points and keys are
used as a person uses them; the desk is only read, to know when the work under way is done.
"""

from __future__ import annotations

from collections.abc import Callable
from contextlib import closing
from pathlib import Path

import openpyxl
import pytest

pytest.importorskip("PySide6")

import pyqtgraph as pg
from driving import (
    LEFT,
    action,
    choose,
    click_point,
    go,
    meanwhile,
    name_it,
    pick_cell,
    press,
    settled,
    shortcut,
)
from PySide6.QtCore import QMimeData, QPoint, QPointF, Qt, QUrl
from PySide6.QtGui import QDragEnterEvent, QDropEvent
from PySide6.QtTest import QTest
from PySide6.QtWidgets import (
    QApplication,
    QPushButton,
)

from coatgui.campaign import check_file
from coatgui.shipped import sample_panels
from coatgui.window.main_window import MainWindow

Wait = Callable[[Callable[[], bool]], None]


def test_from_the_empty_window_to_the_campaign_opened_again(
    window: MainWindow, wait: Wait, tmp_path: Path, small: Path
) -> None:
    # Empty: the welcome page; what needs a campaign cannot be chosen.
    assert window.pages.currentWidget() is window.welcome
    assert not action(window, "Save as").isEnabled()
    assert not action(window, "Undo").isEnabled()

    # Open the folder by the dialogue, from the button of the welcome page.
    troubles = meanwhile(name_it(small))
    button = next(b for b in window.welcome.findChildren(QPushButton) if "folder" in b.text())
    QTest.mouseClick(button, LEFT)
    assert not troubles
    wait(settled(window))
    assert window.windowTitle().startswith("two panels")
    assert window.status.kept.text() == "not saved yet"
    headline = window.places[0].headline.text()  # type: ignore[attr-defined]
    assert headline.startswith("2 panels, 7 inspections")

    # The map: a cell says its number; picking it carries the reading everywhere.
    pick_cell(window, "P1", 336)
    assert "P1, 336 h" in window.facts.text()
    assert "P1, 336 h" in window.strip.accessibleDescription()
    node = window.project.model.node(window.project.view.currentIndex())
    assert (node.kind, node.text) == ("reading", "336 h")

    # The reading: what is shown is what was found out.
    go(window, "Reading")
    reading = window.places[1]
    known = window.desk.reading_assessment()
    assert known is not None
    assert known.fit is not None
    used, of = known.points_used, known.points_read
    assert known.fit.model_name in reading.about.text()  # type: ignore[attr-defined]
    assert f"{used} of {of} points used" in reading.about.text()  # type: ignore[attr-defined]
    table = reading.table  # type: ignore[attr-defined]
    symbols = [table.item(i, 0).text() for i in range(table.rowCount())]
    assert symbols[: len(known.parameters)] == [p.symbol for p in known.parameters]
    assert "R_po" in reading.section.accessibleDescription()  # type: ignore[attr-defined]

    # Leave out a point by clicking it; the fit follows. Undo and redo by their keys.
    place = 20
    assert known.fit.used[place]
    click_point(window, place)
    QApplication.processEvents()
    wait(settled(window))
    assert f"{used - 1} of {of} points used" in reading.about.text()  # type: ignore[attr-defined]
    now = window.desk.reading_assessment()
    assert now is not None
    assert now.fit is not None
    assert not now.fit.used[place]
    assert now.fit.parameters != known.fit.parameters
    shortcut(window, Qt.Key.Key_Z, Qt.KeyboardModifier.ControlModifier)
    wait(settled(window))
    assert f"{used} of {of} points used" in reading.about.text()  # type: ignore[attr-defined]
    both = Qt.KeyboardModifier.ControlModifier | Qt.KeyboardModifier.ShiftModifier
    shortcut(window, Qt.Key.Key_Z, both)
    wait(settled(window))
    assert f"{used - 1} of {of} points used" in reading.about.text()  # type: ignore[attr-defined]

    # Step along the exposure time with the keyboard, and back.
    window.strip.setFocus()
    QTest.keyClick(window.strip, Qt.Key.Key_Left)
    assert "168 h" in reading.about.text()  # type: ignore[attr-defined]
    QTest.keyClick(window.strip, Qt.Key.Key_Right)
    assert "336 h" in reading.about.text()  # type: ignore[attr-defined]

    # The course: modulus, capacitance, and the water of both replicates.
    go(window, "Course")
    course = window.places[2]
    chooser = course.chooser  # type: ignore[attr-defined]
    chooser.setFocus()
    QTest.keyClicks(chooser, "Film")
    assert chooser.currentText() == "Film capacitance"
    QTest.keyClick(chooser, Qt.Key.Key_Home)
    assert chooser.currentText() == "|Z|·A at 0.1 Hz"
    drawn = [
        [str(point.data()) for point in item.points()]
        for item in course.water.getPlotItem().items  # type: ignore[attr-defined]
        if isinstance(item, pg.ScatterPlotItem) and len(item.points()) > 1
    ]
    assert window.desk.campaign is not None
    panels = {r.reading_id: r.panel_id for r in window.desk.campaign.readings}
    assert [len(points) for points in drawn] == [7, 7]
    assert len({panels[point] for points in drawn for point in points}) == 2

    # Doubts: the file that could not be used is named, with its reason.
    go(window, "Doubts")
    doubts = window.places[5].list  # type: ignore[attr-defined]
    texts = [doubts.item(i).text() for i in range(doubts.count())]
    assert any("remark.txt" in text and "no table of numbers" in text for text in texts)

    # The workbook.
    workbook = tmp_path / "assessment.xlsx"
    troubles = meanwhile(name_it(workbook))
    choose(window, "Campaign", "Write workbook")
    assert not troubles
    wait(lambda: window.desk.job is None and workbook.exists())
    with closing(openpyxl.load_workbook(workbook, read_only=True)) as book:
        assert sum(1 for _ in book["Readings"].iter_rows()) > 10

    # Keep it, under a name with a point in it and without the ending.
    kept = tmp_path / "walk.v2.coatgui"
    troubles = meanwhile(name_it(tmp_path / "walk.v2"))
    choose(window, "Campaign", "Save as")
    assert not troubles
    wait(settled(window))
    assert not check_file(kept)
    assert window.status.kept.text() == "kept in walk.v2.coatgui"

    # Close it, and open it again from the list of campaigns worked on lately.
    choose(window, "Campaign", "Close campaign")
    assert window.pages.currentWidget() is window.welcome
    link = next(b for b in window.welcome.links if b.isVisibleTo(window))
    assert link.toolTip() == str(kept)
    QTest.mouseClick(link, LEFT)
    wait(settled(window))
    go(window, "Map")
    pick_cell(window, "P1", 336)
    go(window, "Reading")
    assert f"{used - 1} of {of} points used" in reading.about.text()  # type: ignore[attr-defined]
    assert action(window, "Undo: Leave out 1 point of the reading of P1 at 336 h").isEnabled()
    choose(window, "Edit", "Undo")
    wait(settled(window))
    assert f"{used} of {of} points used" in reading.about.text()  # type: ignore[attr-defined]


def drop(window: MainWindow, path: Path) -> None:
    data = QMimeData()
    data.setUrls([QUrl.fromLocalFile(str(path))])
    copy, none = Qt.DropAction.CopyAction, Qt.KeyboardModifier.NoModifier
    enter = QDragEnterEvent(QPoint(200, 200), copy, data, LEFT, none)
    QApplication.sendEvent(window, enter)
    assert enter.isAccepted()
    QApplication.sendEvent(window, QDropEvent(QPointF(200, 200), copy, data, LEFT, none))


def test_a_dropped_folder_is_opened(window: MainWindow, wait: Wait, small: Path) -> None:
    drop(window, small)
    wait(settled(window))
    assert window.windowTitle().startswith("two panels")
    # A file dropped now is brought in; of one that is there already the window says so.
    told: list[str] = []
    window.desk.told.connect(told.append)
    drop(window, small / "P1_24h.dat")
    wait(lambda: bool(told))
    assert told == ["Nothing new; 1 reading there already"]


def test_escape_stops_the_judging_and_f5_takes_it_up(window: MainWindow, wait: Wait) -> None:
    window.open_path(sample_panels())
    wait(lambda: window.desk.file is not None)
    assert window.desk.job is not None
    shortcut(window, Qt.Key.Key_Escape)
    wait(lambda: window.desk.job is None)
    assert window.desk.assessment is None
    headline = window.places[0].headline  # type: ignore[attr-defined]
    assert headline.text() == "The readings have not been judged: F5 judges them."
    shortcut(window, Qt.Key.Key_F5)
    wait(settled(window))
    assert headline.text().startswith("12 panels")


def test_what_is_not_saved_is_asked_about(
    window: MainWindow, wait: Wait, small: Path, tmp_path: Path
) -> None:
    window.open_path(small)
    wait(settled(window))
    go(window, "Reading")
    click_point(window, 12)
    QApplication.processEvents()
    wait(settled(window))
    assert action(window, "Undo").isEnabled()

    troubles = meanwhile(press("Go back"))
    assert not window.close()
    assert not troubles
    assert window.desk.file is not None

    troubles = meanwhile(press("Close without saving"))
    choose(window, "Campaign", "Close campaign")
    assert not troubles
    assert window.desk.file is None
    assert window.pages.currentWidget() is window.welcome


def test_what_cannot_be_opened_is_said_and_the_campaign_stays(
    window: MainWindow, wait: Wait, small: Path, tmp_path: Path
) -> None:
    window.open_path(small)
    wait(settled(window))
    title = window.windowTitle()
    damaged = tmp_path / "damaged.coatgui"
    damaged.write_bytes(b"SQLite format 3\x00" + bytes(4000))
    empty = tmp_path / "empty"
    empty.mkdir()
    for wrong in (damaged, empty):
        window.open_path(wrong)
        wait(settled(window))
        assert window.trouble.isVisible()
        assert wrong.name in window.trouble.words.text()
        assert "\n" not in window.trouble.words.text()
        assert window.windowTitle() == title
        QTest.mouseClick(window.trouble.dismiss, LEFT)
        assert not window.trouble.isVisible()


def test_writing_waits_for_the_judging(
    window: MainWindow, wait: Wait, small: Path, tmp_path: Path
) -> None:
    window.open_path(small)
    wait(settled(window))
    go(window, "Reading")
    click_point(window, 12)
    QApplication.processEvents()
    assert window.desk.job is not None
    target = tmp_path / "later.json"
    window.desk.export(target)
    wait(lambda: target.exists() and window.desk.job is None)
    known = window.desk.reading_assessment()
    assert known is not None
    assert f'"used": {known.points_used}' in target.read_text(encoding="utf-8")
