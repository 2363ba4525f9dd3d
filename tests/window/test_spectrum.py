"""The spectrum's plots and the section through the coating."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from itertools import pairwise

import numpy as np
import pytest

pytest.importorskip("PySide6")

from PySide6.QtCore import QEvent, QPoint, QPointF, Qt
from PySide6.QtGui import QMouseEvent
from PySide6.QtTest import QTest
from PySide6.QtWidgets import QApplication

from coatgui.records import Bound, Quantity, ReadingAssessment
from coatgui.window import palette
from coatgui.window.main_window import MainWindow
from coatgui.window.places.reading_place import OTHER_TIMES, REPLICATES, ReadingPlace
from coatgui.window.section import SectionView, change, section_of

Wait = Callable[[Callable[[], bool]], None]


def known(window: MainWindow, panel: str, hours: float) -> ReadingAssessment:
    assert window.desk.assessment is not None
    return next(
        r for r in window.desk.assessment.readings if (r.panel, r.exposure_h) == (panel, hours)
    )


def place_of(window: MainWindow) -> ReadingPlace:
    window.go(1)
    QApplication.processEvents()
    place = window.places[1]
    assert isinstance(place, ReadingPlace)
    return place


def drag(window: MainWindow, plot: object, start: QPoint, end: QPoint) -> None:
    """Drag with Shift held, in steps as a hand does."""
    view = plot.viewport()  # type: ignore[attr-defined]
    shift = Qt.KeyboardModifier.ShiftModifier
    QTest.mousePress(view, Qt.MouseButton.LeftButton, shift, start)
    for step in range(1, 9):
        point = start + (end - start) * step / 8
        move = QMouseEvent(
            QEvent.Type.MouseMove, QPointF(point), QPointF(view.mapToGlobal(point)),
            Qt.MouseButton.NoButton, Qt.MouseButton.LeftButton, shift,
        )  # fmt: skip
        QApplication.sendEvent(view, move)
        QTest.qWait(20)  # the plots take no more than a hundred moves a second
    QTest.mouseRelease(view, Qt.MouseButton.LeftButton, shift, end)
    for _ in range(3):
        QApplication.processEvents()


def test_other_times_and_replicates_are_drawn_beside(sample: MainWindow) -> None:
    place = place_of(sample)
    sample.desk.select(known(sample, "P2", 336).reading_id)
    curves = place.plots._others[0]
    place.overlay.setCurrentIndex(OTHER_TIMES)
    shown = [c for c in curves if c.across.size]
    assert len(shown) == 8  # nine inspections, and this is one of them
    shades = [curve.pen.color().lightnessF() for curve in shown]
    assert shades == sorted(shades, reverse=True)  # deeper with time, on a light ground
    steps = np.diff(shades)
    assert np.ptp(steps[:5]) < 0.01  # evenly, up to the step over the reading itself
    place.overlay.setCurrentIndex(REPLICATES)
    shown = [c for c in curves if c.across.size]
    assert len(shown) == 3
    place.overlay.setCurrentIndex(0)
    assert not [c for c in curves if c.across.size]


def box(place: ReadingPlace) -> tuple[QPoint, QPoint]:
    """Corners of a box about points 10 to 13 of the phase, as the plot stands now."""
    for _ in range(3):
        QApplication.processEvents()
    on_screen = place.plots._on_screen(place.plots.phase)
    chosen, before, after = on_screen[10:14], on_screen[9], on_screen[14]
    # Half-way to the neighbours, whichever way the frequencies run and however wide the plot is.
    ends = sorted((round((before[0] + chosen[0, 0]) / 2), round((after[0] + chosen[-1, 0]) / 2)))
    start = QPoint(ends[0], round(chosen[:, 1].min()) - 9)
    return start, QPoint(ends[1], round(chosen[:, 1].max()) + 9)


def test_a_box_leaves_points_out_and_takes_them_back(sample: MainWindow, wait: Wait) -> None:
    place = place_of(sample)
    reading = known(sample, "M2", 168)
    sample.desk.select(reading.reading_id)
    QApplication.processEvents()
    drag(sample, place.plots.phase, *box(place))
    record = sample.desk.reading()
    assert record is not None
    assert [point for point, _ in record.left_out] == [10, 11, 12, 13]
    wait(lambda: sample.desk.job is None)
    after = known(sample, "M2", 168)
    assert after.points_used == reading.points_used - 4
    # All that the box holds are left out already: the same box takes them back.
    drag(sample, place.plots.phase, *box(place))
    record = sample.desk.reading()
    assert record is not None
    assert not record.left_out


def test_a_click_leaves_a_point_out_greys_it_in_every_plot_and_can_be_undone(
    sample: MainWindow, wait: Wait
) -> None:
    place = place_of(sample)
    sample.desk.select(known(sample, "M2", 168).reading_id)
    for _ in range(3):
        QApplication.processEvents()
    plots = place.plots

    def click() -> None:
        x, y = plots._on_screen(plots.phase)[20]
        where = QPoint(round(x), round(y))
        left, none = Qt.MouseButton.LeftButton, Qt.KeyboardModifier.NoModifier
        QTest.mouseClick(plots.phase.viewport(), left, none, where)
        wait(lambda: sample.desk.job is None)
        for _ in range(3):
            QApplication.processEvents()

    def left_out() -> list[int]:
        record = sample.desk.reading()
        assert record is not None
        return [point for point, _ in record.left_out]

    click()
    assert left_out() == [20]
    for crosses, (across, _) in zip(plots._crosses, plots.drawn.places(), strict=False):
        assert crosses.across.tolist() == [across[20]]
    click()
    assert left_out() == []
    assert sample.desk.file is not None
    sample.desk.undo()
    assert left_out() == [20]
    sample.desk.undo()
    assert left_out() == []


def test_the_cursor_reads_all_plots(sample: MainWindow) -> None:
    place = place_of(sample)
    sample.desk.select(known(sample, "P2", 336).reading_id)
    QApplication.processEvents()
    plots = place.plots
    for plot in (plots.modulus, plots.plane):
        x, y = plots._on_screen(plot)[30]
        QTest.mouseMove(plot.viewport(), QPoint(round(x), round(y)) + QPoint(40, 40))
        QTest.mouseMove(plot.viewport(), QPoint(round(x), round(y)))
        QApplication.processEvents()
        spectrum = sample.desk.reading()
        assert spectrum is not None
        assert abs(plots.place - 30) <= 1
        for ring in plots._rings:
            assert ring.across.size == 1
        words = place.read_out.text()
        for wanted in ("Hz", "|Z|", "phase", "Z′", "−Z″", "residual"):
            assert wanted in words
    assert plots._lines[0].value == plots._lines[2].value


def test_the_section_carries_the_fitted_values(sample: MainWindow) -> None:
    assert sample.desk.campaign is not None
    panels = {p.panel_id: p for p in sample.desk.campaign.panels}
    reading = known(sample, "P2", 336)
    section = section_of(reading, panels[reading.panel_id])
    assert section is not None
    assert [band.kind for band in section.bands] == ["solution", "film", "interface", "metal"]
    words = section.in_words()
    pores, water = reading.pore_resistance, reading.water_uptake
    assert pores is not None
    assert pores.value is not None
    assert water is not None
    for wanted in (
        "Film, 60 µm",
        f"R_po {pores.value / 1e6:.3g} MΩ cm² (",
        f"water {water.quantity.value:.3g} vol-% (",
        "R_ct",
        "Blasted",
    ):
        assert wanted in words
    assert section.reacts
    # A tight film: the pore is only known to be narrow, and is drawn as such.
    tight = known(sample, "K1", 1)
    assert tight.pore_resistance is not None
    assert tight.pore_resistance.bound is Bound.AT_LEAST
    narrow = section_of(tight, panels[tight.panel_id])
    assert narrow is not None
    assert narrow.pore is not None
    assert section.pore is not None
    assert narrow.pore_is_bound
    assert narrow.pore < section.pore
    assert narrow.water < section.water
    assert not narrow.reacts
    # A reading that was not fitted has none.
    assert section_of(known(sample, "P3", 504), None) is None


def test_the_section_keeps_its_words_inside(sample: MainWindow) -> None:
    view = SectionView(palette.colours(False))
    for panel, hours in (("P4", 672), ("K1", 1)):
        view.show_section(section_of(known(sample, panel, hours), None), palette.colours(False))
        for height in (190, 230, 320):
            view.resize(330, height)
            areas = [area for _, area in view.areas()]
            assert areas[-1].bottom() <= height
            assert all(a.bottom() <= b.top() + 0.01 for a, b in pairwise(areas))
            assert not view.grab().isNull()
    view.deleteLater()


def test_the_section_says_how_its_values_changed(sample: MainWindow) -> None:
    now, before = known(sample, "P2", 672), known(sample, "P2", 504)
    assert now.fit is not None
    section = section_of(now, None, None, before)
    assert section is not None
    words = section.in_words()
    assert "Δ change since 504 h" in words
    pores = now.pore_resistance, before.pore_resistance
    assert pores[0] is not None
    assert pores[0].value is not None
    assert pores[1] is not None
    assert pores[1].value is not None
    percent = 100 * (pores[0].value / pores[1].value - 1)
    line = next(line for band in section.bands for line in band.lines if line.startswith("R_po"))
    assert line.endswith(f"Δ{percent:+.0f} %".replace("-", "−")) or "÷" in line or "×" in line
    plain = section_of(now, None)
    assert plain is not None
    assert "Δ" not in plain.in_words()
    # In the place itself the last reading before this one is meant.
    sample.go_to("Reading")
    sample.desk.select(now.reading_id)
    shown = sample.open_place().section.accessibleDescription()  # type: ignore[attr-defined]
    assert "Δ change since 504 h" in shown


def test_only_what_both_readings_fix_is_said_to_have_changed() -> None:
    both = Quantity(2.0e9, 1.9e9, 2.1e9, Bound.TWO_SIDED, "Ω cm²")
    less = replace(both, value=1.0e9)
    assert change(less, both).strip() == "Δ÷2"
    assert change(replace(both, value=2.2e9), both).strip() == "Δ+10 %"
    assert change(replace(both, value=1.9e9), both).strip() == "Δ−5 %"
    assert change(replace(both, bound=Bound.AT_LEAST), both) == ""
    assert change(both, None) == ""
    assert change(replace(both, unit="Ω"), both) == ""
