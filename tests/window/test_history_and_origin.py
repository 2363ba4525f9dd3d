"""The column beside the places: where a number comes from, and what was done when."""

from __future__ import annotations

import hashlib
import os
import time
from collections.abc import Callable
from pathlib import Path

import pytest

pytest.importorskip("PySide6")

from PySide6.QtCore import Qt
from PySide6.QtTest import QTest

from coatgui.campaign import operations
from coatgui.shipped import sample_panels
from coatgui.window.main_window import MainWindow
from coatgui.window.origin import Step, numbers_of, trace

Wait = Callable[[Callable[[], bool]], None]
LEFT = Qt.MouseButton.LeftButton


def settled(window: MainWindow) -> Callable[[], bool]:
    return lambda: window.desk.job is None and window.desk.assessment is not None


def pick(window: MainWindow, panel: str, hours: float) -> None:
    assert window.desk.assessment is not None
    reading = next(
        r for r in window.desk.assessment.readings if r.panel == panel and r.exposure_h == hours
    )
    window.desk.select(reading.reading_id)


def traced(window: MainWindow, code: str) -> dict[str, str]:
    desk = window.desk
    reading, known = desk.reading(), desk.reading_assessment()
    assert reading is not None
    assert known is not None
    assert desk.campaign is not None
    assert desk.assessment is not None
    panel = next(p for p in desk.campaign.panels if p.panel_id == reading.panel_id)
    of_panel = next(p for p in desk.assessment.panels if p.panel_id == reading.panel_id)
    number = next(n for n in numbers_of(known) if n.code == code)
    steps: list[Step] = trace(number, reading, known, panel, of_panel, False)
    return {step.title: step.text for step in steps}


def test_every_number_is_traced_to_the_bytes_of_its_file(sample: MainWindow) -> None:
    pick(sample, "P1", 336)
    known = sample.desk.reading_assessment()
    assert known is not None
    own = (sample_panels() / "P1_336h.dat").read_bytes()
    codes = [number.code for number in numbers_of(known)]
    assert {"modulus_0.1", "coating_capacitance", "water_uptake", "pore_resistance"} <= set(codes)
    for code in codes:
        steps = traced(sample, code)
        assert hashlib.sha256(own).hexdigest() in steps["File"].replace(" ", "")
        assert "first point in line" in steps["Lines, columns and units"]
        assert f"{known.points_used} of {known.points_read} points" in steps["Points left out"]
        assert steps["Method"]
        assert steps["Source"]
        assert steps["Result"]


def test_the_numbers_of_a_trace_are_those_of_the_assessment(sample: MainWindow) -> None:
    pick(sample, "P1", 336)
    steps = traced(sample, "pore_resistance")
    # 1.0317 MΩ of the specimen on 12.6 cm².
    assert steps["Area"].startswith("12.6 cm²")
    assert "1.032 MΩ × 12.6 cm² = 13.00 MΩ cm²" in steps["Formula"]
    assert "R_po = " in steps["Parameters"]
    steps = traced(sample, "modulus_0.1")
    assert "Model" not in steps
    assert "at 100.0 mHz" in steps["Points"]
    steps = traced(sample, "water_uptake")
    assert "C_0 = 88.68 pF/cm²" in steps["Formula"]
    assert "Looyenga" in steps["Other mixing laws"]
    assert "Brasher" in steps["Source"]


def test_a_fact_is_clicked_for_its_origin(sample: MainWindow) -> None:
    pick(sample, "P1", 336)
    side = sample.side
    label = next(
        label
        for label, fact in zip(side.facts._labels, side.facts._shown, strict=False)
        if fact.code == "pore_resistance"
    )
    QTest.mouseClick(label, LEFT)
    assert side.origin.isVisible()
    assert side.origin.chooser.currentText() == "Pore resistance"
    assert "their hash is this one" in side.origin.text()
    # It follows the selection, for the same number.
    pick(sample, "P1", 168)
    assert side.origin.chooser.currentText() == "Pore resistance"
    assert "P1_168h.dat" in side.origin.text()


def test_the_history_is_gone_through_by_clicking(
    window: MainWindow, wait: Wait, small: Path
) -> None:
    window.open_path(small)
    wait(settled(window))
    desk = window.desk
    assert desk.campaign is not None
    assert desk.file is not None
    names = []
    for panel in desk.campaign.panels[:2]:
        desk.edit(operations.edit_panel, panel.panel_id, remark=f"looked at {panel.name}")
        wait(settled(window))
        names.append(desk.file.undo_name)
    window.side.show_history()
    steps = window.side.history.list
    texts = [steps.item(i).text() for i in range(steps.count())]
    assert len(texts) == 3
    assert texts[0].startswith(f"● {names[1]}")
    assert texts[2].startswith("Create the campaign")
    assert all(":" in text.splitlines()[1] for text in texts)

    def click(row: int) -> None:
        where = steps.visualItemRect(steps.item(row)).center()
        QTest.mouseClick(steps.viewport(), LEFT, pos=where)
        wait(settled(window))

    click(2)
    assert [p.remark for p in desk.campaign.panels[:2]] == ["", ""]
    assert steps.item(2).text().startswith("● ")
    assert "taken back" in steps.item(0).text()
    click(0)
    assert all(p.remark.startswith("looked at") for p in desk.campaign.panels[:2])
    click(1)
    assert [bool(p.remark) for p in desk.campaign.panels[:2]] == [True, False]
    # What is done now takes the place of what was taken back.
    desk.edit(operations.rename_campaign, "another title")
    wait(settled(window))
    assert "replaced" in steps.item(1).text()
    assert not steps.item(1).flags() & Qt.ItemFlag.ItemIsEnabled


def test_a_watched_folder_tells_and_takes_nothing(
    window: MainWindow, wait: Wait, small: Path
) -> None:
    left = small / "P1_672h.dat"
    kept = left.read_bytes()
    left.unlink()
    window.open_path(small)
    wait(settled(window))
    watching, line = window.watching, window.arrivals.arrived
    assert watching.folder == small
    watching.begin(small, quiet_s=0.1)
    end = time.monotonic() + 0.5
    while time.monotonic() < end:
        watching.look()
        time.sleep(0.05)
    assert not line.isVisible()  # what is in the campaign is not new
    assert window.desk.campaign is not None
    before = window.desk.campaign

    left.write_bytes(kept)
    os.utime(left)

    def told() -> bool:
        watching.look()
        time.sleep(0.05)
        return line.isVisible()

    wait(told)
    assert "1 new file in two panels: P1_672h.dat." in line.words.text()
    assert window.desk.campaign is before
    QTest.mouseClick(line.button, LEFT)
    wait(lambda: window.incoming.is_there)
    assert not line.isVisible()
    assert window.desk.campaign is before
    QTest.mouseClick(window.dry_run.take, LEFT)
    wait(settled(window))
    assert len(window.desk.campaign.readings) == len(before.readings) + 1
    # A click on "Stop watching" ends it.
    window.arrivals.stop_watching()
    assert watching.folder is None
