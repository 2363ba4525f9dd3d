"""Files are looked at before they are taken: proposals, corrections, one undoable step."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest

pytest.importorskip("PySide6")

from PySide6.QtCore import Qt
from PySide6.QtTest import QTest
from PySide6.QtWidgets import QApplication, QCheckBox, QComboBox, QLineEdit

from coatgui.intake import Standing
from coatgui.intake.corrections import corrected_column as corrected
from coatgui.records import Column
from coatgui.window.dry_run_page import hours_said
from coatgui.window.main_window import MainWindow

Wait = Callable[[Callable[[], bool]], None]
LEFT = Qt.MouseButton.LeftButton


def settled(window: MainWindow) -> Callable[[], bool]:
    return lambda: window.desk.job is None and window.desk.assessment is not None


def rest(window: MainWindow) -> Callable[[], bool]:
    return lambda: window.desk.job is None and not window.incoming.busy


def spectrum_text(scale: float = 1.0, heading: str = "frequency / Hz;Z' / ohm;Z'' / ohm") -> str:
    frequency = np.logspace(5, -2, 36)
    z = 1e3 + scale * 1e8 / (1 + 2j * np.pi * frequency * 1e8 * scale * 1e-9)
    lines = [heading]
    lines += [f"{f:.6g};{v.real:.6g};{v.imag:.6g}" for f, v in zip(frequency, z, strict=True)]
    return "\n".join(lines) + "\n"


@pytest.fixture
def doubtful(tmp_path: Path) -> Path:
    """A folder with one spectrum that is clear, one without panel and time, one of odd columns."""
    folder = tmp_path / "walk"
    folder.mkdir()
    (folder / "A1_24h.csv").write_text(spectrum_text(), encoding="utf-8")
    (folder / "left at the end.csv").write_text(spectrum_text(0.5), encoding="utf-8")
    odd = spectrum_text(0.25, "f / Hz;first;second")
    (folder / "A3_24h.csv").write_text(odd, encoding="utf-8")
    return folder


def pick(window: MainWindow, file: str) -> None:
    page = window.dry_run
    row = next(i for i, r in enumerate(page.model.rows) if r.proposal.file == file)
    place = page.table.visualRect(page.model.index(row, 1)).center()
    QTest.mouseClick(page.table.viewport(), LEFT, pos=place)


def write(edit: QLineEdit, text: str) -> None:
    edit.setFocus()
    edit.selectAll()
    QTest.keyClicks(edit, text)
    QTest.keyClick(edit, Qt.Key.Key_Return)


def standing(window: MainWindow, file: str) -> Standing:
    return next(r.proposal.standing for r in window.incoming.rows() if r.proposal.file == file)


def test_a_doubtful_folder_is_shown_corrected_and_taken(
    window: MainWindow, wait: Wait, doubtful: Path
) -> None:
    window.open_path(doubtful)
    wait(rest(window))
    page = window.dry_run
    assert window.pages.currentWidget() is page
    assert QApplication.activeModalWidget() is None
    assert window.desk.file is None
    assert standing(window, "A1_24h.csv") is Standing.READY
    assert standing(window, "left at the end.csv") is Standing.ASKED

    # Panel and time in place.
    pick(window, "left at the end.csv")
    assert "panel" in page.about.text()
    write(page.panel, "A2")
    wait(rest(window))
    write(page.time, "2 d")
    wait(rest(window))
    assert standing(window, "left at the end.csv") in (Standing.READY, Standing.DOUBTFUL)
    assert page.plot.shown is not None

    # Columns in place: what the second and third are.
    pick(window, "A3_24h.csv")
    assert standing(window, "A3_24h.csv") in (Standing.ASKED, Standing.REFUSED, Standing.DOUBTFUL)
    for row, role in ((1, "real"), (2, "imaginary")):
        choice = page.columns.control(row, 1)
        assert isinstance(choice, QComboBox)
        choice.setCurrentIndex(choice.findData(role))
        choice.activated.emit(choice.currentIndex())
    wait(rest(window))
    assert standing(window, "A3_24h.csv") in (Standing.READY, Standing.DOUBTFUL)
    shown = page.plot.shown
    assert shown is not None
    assert shown.impedance_ohm.imag.min() < 0

    # The sign, with its effect on the plot at once, and back.
    turned = page.columns.control(2, 3)
    assert isinstance(turned, QCheckBox)
    QTest.mouseClick(turned, LEFT, pos=turned.rect().center())
    if not turned.isChecked():
        turned.click()
    assert page.plot.shown is not None
    assert page.plot.shown.impedance_ohm.imag.max() > 0
    wait(rest(window))
    turned = page.columns.control(2, 3)
    assert isinstance(turned, QCheckBox)
    assert turned.isChecked()
    turned.click()
    wait(rest(window))
    assert page.plot.shown.impedance_ohm.imag.min() < 0

    QTest.mouseClick(page.take, LEFT)
    wait(settled(window))
    campaign = window.desk.campaign
    assert campaign is not None
    assert campaign.title == "walk"
    panels = {p.panel_id: p.name for p in campaign.panels}
    times = {(panels[r.panel_id], r.exposure_h) for r in campaign.readings}
    assert times == {("A1", 24.0), ("A2", 48.0), ("A3", 24.0)}
    assert not window.incoming.is_there


def test_added_files_are_one_step_that_can_be_undone(
    window: MainWindow, wait: Wait, small: Path, doubtful: Path
) -> None:
    window.open_path(small)
    wait(settled(window))
    assert window.desk.campaign is not None
    before = window.desk.campaign.readings
    window.incoming.bring_in([doubtful, doubtful / "A1_24h.csv"])
    wait(rest(window))
    page = window.dry_run
    assert window.pages.currentWidget() is page
    # Nothing is blocked: set aside, look at the campaign, come back by the quiet line.
    QTest.mouseClick(page.back, LEFT)
    assert window.pages.currentIndex() == 1
    assert window.arrivals.waiting.isVisible()
    window.go(2)
    QTest.mouseClick(window.arrivals.waiting.button, LEFT)
    assert window.pages.currentWidget() is page

    pick(window, "left at the end.csv")
    page.out.click()
    wait(rest(window))
    assert standing(window, "left at the end.csv") is Standing.LEFT_OUT
    QTest.mouseClick(page.take, LEFT)
    wait(settled(window))
    assert len(window.desk.campaign.readings) == len(before) + 2
    assert window.desk.file is not None
    assert window.desk.file.undo_name is not None
    assert window.desk.file.undo_name.startswith("Import 2 readings")
    window.undo()
    wait(settled(window))
    assert [r.reading_id for r in window.desk.campaign.readings] == [r.reading_id for r in before]


def test_a_pasted_table_goes_the_same_way(window: MainWindow, wait: Wait, small: Path) -> None:
    window.open_path(small)
    wait(settled(window))
    QApplication.clipboard().setText("")
    window.files.paste_table()
    assert "clipboard" in window.trouble.words.text()
    QApplication.clipboard().setText(spectrum_text().replace(";", "\t"))
    window.files.paste_table()
    wait(rest(window))
    page = window.dry_run
    assert window.pages.currentWidget() is page
    assert page.model.rows[0].proposal.standing is Standing.ASKED
    write(page.panel, "P1")
    wait(rest(window))
    write(page.time, "500")
    wait(rest(window))
    QTest.mouseClick(page.take, LEFT)
    wait(settled(window))
    assert window.desk.campaign is not None
    new = [r for r in window.desk.campaign.readings if r.exposure_h == 500]
    assert len(new) == 1
    assert new[0].source.file.startswith("pasted ")


def test_panel_and_time_come_from_the_names_by_pointing(
    window: MainWindow, wait: Wait, tmp_path: Path
) -> None:
    folder = tmp_path / "weeks"
    folder.mkdir()
    names = {("K7", 1), ("K7", 2), ("K8", 1)}
    for number, (panel, week) in enumerate(sorted(names)):
        text = spectrum_text(0.1 + number)
        (folder / f"{panel} week {week} north.csv").write_text(text, encoding="utf-8")
    window.open_path(folder)
    wait(rest(window))
    page = window.dry_run
    assert all(r.proposal.standing is Standing.ASKED for r in page.model.rows)
    page.by_name.click()
    form = page.names
    assert form.isVisible()
    form.example.setCurrentText("K7 week 2 north.csv")
    assert [c.accessibleName() for c in form.choices] == [
        f"What '{word}' is" for word in ("K7", "week", "2", "north")
    ]
    assert not form.use.isEnabled()
    form.choices[0].setCurrentIndex(form.choices[0].findData("panel"))
    form.choices[2].setCurrentIndex(form.choices[2].findData("time"))
    form.unit.setCurrentIndex(form.unit.findData("wk"))
    # The table follows at once.
    said = {
        tuple(form.table.item(i, j).text() for j in (1, 2)) for i in range(form.table.rowCount())
    }
    assert said == {("K7", "168 h"), ("K7", "336 h"), ("K8", "168 h")}
    # Words that are no neighbours are still one stretch; two times are refused with a sentence.
    form.choices[0].setCurrentIndex(form.choices[0].findData("time"))
    assert "one word only" in form.trouble.text()
    assert not form.use.isEnabled()
    form.choices[0].setCurrentIndex(form.choices[0].findData("panel"))
    QTest.mouseClick(form.use, LEFT)
    wait(rest(window))
    assert all(r.proposal.standing is Standing.READY for r in page.model.rows)
    QTest.mouseClick(page.take, LEFT)
    wait(settled(window))
    campaign = window.desk.campaign
    assert campaign is not None
    panels = {p.panel_id: p.name for p in campaign.panels}
    taken = {(panels[r.panel_id], r.exposure_h) for r in campaign.readings}
    assert taken == {(panel, 168.0 * week) for panel, week in names}


def test_a_time_and_a_unit_as_people_write_them() -> None:
    assert hours_said("14 d") == 336.0
    assert hours_said("336,5 h") == 336.5
    assert hours_said("") is None
    for wrong in ("soon", "-3", "1e99"):
        with pytest.raises(ValueError, match=wrong):
            hours_said(wrong)
    column = Column(1, "x", "other", "")
    assert corrected(column, "real", "kohm", False, None).factor == 1e3
    assert corrected(column, "imaginary", "ohm", True, None).factor == -1.0
    assert corrected(column, "real", "ohm cm2", False, 20.0).factor == pytest.approx(0.05)
    with pytest.raises(ValueError, match="area"):
        corrected(column, "real", "ohm cm2", False, None)
    with pytest.raises(ValueError, match="unit"):
        corrected(column, "frequency", "furlong", False, None)
