"""Empty places say what would be here and how to get it."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import pytest

pytest.importorskip("PySide6")

from PySide6.QtCore import Qt
from PySide6.QtTest import QTest
from PySide6.QtWidgets import QFileDialog, QPushButton

from coatgui.campaign import CampaignFile
from coatgui.records import Campaign
from coatgui.window.main_window import MainWindow

Wait = Callable[[Callable[[], bool]], None]
EMPTY = ("Map", "Reading", "Course", "Water", "Comparison", "Doubts", "Summary")


@pytest.fixture
def empty(window: MainWindow, wait: Wait, tmp_path: Path) -> MainWindow:
    path = tmp_path / "Empty.coatgui"
    CampaignFile.create(path, Campaign("c", "Empty"), {}).close()
    window.open_path(path)
    wait(lambda: window.desk.job is None and window.desk.file is not None)
    return window


@pytest.mark.parametrize("noun", EMPTY)
def test_one_sentence_and_one_button(
    empty: MainWindow, wait: Wait, noun: str, monkeypatch: pytest.MonkeyPatch
) -> None:
    empty.go_to(noun)
    place = empty.open_place()
    assert place.empty.isVisible()
    words = place.empty.words.text()
    assert len(words) > 40
    assert "Bring in files with spectra, or drop them" in words
    buttons = [b for b in place.findChildren(QPushButton) if b.isVisible()]
    assert buttons == [place.empty.button]
    asked: list[str] = []
    monkeypatch.setattr(
        QFileDialog, "getOpenFileNames", lambda *a: (asked.append(a[1]), ([], ""))[1]
    )
    QTest.mouseClick(place.empty.button, Qt.MouseButton.LeftButton)
    assert asked == ["Spectra to bring in"]


@pytest.mark.parametrize("noun", EMPTY)
def test_it_goes_when_there_is_something(sample: MainWindow, noun: str) -> None:
    sample.go_to(noun)
    assert not sample.open_place().empty.isVisible()


def test_a_halted_judging_can_be_taken_up_again(
    window: MainWindow, wait: Wait, small: Path
) -> None:
    window.open_path(small)
    wait(lambda: window.desk.file is not None)
    window.desk.stop()
    wait(lambda: window.desk.job is None)
    window.go_to("Course")
    place = window.open_place()
    assert place.empty.isVisible()
    QTest.mouseClick(place.empty.button, Qt.MouseButton.LeftButton)
    wait(lambda: window.desk.assessment is not None)
    assert not place.empty.isVisible()


def test_without_doubts_it_is_said_that_nothing_needs_an_eye(
    window: MainWindow, wait: Wait, small: Path
) -> None:
    (small / "remark.txt").unlink()
    window.open_path(small)
    wait(lambda: window.desk.job is None and window.desk.assessment is not None)
    from coatgui.campaign import operations

    window.go_to("Doubts")
    place = window.open_place()
    assert window.desk.campaign is not None
    for doubt in list(place.doubts):  # type: ignore[attr-defined]
        window.desk.edit(operations.remove_reading, doubt.reading.reading_id)
        wait(lambda: window.desk.job is None)
    assert place.empty.words.text().startswith("Nothing needs a person's eye.")
