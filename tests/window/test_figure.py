"""Plots as pictures, on white whatever the window wears, and their data as tables."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path
from xml.etree import ElementTree

import numpy as np
import pytest

pytest.importorskip("PySide6")

from PySide6.QtCore import Qt, QTimer
from PySide6.QtGui import QColor, QImage
from PySide6.QtTest import QTest
from PySide6.QtWidgets import QApplication, QFileDialog, QLineEdit

from coatgui.window import palette
from coatgui.window.figure import SCALE, as_text
from coatgui.window.main_window import MainWindow

Wait = Callable[[Callable[[], bool]], None]
BOTH = Qt.KeyboardModifier.ControlModifier | Qt.KeyboardModifier.ShiftModifier


@pytest.fixture
def full(window: MainWindow, wait: Wait, small: Path) -> MainWindow:
    window.open_path(small)
    wait(lambda: window.desk.job is None and window.desk.assessment is not None)
    window.turn_tone()  # dark: the pictures must be on white all the same
    yield window
    window.turn_tone()


def press(window: MainWindow, key: Qt.Key) -> None:
    window.activateWindow()
    assert QTest.qWaitForWindowActive(window)
    QTest.keyClick(window, key, BOTH)


@pytest.mark.parametrize("place", [0, 1, 2])
def test_a_picture_is_copied_on_white(full: MainWindow, place: int) -> None:
    full.go(place)
    QApplication.processEvents()
    before = full.grab().toImage()
    press(full, Qt.Key.Key_C)
    image = QApplication.clipboard().image()
    figure = full.places[place].figure()
    assert image.width() >= SCALE * max(widget.width() for widget in figure)
    for x, y in ((1, 1), (image.width() - 2, image.height() - 2)):
        assert image.pixelColor(x, y) == QColor("#FFFFFF")
    drawn = {
        image.pixelColor(x, y).name()
        for x in range(0, image.width(), 7)
        for y in range(0, image.height(), 7)
    }
    assert len(drawn) > 10
    assert palette.colours(True).ground.lower() not in drawn
    # The window looks as before: the colours of paper were only for the picture.
    QApplication.processEvents()
    full.statusBar().clearMessage()
    after = full.grab(full.stack.geometry()).toImage()
    assert after.pixelColor(3, 3) == before.pixelColor(3, 3)


@pytest.mark.parametrize("ending", [".svg", ".png"])
def test_a_plot_is_saved(full: MainWindow, tmp_path: Path, ending: str) -> None:
    full.go(1)
    path = tmp_path / f"spectrum{ending}"

    def answer() -> None:
        dialog = QApplication.activeModalWidget()
        assert isinstance(dialog, QFileDialog)
        edit = next(e for e in dialog.findChildren(QLineEdit) if e.objectName() == "fileNameEdit")
        edit.setText(str(path))
        QTest.keyClick(edit, Qt.Key.Key_Return)

    QTimer.singleShot(100, answer)
    press(full, Qt.Key.Key_P)
    assert path.exists()
    if ending == ".png":
        assert not QImage(str(path)).isNull()
        return
    text = path.read_text(encoding="utf-8")
    root = ElementTree.fromstring(text)
    words = " ".join(root.itertext())
    for wanted in ("frequency", "phase / °", "after 1 h", "Ω", "Hz"):
        assert wanted in words
    shapes = sum(text.count(f"<{shape}") for shape in ("path", "circle", "ellipse"))
    assert shapes > 100  # points are shapes, not a picture of the screen
    assert "<image" not in text


def test_a_picture_that_cannot_be_written_is_said(full: MainWindow, tmp_path: Path) -> None:
    full.go(1)
    from coatgui.window import file_actions

    original = file_actions.file_to_write
    file_actions.file_to_write = lambda *_: tmp_path / "no such folder" / "a.svg"
    try:
        full.figures.save_picture()
    finally:
        file_actions.file_to_write = original
    assert "a.svg could not be written" in full.trouble.words.text()


def test_the_spectrum_is_copied_as_a_table(full: MainWindow) -> None:
    full.go(1)
    press(full, Qt.Key.Key_T)
    rows = [line.split("\t") for line in QApplication.clipboard().text().splitlines()]
    reading = full.desk.reading()
    assert reading is not None
    assert rows[0][:3] == ["frequency_hz", "real_ohm", "imaginary_ohm"]
    body = np.array([[float(cell) for cell in row[:5]] for row in rows[1:]])
    z = reading.spectrum.impedance_ohm
    assert np.array_equal(body[:, 0], reading.spectrum.frequency_hz)
    assert np.array_equal(body[:, 1] + 1j * body[:, 2], z)  # to the last digit
    assert body[:, 4] == pytest.approx(np.degrees(np.angle(z)))


@pytest.mark.parametrize(("place", "number"), [(0, 2), (2, 28)])
def test_other_places_are_copied_as_tables(full: MainWindow, place: int, number: int) -> None:
    full.go(place)
    press(full, Qt.Key.Key_T)
    rows = [line.split("\t") for line in QApplication.clipboard().text().splitlines()]
    assert len([row for row in rows if not row[3].startswith("event: ")]) == 1 + number
    assert len({len(row) for row in rows}) == 1


def test_where_there_is_no_plot_it_is_said(full: MainWindow) -> None:
    full.go(5)
    press(full, Qt.Key.Key_C)
    assert "no plot" in full.trouble.words.text()


def test_names_cannot_shift_cells() -> None:
    assert as_text([["a\tb\nc", None, 0.1]]) == "a b c\t\t0.1\n"
