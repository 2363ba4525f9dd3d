"""Time constants against exposure time: computed in the background, once, and drawn where they
are."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import pytest

pytest.importorskip("PySide6")

import pyqtgraph as pg
from PySide6.QtCore import QObject
from PySide6.QtWidgets import QApplication, QGraphicsPathItem

from coatgui.records import Spectrum
from coatgui.window.main_window import MainWindow
from coatgui.window.places.course_place import TIME_CONSTANTS, WATER, CoursePlace
from coatgui.window.time_constants import Outlines, Wanted

Wait = Callable[[Callable[[], bool]], None]


def wanted(time_constant_s: float, name: str = "one", points: int = 49) -> Wanted:
    """A resistor and a capacitor in parallel, with a resistor before them."""
    frequency_hz = np.logspace(5, -2, points)
    z = 100.0 + 1e6 / (1.0 + 2j * np.pi * frequency_hz * time_constant_s)
    return Wanted(name, 1.0, Spectrum(frequency_hz, z), np.ones(points, dtype=bool))


def test_a_known_time_constant_is_found_in_the_background(
    application: QApplication, wait: Wait
) -> None:
    owner = QObject()
    outlines = Outlines(owner)
    item = wanted(0.1)
    outlines.want([item])
    assert outlines.busy
    wait(lambda: not outlines.busy)
    found = outlines.of(item)
    assert found is not None
    (peak,) = found.peaks
    assert peak.time_constant_s == pytest.approx(0.1, rel=0.05)
    assert peak.resistance_ohm == pytest.approx(1e6, rel=0.05)
    outlines.want([item])  # kept: nothing to do
    assert not outlines.busy


def test_what_is_kept_is_kept_by_spectrum_and_points(application: QApplication, wait: Wait) -> None:
    owner = QObject()
    outlines = Outlines(owner)
    item = wanted(0.1)
    outlines.want([item])
    wait(lambda: not outlines.busy)
    used = item.used.copy()
    used[0] = False
    assert outlines.has(Wanted("another name", 5.0, item.spectrum, item.used))
    assert not outlines.has(Wanted("one", 1.0, item.spectrum, used))
    few = wanted(0.1, points=9)
    outlines.want([few])
    wait(lambda: not outlines.busy)
    assert outlines.has(few)
    assert outlines.of(few) is None


def test_stopping_leaves_what_is_there(application: QApplication, wait: Wait) -> None:
    owner = QObject()
    outlines = Outlines(owner)
    items = [wanted(10.0**-power, str(power)) for power in range(4)]
    outlines.want(items)
    wait(lambda: outlines.has(items[0]))
    outlines.stop()
    assert not outlines.busy
    assert outlines.of(items[0]) is not None


def test_a_column_stands_at_every_inspection(sample: MainWindow, wait: Wait) -> None:
    sample.go(2)
    place = sample.places[2]
    assert isinstance(place, CoursePlace)
    assert sample.desk.assessment is not None
    reading = next(
        r for r in sample.desk.assessment.readings if (r.panel, r.exposure_h) == ("P2", 336)
    )
    sample.desk.select(reading.reading_id)
    place.below.setCurrentIndex(TIME_CONSTANTS)
    assert place.constants.isVisible()
    assert not place.water.isVisible()
    assert "exploratory" in place.exploratory.text()
    wait(lambda: not place.outlines.busy)
    # A band and the outline itself at each inspection; the outline lies within the band's ends.
    shapes = [i for i in place.constants.items() if type(i) is QGraphicsPathItem]
    assert len(shapes) == 18
    for itself, band in zip(shapes[::2], shapes[1::2], strict=True):  # the topmost first
        widths = band.path().boundingRect().width(), itself.path().boundingRect().width()
        assert widths[1] <= widths[0] + 1e-12
    middles = sorted(shape.path().boundingRect().center().x() for shape in shapes[::2])
    hours = [r.exposure_h for r in sample.desk.assessment.readings if r.panel == "P2"]
    assert middles == pytest.approx(np.log10(sorted(hours)), abs=1e-6)
    marks = [i for i in place.constants.items() if isinstance(i, pg.ScatterPlotItem)]
    drawn = sorted(float(y) for m in marks for y in m.getData()[1])
    rows = [row for row in place.data_rows() if row[3] == "time_constant_exploratory"]
    assert drawn == pytest.approx(sorted(np.log10([float(str(row[4])) for row in rows])))
    assert place.figure()[-1] is place.constants
    # Another panel is another picture; what is left is given up.
    other = next(r for r in sample.desk.assessment.readings if r.panel == "M2")
    sample.desk.select(other.reading_id)
    assert place.outlines.busy
    sample.go(0)
    assert not place.outlines.busy
    sample.go(2)
    place.below.setCurrentIndex(WATER)
    assert place.water.isVisible()
    assert place.figure()[-1] is place.water
