"""Settings of a campaign, typed with units, undone, refused with a sentence beside the field."""

from __future__ import annotations

from collections.abc import Callable

import pytest

pytest.importorskip("PySide6")

from PySide6.QtTest import QTest
from PySide6.QtWidgets import QApplication

from coatgui.records import Settings
from coatgui.window.main_window import MainWindow
from coatgui.window.places.settings_place import SettingsPlace
from coatgui.window.thresholds_table import threshold_words
from coatgui.window.typed import typed, typed_list, written

Wait = Callable[[Callable[[], bool]], None]


@pytest.mark.parametrize(
    ("text", "unit", "value"),
    [
        ("4,6 nF", "F", 4.6e-9),
        ("2 TΩ", "Ω", 2e12),
        ("2 T", "Ω", 2e12),
        ("300 kohm", "Ω", 3e5),
        ("10 MΩ cm²", "Ω cm²", 1e7),
        ("1e7", "Ω cm²", 1e7),
        ("−3 °C", "°C", -3.0),
        ("10 mHz", "Hz", 0.01),
        ("1 000 Hz", "Hz", 1000.0),
        ("0,9", "", 0.9),
    ],
)
def test_numbers_are_taken_with_their_units(text: str, unit: str, value: float) -> None:
    assert typed(text, unit) == pytest.approx(value, rel=1e-12)


@pytest.mark.parametrize(
    ("text", "unit"), [("4 nH", "F"), ("much", "Ω"), ("", "Hz"), ("4 V", ""), ("5 kh", "h")]
)
def test_what_is_no_such_number_is_refused_in_a_sentence(text: str, unit: str) -> None:
    with pytest.raises(ValueError, match=r"^(“|This).*\.?") as refused:
        typed(text, unit)
    assert "float" not in str(refused.value)


def test_a_list_shares_the_unit_behind_its_last() -> None:
    assert typed_list("10; 100 mHz", "Hz") == (0.1, 0.01)
    assert typed_list("0,1 Hz; 10 mHz", "Hz") == (0.1, 0.01)
    assert typed_list("1e-2; 3", "Hz") == (3.0, 0.01)


@pytest.mark.parametrize(("value", "unit"), [(4.6e-9, "F"), (1e4, "Hz"), (1.5e7, "Ω cm²")])
def test_what_is_written_can_be_typed_again(value: float, unit: str) -> None:
    assert typed(written(value, unit), unit) == pytest.approx(value, rel=1e-6)
    assert "000" not in written(value, unit)


def place_of(window: MainWindow) -> SettingsPlace:
    window.go_to("Settings")
    QApplication.processEvents()
    place = window.places[window.stack.currentIndex()]
    assert isinstance(place, SettingsPlace)
    return place


def settings(window: MainWindow) -> Settings:
    assert window.desk.campaign is not None
    return window.desk.campaign.settings


def enter(place: SettingsPlace, name: str, text: str) -> None:
    line = place.fields[name].line
    line.selectAll()
    QTest.keyClicks(line, text)
    line.editingFinished.emit()
    QApplication.processEvents()


def test_a_field_sets_and_undo_takes_back(sample: MainWindow, wait: Wait) -> None:
    place = place_of(sample)
    enter(place, "input_capacitance_f", "4,6 nF")
    assert settings(sample).input_capacitance_f == 4.6e-9
    assert place.fields["input_capacitance_f"].line.text() == "4.6 nF"
    enter(place, "modulus_frequencies_hz", "1; 0,1 Hz")
    assert settings(sample).modulus_frequencies_hz == (1.0, 0.1)
    sample.undo()
    sample.undo()
    assert settings(sample).modulus_frequencies_hz == (0.1, 0.01)
    assert settings(sample).input_capacitance_f is None
    assert place.fields["input_capacitance_f"].line.text() == ""
    wait(lambda: sample.desk.job is None)


def test_a_refusal_stands_beside_its_field_until_it_is_put_right(
    sample: MainWindow, wait: Wait
) -> None:
    place = place_of(sample)
    field = place.fields["mains_hz"]
    enter(place, "mains_hz", "-50")
    assert "greater than 0" in field.wrong.text()
    assert field.wrong.isVisible()
    enter(place, "temperature_c", "23")
    wait(lambda: sample.desk.job is None)
    assert field.line.text() == "-50"  # not lost while another field was edited
    assert settings(sample).mains_hz == 50.0
    assert settings(sample).temperature_c == 23.0
    enter(place, "mains_hz", "60 Hz")
    assert not field.wrong.isVisible()
    assert settings(sample).mains_hz == 60.0
    assert not sample.trouble.isVisible()
    wait(lambda: sample.desk.job is None)


def test_limits_on_other_quantities_are_typed_in_their_table(
    sample: MainWindow, wait: Wait
) -> None:
    place = place_of(sample)
    table = place.limits.table

    def write(column: int, text: str) -> None:
        item = table.item(0, column)
        assert item is not None
        item.setText(text)

    place.limits.add()
    (limit,) = settings(sample).limits
    assert (limit.quantity, limit.side, limit.unit) == ("water_uptake", "above", "vol-%")
    write(3, "5,0")
    assert settings(sample).limits[0].value == 5.0
    wait(lambda: sample.desk.job is None)
    assert sample.desk.assessment is not None
    study = next(s for s in sample.desk.assessment.limit_studies if s.limit.name == limit.name
                 and s.formulation == "P waterborne")  # fmt: skip
    assert "vol-%" in study.text or "uptake" in study.text.lower()
    write(1, "thickness")
    assert "none of these" in place.limits.wrong.text()
    assert settings(sample).limits[0].quantity == "water_uptake"
    write(2, "beside")
    assert "“above” or “below”" in place.limits.wrong.text()
    write(1, "pore resistance")
    assert settings(sample).limits[0].unit == "Ω cm²"
    write(2, "below")
    write(3, "20 MΩ cm²")
    assert settings(sample).limits[0].value == 2e7
    sample.desk.undo()
    assert settings(sample).limits[0].value == 1e7
    table.setCurrentCell(0, 0)
    place.limits.remove()
    assert settings(sample).limits == ()
    wait(lambda: sample.desk.job is None)


def test_criteria_are_typed_in_their_table(sample: MainWindow, wait: Wait) -> None:
    place = place_of(sample)
    table = place.criteria.table
    assert settings(sample).criteria == ()
    item = table.item(0, 2)
    assert item is not None
    item.setText("20 MΩ cm²")
    assert [c.ohm_cm2 for c in settings(sample).criteria] == [2e7]
    place.criteria.add()
    assert len(settings(sample).criteria) == 2
    item = table.item(1, 1)
    assert item is not None
    item.setText("fast")
    assert "not a number" in place.criteria.wrong.text()
    wait(lambda: sample.desk.job is None)
    assert sample.desk.assessment is not None
    held = {c.criterion.ohm_cm2 for p in sample.desk.assessment.panels for c in p.limit_crossings}
    assert held == {2e7}  # the added one begins like the one before it
    table.setCurrentCell(1, 0)
    place.criteria.remove()
    assert len(settings(sample).criteria) == 1
    wait(lambda: sample.desk.job is None)


def test_a_threshold_is_changed_and_goes_back(sample: MainWindow, wait: Wait) -> None:
    place = place_of(sample)
    table = place.thresholds.table
    row = place.thresholds.names.index("step_percent")
    table.setCurrentCell(row, 1)
    item = table.item(row, 1)
    assert item is not None
    item.setText("2,5")
    assert settings(sample).thresholds == (("step_percent", 2.5),)
    assert "1 of" in place.thresholds.note.text()
    item.setText("-1")
    assert "negative" in place.thresholds.wrong.text()
    assert settings(sample).thresholds == (("step_percent", 2.5),)
    place.thresholds.reset.click()
    assert settings(sample).thresholds == ()
    assert item.text() == "1.5"
    assert all(place.thresholds.sources.values())
    wait(lambda: sample.desk.job is None)


def test_thresholds_are_named_in_words() -> None:
    assert threshold_words("wild_point_percent") == "wild point / %"
    assert threshold_words("temperature_apart_c") == "temperature apart / °C"
    assert threshold_words("points_per_decade") == "points per decade"


def test_the_leads_are_taken_away_by_a_tick(sample: MainWindow, wait: Wait) -> None:
    place = place_of(sample)
    assert "open-lead run" in place.leads_note.text()
    place.leads.click()
    assert settings(sample).take_leads_away
    wait(lambda: sample.desk.job is None)
    assert sample.desk.assessment is not None
    codes = {f.code for r in sample.desk.assessment.readings for f in r.findings}
    assert "leads_taken_away" in codes
