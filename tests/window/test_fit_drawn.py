"""Band and parts of the fit, drawn when they are asked for, and the key that names the marks."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import pytest

pytest.importorskip("PySide6")

from PySide6.QtCore import QPointF, Qt
from PySide6.QtTest import QTest
from PySide6.QtWidgets import QApplication

from coatgui.fitting.views import fit_band, fit_parts
from coatgui.window.main_window import MainWindow
from coatgui.window.models import models
from coatgui.window.places.reading_place import ReadingPlace

Wait = Callable[[Callable[[], bool]], None]


@pytest.fixture
def place(sample: MainWindow) -> ReadingPlace:
    sample.go_to("Reading")
    assert sample.desk.assessment is not None
    known = next(
        r for r in sample.desk.assessment.readings if r.fit and "interface" in r.fit.model_name
    )
    sample.desk.select(known.reading_id)
    found = sample.open_place()
    assert isinstance(found, ReadingPlace)
    return found


def texts(place: ReadingPlace) -> list[str]:
    return [entry.text for entry in place.plots.key.entries]


def test_the_key_names_every_mark(place: ReadingPlace) -> None:
    assert texts(place)[:1] == ["measured"]
    assert {"fit", "residual of Z′", "residual of Z″"} <= set(texts(place))
    marks = {e.kind for e in place.plots.key.entries if e.text.startswith("residual")}
    assert marks == {"circle", "triangle"}
    assert "triangle: residual of Z″" in place.plots.key.accessibleDescription()


def test_the_band_is_drawn_when_asked_for(place: ReadingPlace) -> None:
    shades = place.plots.beside_fit.shades
    assert all(shade.path.isEmpty() for shade in shades)
    QTest.mouseClick(place.band, Qt.MouseButton.LeftButton)
    reading, known = place.desk.reading(), place.desk.reading_assessment()
    assert reading is not None
    assert known is not None
    assert known.fit is not None
    assert "95 % band" in texts(place)
    frequency = reading.spectrum.frequency_hz
    band = fit_band(known.fit, models(place.desk.campaign)[known.fit.model], frequency)
    assert band is not None
    assert band.holds.any()
    for number, (low, high) in enumerate(
        (
            (np.log10(band.modulus_low_ohm), np.log10(band.modulus_high_ohm)),
            (band.phase_low_deg, band.phase_high_deg),
        )
    ):
        for at in np.flatnonzero(band.holds)[1:-1]:
            x = float(np.log10(frequency[at]))
            inside = QPointF(x, float(low[at] + high[at]) / 2)
            outside = QPointF(x, float(high[at] + 3 * (high[at] - low[at]) + 0.01))
            assert shades[number].path.contains(inside)
            assert not shades[number].path.contains(outside)
    # In the complex plane the curve lies within.
    at = int(np.flatnonzero(band.holds)[len(frequency) // 3])
    z = band.impedance_ohm[at]
    assert not shades[2].path.isEmpty()
    assert shades[2].path.boundingRect().contains(QPointF(z.real, -z.imag))
    head = place.data_rows()[0]
    column = head.index("model_modulus_low_ohm")
    assert [row[column] for row in place.data_rows()[1:]] == pytest.approx(band.modulus_low_ohm)
    QTest.mouseClick(place.band, Qt.MouseButton.LeftButton)
    assert all(shade.path.isEmpty() for shade in shades)


def test_the_parts_are_drawn_when_asked_for(place: ReadingPlace) -> None:
    QTest.mouseClick(place.parts, Qt.MouseButton.LeftButton)
    reading, known = place.desk.reading(), place.desk.reading_assessment()
    assert reading is not None
    assert known is not None
    assert known.fit is not None
    model = models(place.desk.campaign)[known.fit.model]
    expected = fit_parts(known.fit, model, reading.spectrum.frequency_hz)
    drawn = [part for part in expected if part.impedance_ohm is not None]
    assert len(drawn) >= 3
    for part in drawn:
        assert any(text.startswith(part.name) for text in texts(place))
    dashes = [e.style for e in place.plots.key.entries if e.text.startswith(drawn[0].name)]
    assert dashes[0] is not Qt.PenStyle.SolidLine
    curves = place.plots.beside_fit.curves
    across, up = curves[0][0].across, curves[0][0].up
    first = fit_parts(known.fit, model, 10.0 ** np.asarray(across))[0]
    assert first.impedance_ohm is not None
    assert up == pytest.approx(np.log10(np.abs(first.impedance_ohm)), abs=1e-9)
    head = place.data_rows()[0]
    assert f"{drawn[0].name}: real_ohm" in head
    # Another reading has its own; without a fit there are none.
    assert place.desk.assessment is not None
    unfitted = next(r for r in place.desk.assessment.readings if r.fit is None)
    place.desk.select(unfitted.reading_id)
    QApplication.processEvents()
    assert not place.plots.beside_fit.parts
    assert not any(curve.across.size for curve in curves[0])


def test_bounds_are_said(place: ReadingPlace) -> None:
    place.parts.setChecked(True)
    assert place.desk.assessment is not None
    for known in place.desk.assessment.readings:
        if known.fit is None:
            continue
        place.desk.select(known.reading_id)
        bounded = [
            p for p in place.plots.beside_fit.parts if p.bounds and p.impedance_ohm is not None
        ]
        if bounded:
            name = ", ".join(bounded[0].bounds)
            assert any(f"at the bound of {name}" in text for text in texts(place))
            return
    pytest.fail("no reading has a part at a bound")
