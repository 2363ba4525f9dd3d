"""Water: the panel's sorption drawn from its own numbers, the laws beside one another."""

from __future__ import annotations

import numpy as np
import pytest

pytest.importorskip("PySide6")

import pyqtgraph as pg
from PySide6.QtWidgets import QApplication

from coatgui.window.axis import Plot
from coatgui.window.main_window import MainWindow
from coatgui.window.places.water_place import WaterPlace, sorption_curve, water_words


def place_of(window: MainWindow, panel: str, hours: float) -> WaterPlace:
    window.go_to("Water")
    assert window.desk.assessment is not None
    window.desk.select(
        next(
            r.reading_id
            for r in window.desk.assessment.readings
            if (r.panel, r.exposure_h) == (panel, hours)
        )
    )
    QApplication.processEvents()
    place = window.places[window.stack.currentIndex()]
    assert isinstance(place, WaterPlace)
    return place


def line(plot: Plot) -> tuple[np.ndarray, np.ndarray]:
    """The drawn law: the one curve of many points."""
    found = [i for i in plot.listDataItems() if isinstance(i, pg.PlotDataItem)]
    (curve,) = [i for i in found if i.xData is not None and len(i.xData) > 20]
    return curve.xData, curve.yData


def test_the_law_goes_through_the_readings_of_its_panel(sample: MainWindow) -> None:
    place = place_of(sample, "P2", 168)
    panel, readings = place._panel()
    assert panel is not None
    root, uptake = line(place.uptake)
    assert uptake[0] == pytest.approx(0.0, abs=1e-9)
    for reading in readings:
        assert reading.water_uptake is not None
        q = reading.water_uptake.quantity
        at = np.interp(np.sqrt(reading.exposure_h), root, uptake)
        assert at == pytest.approx(q.value, rel=0.03)
    root, capacitance = line(place.capacitance)
    assert panel.dry_capacitance is not None
    assert capacitance[0] == pytest.approx(panel.dry_capacitance.value)
    for reading in readings:
        assert reading.coating_capacitance is not None
        at = np.interp(np.sqrt(reading.exposure_h), root, capacitance)
        assert at == pytest.approx(reading.coating_capacitance.value, rel=0.01)


def test_half_of_the_water_is_there_at_the_time_that_the_law_gives(sample: MainWindow) -> None:
    panel, _ = place_of(sample, "K1", 24)._panel()
    assert panel is not None
    assert panel.diffusion_coefficient is not None
    assert panel.thickness_um is not None
    # Half of the uptake takes 0.04919 l²/D from two faces (Crank); from one face l is twice L.
    length_cm = panel.thickness_um * 1e-4
    half_h = 4 * 0.04919 * length_cm**2 / float(panel.diffusion_coefficient.value or 0) / 3600
    curve = sorption_curve(panel, np.array([half_h, 1e6]))
    assert curve is not None
    assert curve[0] / curve[1] == pytest.approx(0.5, rel=1e-3)


def test_every_law_has_its_row(sample: MainWindow) -> None:
    place = place_of(sample, "P2", 168)
    known = sample.desk.reading_assessment()
    assert known is not None
    assert known.water_uptake is not None
    for row, (name, percent) in enumerate(known.water_uptake.by_law):
        texts = [place.laws.item(row, column) for column in range(2)]
        assert texts[0] is not None
        assert texts[0].text() == name
        assert texts[1] is not None
        assert texts[1].text() == f"{percent:.2f}"
    assert place.laws.rowCount() == 8
    assert "Fickian" in place.said.text()


def test_it_says_so_in_words_and_gives_its_data(sample: MainWindow) -> None:
    place = place_of(sample, "P2", 168)
    panel, readings = place._panel()
    assert panel is not None
    words = water_words(panel)
    for part in ("P2: dry film", "vol-%", "choice of law", "D = ", "·10⁻¹⁰ cm²/s"):
        assert part in words
    assert place.about.text() == words
    rows = place.data_rows()
    assert len(rows) == len(readings) + 1
    assert {len(row) for row in rows} == {12}
    assert len(place.figure()) == 2


def test_the_colours_follow_the_palette(sample: MainWindow) -> None:
    place = place_of(sample, "P2", 168)
    sample.turn_tone()
    assert place.tone.dark
    assert place.uptake.backgroundBrush().color().name().upper() == place.tone.ground
    sample.turn_tone()
