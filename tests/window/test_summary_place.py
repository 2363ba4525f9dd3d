"""The inspection summary in the window: the pages as they print, its fields, its files."""

from __future__ import annotations

import threading
from collections.abc import Callable
from pathlib import Path

import pytest

pytest.importorskip("PySide6")

from PySide6.QtCore import Qt
from PySide6.QtGui import QImage
from PySide6.QtTest import QTest
from PySide6.QtWidgets import QApplication, QPushButton

from coatgui.output import document, inspection_summary
from coatgui.output.pages import page_height, paint_pages
from coatgui.window import file_actions
from coatgui.window.figure import as_text
from coatgui.window.main_window import MainWindow
from coatgui.window.places.summary_place import SummaryPlace

Wait = Callable[[Callable[[], bool]], None]


def place_of(window: MainWindow) -> SummaryPlace:
    window.go_to("Summary")
    place = window.open_place()
    assert isinstance(place, SummaryPlace)
    return place


def set_out(window: MainWindow) -> Callable[[], bool]:
    place = place_of(window)
    return lambda: window.desk.job is None and not place.printing.busy and bool(place._shown)


def type_into(place: SummaryPlace, field: str, text: str) -> None:
    line = place.fields[field].line
    line.setFocus()
    line.selectAll()
    QTest.keyClicks(line, text)
    QTest.keyClick(line, Qt.Key.Key_Return)


def test_the_pages_are_those_that_print(sample: MainWindow, wait: Wait) -> None:
    place = place_of(sample)
    wait(set_out(sample))
    assert sample.desk.assessment is not None
    assert sample.desk.campaign is not None
    expected: list[QImage] = []
    made = inspection_summary(sample.desk.assessment, sample.desk.campaign)
    paint_pages(made, place.pages.pixels(), lambda _p, _t, image: expected.append(image))
    assert len(place.printing.pages) == len(expected) > 10
    for shown, wanted in zip(place.printing.pages, expected, strict=True):
        assert QImage.fromData(shown) == wanted
    assert place.standing.text().startswith(f"{len(expected)} pages")
    # What is seen is the first page, at its own size.
    top = place.pages.viewport().grab().toImage()
    left = (place.pages.viewport().width() - place.pages.page_width()) // 2
    part = top.copy(left + 20, 40, 300, 200).convertToFormat(QImage.Format.Format_RGB32)
    assert part == expected[0].copy(20, 24, 300, 200)


def test_they_are_made_beside_the_window(
    sample: MainWindow, wait: Wait, monkeypatch: pytest.MonkeyPatch
) -> None:
    from coatgui.window import printed_pages
    from coatgui.window.places import summary_place

    threads: list[threading.Thread] = []
    for module, name in ((summary_place, "inspection_summary"), (printed_pages, "paint_pages")):
        original = getattr(module, name)

        def watched(*a: object, of: Callable[..., object] = original, **k: object) -> object:
            threads.append(threading.current_thread())
            return of(*a, **k)

        monkeypatch.setattr(module, name, watched)
    place_of(sample)
    wait(set_out(sample))
    assert len(threads) >= 2
    assert threading.main_thread() not in threads


def test_a_field_is_an_edit_and_stands_on_the_page(sample: MainWindow, wait: Wait) -> None:
    place = place_of(sample)
    wait(set_out(sample))
    before = list(place.printing.pages)
    type_into(place, "laboratory", "Slip Laboratory")
    type_into(place, "standards", "first; second")
    wait(set_out(sample))
    assert sample.desk.campaign is not None
    assert sample.desk.campaign.identification.laboratory == "Slip Laboratory"
    assert sample.desk.campaign.identification.standards == ("first", "second")
    assert place.printing.pages[0] != before[0]
    words = as_text(place.data_rows())
    assert "Laboratory\tSlip Laboratory" in words
    assert "Standards\tfirst; second" in words
    sample.undo()
    sample.undo()
    wait(set_out(sample))
    assert place.fields["laboratory"].line.text() == ""
    assert place.printing.pages == before


def test_contents_turn_the_pages(sample: MainWindow, wait: Wait) -> None:
    place = place_of(sample)
    wait(set_out(sample))
    made = place.printing.document
    assert made is not None
    titles = [b.text for b in made.blocks if isinstance(b, document.Heading)]
    listed = [place.contents.item(i).text() for i in range(place.contents.count())]
    assert [text.strip().split(" ", 1)[1] for text in listed] == titles
    last = place.contents.count() - 1
    place.contents.setFocus()
    QTest.keyClick(place.contents, Qt.Key.Key_End)
    assert place.contents.currentRow() == last
    assert place.pages.at_top() == place.printing.headings[last].page
    place.pages.setFocus()
    QTest.keyClick(place.pages, Qt.Key.Key_Home)
    assert place.pages.verticalScrollBar().value() == 0
    assert place.contents.currentRow() < last


def test_another_width_gives_sharp_pages(sample: MainWindow, wait: Wait) -> None:
    place = place_of(sample)
    wait(set_out(sample))
    sample.resize(1000, 800)
    QApplication.processEvents()
    wait(lambda: not place.pages._settled.isActive())
    wait(set_out(sample))
    assert {QImage.fromData(page).width() for page in place.printing.pages} == {
        place.pages.page_width()
    }
    assert place.pages._high() == round(page_height(place.pages.page_width()))


@pytest.mark.parametrize(("button", "ending"), [("Write PDF…", ".pdf"), ("Write HTML…", ".html")])
def test_it_is_written(
    sample: MainWindow, wait: Wait, tmp_path: Path, button: str, ending: str,
    monkeypatch: pytest.MonkeyPatch,
) -> None:  # fmt: skip
    place = place_of(sample)
    wait(set_out(sample))
    type_into(place, "customer", "Estuary Rowing Club")
    wait(set_out(sample))
    path = tmp_path / f"summary{ending}"
    asked: list[str] = []

    def name(_parent: object, _title: str, kinds: str, suggested: Path) -> Path:
        asked.append(kinds)
        assert suggested.suffix == ending
        return path

    monkeypatch.setattr(file_actions, "file_to_write", name)
    pressed = next(b for b in place.findChildren(QPushButton) if b.text() == button)
    QTest.mouseClick(pressed, Qt.MouseButton.LeftButton)
    wait(lambda: sample.desk.job is None and path.exists())
    assert ending in asked[0]
    content = path.read_bytes()
    if ending == ".pdf":
        assert content.startswith(b"%PDF-")
    else:
        assert b"Estuary Rowing Club" in content


def test_without_readings_it_says_so(window: MainWindow, wait: Wait, tmp_path: Path) -> None:
    from coatgui.campaign import CampaignFile
    from coatgui.records import Campaign

    CampaignFile.create(tmp_path / "e.coatgui", Campaign("c", "Empty"), {}).close()
    window.open_path(tmp_path / "e.coatgui")
    wait(lambda: window.desk.job is None and window.desk.file is not None)
    place = place_of(window)
    assert place.standing.text().startswith("No readings yet")
    assert not place.printing.pages
