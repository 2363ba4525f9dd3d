"""Rules, criteria and cautions are data: each with a value and a source."""

from __future__ import annotations

from coatgui.assessment.cautions import caution_sources, cautions
from coatgui.assessment.rules import default_criteria, rule, table
from coatgui.assessment.words import counted, listed, power_of_ten


def test_every_rule_has_a_value_and_a_source() -> None:
    entries = [
        (f"{group}.{name}", entry)
        for group, names in table("assessment").items()
        for name, entry in names.items()
    ]
    assert len(entries) >= 10
    for name, entry in entries:
        assert set(entry) == {"value", "source"}, name
        assert len(entry["source"]) > 20, name
        assert rule(name) == entry["value"]


def test_default_criterion_says_where_it_comes_from() -> None:
    (criterion,) = default_criteria()
    assert (criterion.frequency_hz, criterion.ohm_cm2) == (0.1, 1e7)
    assert "from memory" in criterion.source
    assert "no standard fixes it" in criterion.source


def test_seven_cautions_with_sources() -> None:
    assert len(cautions()) == len(caution_sources()) == 7
    assert "does not predict service life" in cautions()[0]
    assert all(cautions())
    assert all(caution_sources())


def test_numbers_in_words() -> None:
    assert power_of_ten(1e7) == "10⁷"
    assert power_of_ten(3.24e9) == "3.2·10⁹"
    assert power_of_ten(9.99e9) == "10¹⁰"
    assert power_of_ten(1e-10) == "10⁻¹⁰"
    assert power_of_ten(420.0) == "420"
    assert counted(1, "panel") == "1 panel"
    assert counted(0, "panel") == "0 panels"
    assert listed(["K"]) == "K"
    assert listed(["K", "M", "P"]) == "K, M and P"
