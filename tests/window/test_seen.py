"""What was seen on a panel: ratings and photographs, entered, shown everywhere, taken back."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest

pytest.importorskip("PySide6")

import pyqtgraph as pg
from PySide6.QtCore import QBuffer, QIODevice, Qt
from PySide6.QtGui import QColor, QImage
from PySide6.QtTest import QTest
from PySide6.QtWidgets import QApplication, QFileDialog

from coatgui.window.main_window import MainWindow
from coatgui.window.photographs import PhotographWindow
from coatgui.window.places.course_place import CoursePlace
from coatgui.window.seen import SeenView
from coatgui.window.side_column import FACTS

Wait = Callable[[Callable[[], bool]], None]


def judged(window: MainWindow) -> Callable[[], bool]:
    return lambda: window.desk.job is None and window.desk.assessment is not None


@pytest.fixture
def seen(sample: MainWindow) -> SeenView:
    assert sample.desk.assessment is not None
    known = next(
        r for r in sample.desk.assessment.readings if (r.panel, r.exposure_h) == ("P2", 336)
    )
    sample.desk.select(known.reading_id)
    sample.side.show_seen()
    return sample.side.seen


def picture(path: Path, width: int = 400, height: int = 300, colour: str = "#A63F1E") -> Path:
    image = QImage(width, height, QImage.Format.Format_RGB32)
    image.fill(QColor(colour))
    assert image.save(str(path))
    return path


def rate(view: SeenView, scale: str, grade: str) -> None:
    view.scale.setCurrentIndex(view.scale.findData(scale))
    view.lines["grade"].clear()
    QTest.keyClicks(view.lines["grade"], grade)
    QTest.keyClick(view.lines["grade"], Qt.Key.Key_Return)


def test_a_rating_is_entered_shown_and_taken_back(
    sample: MainWindow, seen: SeenView, wait: Wait
) -> None:
    QTest.keyClicks(seen.lines["edition"], "ISO 4628-2:2016")
    QTest.keyClicks(seen.lines["rater"], "A. Painter")
    rate(seen, "iso_4628_2", "7(S9)")
    assert "7(S9)" in seen.wrong.text()
    assert not sample.desk.campaign.ratings  # type: ignore[union-attr]
    rate(seen, "iso_4628_2", "2(S3)")
    assert not seen.wrong.isVisible()
    assert sample.desk.campaign is not None
    (rating,) = sample.desk.campaign.ratings
    assert rating.seen.value == "2(S3)"
    assert rating.seen.edition == "ISO 4628-2:2016"
    assert rating.seen.exposure_h == 336.0
    line = seen.ratings.item(0).text()
    for said in ("336 h", "blisters, ISO 4628-2", "2(S3)", "ISO 4628-2:2016", "A. Painter"):
        assert said in line
    sample.side.open(FACTS)
    assert "blisters, ISO 4628-2: 2(S3)" in sample.facts.text()
    assert sample.desk.file is not None
    assert sample.desk.file.undo_name == "Rate panel P2 2(S3)"
    sample.undo()
    assert not sample.desk.campaign.ratings
    assert "2(S3)" not in sample.facts.text()
    sample.redo()
    sample.side.show_seen()
    seen.ratings.setCurrentRow(0)
    QTest.keyClick(seen.ratings, Qt.Key.Key_Delete)
    assert not sample.desk.campaign.ratings
    assert seen.ratings.count() == 0


def test_ratings_stand_beneath_the_course(sample: MainWindow, seen: SeenView, wait: Wait) -> None:
    sample.go_to("Course")
    course = sample.open_place()
    assert isinstance(course, CoursePlace)
    assert not course.ratings.isVisible()
    rate(seen, "iso_4628_2", "2(S3)")
    assert sample.desk.assessment is not None
    other = next(
        r for r in sample.desk.assessment.readings if (r.panel, r.exposure_h) == ("P3", 336)
    )
    wait(judged(sample))
    sample.desk.select(other.reading_id)
    rate(seen, "iso_4628_2", "0")
    wait(judged(sample))
    assert course.ratings.isVisible()
    (marks,) = [i for i in course.ratings.items() if isinstance(i, pg.ScatterPlotItem)]
    assert marks.getData()[0] == pytest.approx([np.log10(336)])
    texts = [i.toPlainText() for i in course.ratings.items() if isinstance(i, pg.TextItem)]
    assert texts == ["0 … 2(S3)"]
    assert "iso_4628_2: 0 … 2(S3)" in course.ratings.accessibleDescription()
    # On the time axis of the course, whatever is done to that.
    course.times.setCurrentIndex(2)
    assert course.ratings.viewRange()[0] == pytest.approx(course.course.viewRange()[0])
    rows = [row for row in course.data_rows() if row[3] == "iso_4628_2"]
    assert {(row[1], row[4]) for row in rows} == {("P2", "2(S3)"), ("P3", "0")}
    assert course.ratings in course.figure()


def test_events_of_the_picked_panel_are_marked(sample: MainWindow) -> None:
    sample.go_to("Course")
    course = sample.open_place()
    assert isinstance(course, CoursePlace)
    assert sample.desk.assessment is not None
    marked = 0
    for panel in sample.desk.assessment.panels:
        reading = next(r for r in sample.desk.assessment.readings if r.panel_id == panel.panel_id)
        sample.desk.select(reading.reading_id)
        events = [e for e in panel.events if e.by_h is not None]
        lines = [i for i in course.course.items() if i in course._events]
        # One line where several happened by the same inspection, or their names would overlap.
        times = sorted({e.by_h for e in events})
        assert sorted(line.value() for line in lines) == pytest.approx(np.log10(times))
        written = ", ".join(line.label.format for line in lines)
        assert all(e.code.replace("_", " ") in written for e in events)
        marked += len(events)
    assert marked > 0


def test_a_photograph_is_attached_shown_and_taken_back(
    sample: MainWindow, seen: SeenView, wait: Wait, tmp_path: Path,
    monkeypatch: pytest.MonkeyPatch,
) -> None:  # fmt: skip
    path = picture(tmp_path / "panel P2 <b>.png")
    monkeypatch.setattr(QFileDialog, "getOpenFileNames", lambda *_: ([str(path)], ""))
    seen.add.click()
    assert sample.desk.campaign is not None
    (photograph,) = sample.desk.campaign.photographs
    assert photograph.exposure_h == 336.0
    wait(lambda: not seen.small.busy)
    item = seen.pictures.item(0)
    assert "panel P2" in item.text()
    shown = item.icon().pixmap(seen.pictures.iconSize()).toImage()
    assert shown.pixelColor(shown.width() // 2, shown.height() // 2) == QColor("#A63F1E")
    seen.caption.setFocus()
    QTest.keyClicks(seen.caption, "rust at the scribe")
    QTest.keyClick(seen.caption, Qt.Key.Key_Return)
    assert sample.desk.campaign.photographs[0].caption == "rust at the scribe"
    sample.side.open(FACTS)
    assert "Photograph: rust at the scribe" in sample.facts.text()
    sample.side.show_seen()
    seen.show_large()
    large = next(w for w in QApplication.topLevelWidgets() if isinstance(w, PhotographWindow))
    assert large.windowTitle() == "P2, 336 h: rust at the scribe"
    assert not large.isModal()
    large.close()
    seen.pictures.setFocus()
    QTest.keyClick(seen.pictures, Qt.Key.Key_Delete)
    assert not sample.desk.campaign.photographs
    sample.undo()
    assert sample.desk.campaign.photographs[0].caption == "rust at the scribe"


def test_what_is_no_photograph_is_refused(
    sample: MainWindow, seen: SeenView, tmp_path: Path
) -> None:
    evil = tmp_path / "evil.png"
    evil.write_text("<svg xmlns='http://www.w3.org/2000/svg' onload='alert(1)'/>")
    seen.add_photograph(evil)
    assert "no photograph" in sample.trouble.words.text()
    seen.add_photograph(tmp_path / "not there.png")
    assert "not there.png could not be read" in sample.trouble.words.text()
    assert sample.desk.campaign is not None
    assert not sample.desk.campaign.photographs


def test_a_large_photograph_is_made_small_beside_the_window(tmp_path: Path) -> None:
    from coatgui.window.photographs import SMALL, decoded

    held = QBuffer()
    held.open(QIODevice.OpenModeFlag.ReadWrite)
    image = QImage(4000, 3000, QImage.Format.Format_RGB32)
    image.fill(QColor("#123456"))
    image.save(held, "JPEG")  # type: ignore[call-overload]
    content = bytes(held.data().data())
    small = decoded(content, "image/jpeg", SMALL)
    assert small.width() <= SMALL.width()
    assert small.height() <= SMALL.height()
    assert not small.isNull()
    # A picture is only ever read as what its content was found to be.
    assert decoded(content, "image/png", SMALL).isNull()
