"""The whole job by mouse and keyboard: from an empty start to what is handed over, all of it undone
and done again, closed, and opened again to the same state.

Nothing here calls the desk to do anything; it is only read, to know when work under way is done.
"""

from __future__ import annotations

import shutil
from collections.abc import Callable
from contextlib import closing
from pathlib import Path
from typing import Any

import openpyxl
import pytest

pytest.importorskip("PySide6")

from driving import (
    LEFT,
    action,
    choose,
    go,
    meanwhile,
    name_it,
    pick_cell,
    settled,
    shortcut,
)
from PySide6.QtCore import QEvent, QSettings, Qt
from PySide6.QtTest import QTest
from PySide6.QtWidgets import QApplication, QInputDialog, QLineEdit, QPushButton

from coatgui.campaign import check_file
from coatgui.output import assessment_json
from coatgui.shipped import sample_panels
from coatgui.window.main_window import MainWindow
from coatgui.window.places.doubts_place import DoubtsPlace
from coatgui.window.places.summary_place import SummaryPlace

Wait = Callable[[Callable[[], bool]], None]
CTRL = Qt.KeyboardModifier.ControlModifier
SHIFT = Qt.KeyboardModifier.ShiftModifier


def press(window: MainWindow, text: str) -> None:
    button = next(
        b
        for b in window.findChildren(QPushButton)
        if b.isVisible() and b.isEnabled() and b.text() == text
    )
    QTest.mouseClick(button, LEFT)


def give_reason(text: str) -> Callable[[Any], None]:
    def act(dialog: Any) -> None:
        assert isinstance(dialog, QInputDialog)
        line = dialog.findChild(QLineEdit)
        assert line is not None
        QTest.keyClicks(line, text)
        QTest.keyClick(line, Qt.Key.Key_Return)

    return act


def settle_doubts(window: MainWindow, wait: Wait) -> None:
    """Dismiss a refused file, leave out the points of a finding, overrule a rejection: all from
    the list, which is walked through by the keyboard."""
    go(window, "Doubts")
    place = window.open_place()
    assert isinstance(place, DoubtsPlace)
    before = len(place.doubts)
    assert before > 5
    place.list.setFocus()
    QTest.keyClick(place.list, Qt.Key.Key_Home)
    assert place.doubts[place.list.currentRow()].refusal is not None
    QTest.keyClick(place.dismiss, Qt.Key.Key_Space)
    QApplication.processEvents()
    wait(settled(window))
    assert len(place.doubts) == before - 1
    done = {"Leave these points out": False, "Use it all the same…": False}
    place.list.setFocus()
    QTest.keyClick(place.list, Qt.Key.Key_Home)
    for _ in range(len(place.doubts)):
        for button, text in ((place.leave, "Leave these points out"),
                             (place.overrule, "Use it all the same…")):  # fmt: skip
            if not done[text] and button.isVisible():
                done[text] = True
                troubles = meanwhile(give_reason("seen on site")) if "…" in text else []
                QTest.keyClick(button, Qt.Key.Key_Space)
                assert not troubles
                wait(settled(window))
        if all(done.values()):
            break
        QTest.keyClick(place.list, Qt.Key.Key_Down)
    assert all(done.values())


def test_from_an_empty_start_to_what_is_handed_over_and_back(
    window: MainWindow, wait: Wait, tmp_path: Path
) -> None:
    folder, later = tmp_path / "weeks of work", tmp_path / "K1_672h.csv"
    shutil.copytree(sample_panels(), folder)
    (folder / later.name).rename(later)

    # Open the folder, then bring in the reading that came later.
    assert window.pages.currentWidget() is window.welcome
    troubles = meanwhile(name_it(folder))
    press(window, "Open a folder of spectra…")
    assert not troubles
    wait(settled(window))
    assert len(window.desk.campaign.readings) == 106  # type: ignore[union-attr]
    troubles = meanwhile(name_it(later))
    choose(window, "Campaign", "Bring in files")
    assert not troubles
    wait(lambda: not window.incoming.busy and window.incoming.is_there)
    assert window.pages.currentWidget() is window.dry_run
    QTest.mouseClick(window.dry_run.take, LEFT)
    wait(settled(window))
    campaign = window.desk.campaign
    assert campaign is not None
    assert len(campaign.readings) == 107
    kept = tmp_path / "weeks.coatgui"
    troubles = meanwhile(name_it(kept))
    choose(window, "Campaign", "Save as")
    assert not troubles
    wait(settled(window))

    settle_doubts(window, wait)

    # Read the comparison: in words first.
    go(window, "Comparison")
    words = window.open_place().words.text()  # type: ignore[attr-defined]
    assert "K slow-cure epoxy" in words
    assert window.desk.assessment is not None
    assert window.desk.assessment.ranking_text.startswith(words[:-1])

    # Fill the summary in, and hand over: summary and workbook.
    go(window, "Summary")
    place = window.open_place()
    assert isinstance(place, SummaryPlace)
    for name, text in (("laboratory", "Slip Laboratory"), ("author", "A. Painter")):
        line = place.fields[name].line
        QTest.mouseClick(line, LEFT)
        QTest.keyClicks(line, text)
        QTest.keyClick(line, Qt.Key.Key_Return)
        wait(settled(window))
    wait(lambda: not place.printing.busy)
    assert place.standing.text().endswith("copies the text and tables.")
    for text, path in (
        ("Write PDF…", tmp_path / "s.pdf"),
        ("Write HTML…", tmp_path / "s.html"),
    ):
        troubles = meanwhile(name_it(path))
        press(window, text)
        assert not troubles
        wait(lambda path=path: window.desk.job is None and path.exists())  # type: ignore[misc]
    assert (tmp_path / "s.pdf").read_bytes().startswith(b"%PDF-")
    html = (tmp_path / "s.html").read_text(encoding="utf-8")
    assert "Slip Laboratory" in html
    assert "seen on site" in html
    workbook = tmp_path / "w.xlsx"
    troubles = meanwhile(name_it(workbook))
    choose(window, "Campaign", "Write workbook")
    assert not troubles
    wait(lambda: window.desk.job is None and workbook.exists())
    with closing(openpyxl.load_workbook(workbook, read_only=True)) as book:
        assert sum(1 for _ in book["Readings"].iter_rows()) == 108

    # Undo it all, and do it all again.
    done, known = window.desk.campaign, assessment_json(window.desk.assessment)
    steps = 0
    while action(window, "Undo").isEnabled():
        shortcut(window, Qt.Key.Key_Z, CTRL)
        steps += 1
    assert steps == 6
    assert window.desk.campaign is not None
    assert len(window.desk.campaign.readings) == 106
    assert window.desk.campaign.identification.laboratory == ""
    for _ in range(steps):
        shortcut(window, Qt.Key.Key_Z, CTRL | SHIFT)
    assert not action(window, "Redo").isEnabled()
    wait(settled(window))
    assert window.desk.campaign == done
    assert assessment_json(window.desk.assessment) == known

    # Close the program, and find everything again.
    go(window, "Map")
    pick_cell(window, "P2", 336)
    go(window, "Course")
    picked = window.desk.selection
    shortcut(window, Qt.Key.Key_Q, CTRL)
    assert not window.isVisible()
    assert not check_file(kept)
    settings = QSettings(window.settings.fileName(), QSettings.Format.IniFormat)
    again = MainWindow(settings, False)
    again.show()
    try:
        link = next(b for b in again.welcome.links if b.isVisibleTo(again))
        assert link.toolTip() == str(kept)
        QTest.mouseClick(link, LEFT)
        wait(settled(again))
        assert again.desk.campaign == done
        assert assessment_json(again.desk.assessment) == known
        assert again.desk.selection == picked
        assert again.open_place().noun == "Course"
        assert action(again, "Undo: Set author of the summary").isEnabled()
        assert "P2, 336 h" in again.facts.text()
    finally:
        again.desk.close()
        again.keeping.close()
        again.hide()
        again.deleteLater()
        QApplication.sendPostedEvents(None, QEvent.Type.DeferredDelete.value)
