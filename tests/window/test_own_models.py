"""Models of a person's own: composed, kept, pinned for one reading or several, drawn, removed."""

from __future__ import annotations

import json
from collections.abc import Callable

import pytest

pytest.importorskip("PySide6")

from PySide6.QtCore import QPoint, Qt
from PySide6.QtTest import QTest
from PySide6.QtWidgets import QApplication

from coatgui.assessment.own_models import own_model
from coatgui.window.composer import Composer
from coatgui.window.main_window import MainWindow
from coatgui.window.model_picker import FROM_HERE, HERE, WHOLE_PANEL
from coatgui.window.models import Draft, draft_of, models
from coatgui.window.places.reading_place import ReadingPlace
from coatgui.window.section import section_of

Wait = Callable[[Callable[[], bool]], None]


def place_of(window: MainWindow, panel: str, hours: float) -> ReadingPlace:
    window.go(1)
    assert window.desk.assessment is not None
    known = next(
        r for r in window.desk.assessment.readings if (r.panel, r.exposure_h) == (panel, hours)
    )
    window.desk.select(known.reading_id)
    QApplication.processEvents()
    place = window.places[1]
    assert isinstance(place, ReadingPlace)
    return place


def choose(composer: Composer, field: str, words: str) -> None:
    chooser = composer.choices[field]
    assert chooser.findText(words) >= 0
    chooser.setCurrentText(words)
    chooser.activated.emit(chooser.currentIndex())


def compose(place: ReadingPlace, name: str) -> Composer:
    place.picker.compose.click()
    composer = place.composing.composer
    composer.name.clear()
    QTest.keyClicks(composer.name, name)
    return composer


def pin(place: ReadingPlace, name: str, scope: int) -> None:
    place.picker.scope.setCurrentIndex(scope)
    index = place.picker.model.findText(name)
    assert index >= 0
    place.picker.model.setCurrentIndex(index)
    place.picker.model.activated.emit(index)


def pins(window: MainWindow) -> dict[tuple[str, float], str]:
    campaign = window.desk.campaign
    assert campaign is not None
    names = {p.panel_id: p.name for p in campaign.panels}
    return {
        (names[r.panel_id], r.exposure_h): r.pinned_model
        for r in campaign.readings
        if r.pinned_model
    }


def test_a_draft_is_stored_and_read_back() -> None:
    draft = Draft("Clear coat & primer", inductance=True, fixed=(("n_c", 0.95),))
    stored = draft.text()
    assert json.loads(stored)["id"] == "clear_coat_primer"
    assert own_model(stored).symbols == ("L", "R_s", "Q_c")
    again = draft_of(stored)
    assert again.model_id == "clear_coat_primer"
    assert again.text() == stored


def test_parameters_are_tied_and_the_fit_keeps_to_it(sample: MainWindow, wait: Wait) -> None:
    place = place_of(sample, "P2", 336)
    composer = compose(place, "Shared exponent")
    assert len(composer.draft.layers) == 2
    for layer in (2, 1):
        composer.pick(layer)
        choose(composer, "dielectric", "constant-phase")
    symbols = [spec.symbol for spec in composer.bound._specs]
    first, second = (s for s in symbols if s.startswith("n"))
    free = len(composer.draft.model().parameters)
    row = symbols.index(second)
    chooser = composer.bound.choosers[row]
    assert chooser.findText("R_s") < 0  # of another kind
    chooser.setCurrentText(first)
    chooser.activated.emit(chooser.currentIndex())
    assert composer.draft.tied == ((second, first),)
    assert len(composer.draft.model().parameters) == free - 1
    assert "1 tied" in composer.verdict.text()
    # Round about is the same.
    other = composer.bound.choosers[symbols.index(first)]
    other.setCurrentText(second)
    other.activated.emit(other.currentIndex())
    assert "share one value already" in composer.verdict.text()
    composer.bound.show_parameters(composer._specs, composer.draft.fixed, composer.draft.tied)
    composer._put(composer.draft)
    composer.keep.click()
    wait(lambda: sample.desk.job is None)
    text = sample.desk.campaign.settings.own_models[0]  # type: ignore[union-attr]
    assert draft_of(text).tied == ((second, first),)
    assert draft_of(text).text() == text
    pin(place, "Shared exponent (own)", HERE)
    wait(lambda: sample.desk.job is None)
    known = sample.desk.reading_assessment()
    assert known is not None
    assert known.fit is not None
    assert known.fit.model == "shared_exponent"
    values = {p.symbol: p.quantity.value for p in known.fit.parameters}
    assert values[first] == values[second]


def test_a_model_is_composed_pinned_fitted_drawn_and_removed(
    sample: MainWindow, wait: Wait
) -> None:
    place = place_of(sample, "P2", 336)
    composer = compose(place, "Film on bare spots")
    assert composer.keep.isEnabled()
    QTest.mouseClick(composer.view, Qt.MouseButton.LeftButton, pos=_middle_of_layer(composer, 1))
    assert composer.layer == 1
    choose(composer, "dielectric", "capacitor")
    item = composer.fixed.item(0, 1)
    assert item is not None
    item.setText("0,1 kΩ")
    assert composer.draft.fixed == (("R_s", 100.0),)
    composer.keep.click()
    assert place.pages.currentIndex() == 0
    wait(lambda: sample.desk.job is None)

    pin(place, "Film on bare spots (own)", FROM_HERE)
    assert pins(sample) == {("P2", h): "film_on_bare_spots" for h in (336.0, 504.0, 672.0)}
    wait(lambda: sample.desk.job is None)
    known = sample.desk.reading_assessment()
    assert known is not None
    assert known.fit is not None
    assert known.fit.model == "film_on_bare_spots"
    section = section_of(known, None, models(sample.desk.campaign))
    assert section is not None
    assert [band.kind for band in section.bands] == ["solution", "film", "interface", "metal"]
    assert place.section.isVisible()

    place.picker.compose.click()  # an own model that is picked is changed, not copied
    assert composer.draft.model_id == "film_on_bare_spots"
    composer.drop.click()
    wait(lambda: sample.desk.job is None)
    assert "not there any more" in place.picker.model.currentText()
    assert "not there any more" in place.findings.text()
    sample.undo()
    wait(lambda: sample.desk.job is None)
    assert place.picker.model.currentText() == "Film on bare spots (own)"


def _middle_of_layer(composer: Composer, layer: int) -> QPoint:
    area = next(area for band, area in composer.view.areas() if band.layer == layer)
    return area.center().toPoint()


def test_what_makes_no_circuit_is_said_and_cannot_be_kept(sample: MainWindow) -> None:
    place = place_of(sample, "K1", 24)
    place.picker.compose.click()
    composer = place.composing.composer
    assert not composer.keep.isEnabled()
    assert "name" in composer.verdict.text()
    QTest.keyClicks(composer.name, "Closed film")
    assert "catalogue" in composer.verdict.text()  # its id is taken there
    QTest.keyClicks(composer.name, " twice")
    assert composer.keep.isEnabled()
    composer.compose(Draft("Two films"), composer.tone)
    composer.add_layer()
    assert composer.draft.layers[0].ionic == "resistor"  # something leads inwards
    choose(composer, "role", "Film")
    assert "same role" in composer.verdict.text()
    assert not composer.keep.isEnabled()
    composer.remove_layer()
    item = composer.fixed.item(0, 1)
    assert item is not None
    item.setText("4 nF")
    assert "unit" in composer.verdict.text()
    assert not composer.keep.isEnabled()


def test_parameters_that_hide_one_another_are_refused(sample: MainWindow) -> None:
    composer = place_of(sample, "K1", 24).composing.composer
    composer.compose(Draft("Hidden"), composer.tone)
    choose(composer, "dielectric", "capacitor")
    choose(composer, "ionic", "resistor")
    composer.add_layer()
    choose(composer, "dielectric", "capacitor")
    assert composer.keep.isEnabled()
    composer.pick(1)
    choose(composer, "next_layer", "behind the whole layer")
    choose(composer, "ionic", "none: blocks")
    # Two capacitors in a row are one: no spectrum tells them apart.
    assert "apart" in composer.verdict.text()
    assert not composer.keep.isEnabled()


def test_a_model_is_pinned_for_the_whole_panel_and_let_go_again(
    sample: MainWindow, wait: Wait
) -> None:
    place = place_of(sample, "M2", 72)
    pin(place, "Film with pores", WHOLE_PANEL)
    assert len(pins(sample)) == 9
    assert set(pins(sample).values()) == {"film_with_pores"}
    pin(place, "Let the program choose", HERE)
    assert len(pins(sample)) == 8
    pin(place, "Let the program choose", WHOLE_PANEL)
    assert not pins(sample)
    sample.undo()
    assert len(pins(sample)) == 8
    wait(lambda: sample.desk.job is None)


def test_what_was_tried_stands_in_a_table(sample: MainWindow) -> None:
    place = place_of(sample, "P2", 24)
    place.tried.click()
    known = sample.desk.reading_assessment()
    assert known is not None
    assert known.fit is not None
    table = place.trials.table
    assert table.isVisible()
    assert table.rowCount() == len(known.fit.trials) > 1
    taken = [row for row, trial in enumerate(known.fit.trials) if trial.model == known.fit.model]
    name = table.item(taken[0], 0)
    assert name is not None
    assert name.text() == known.fit.model_name
    assert name.font().bold()
    assert not place.findings_area.isVisible()
    place.tried.click()
    assert not table.isVisible()
