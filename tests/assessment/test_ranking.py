"""Ranking against scipy's tests, letters against their definition, and the words."""

from __future__ import annotations

from collections.abc import Callable
from itertools import combinations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from coatgui.assessment.ranking import group_letters, holm, ranking, welch
from coatgui.records import Bound, ReadingAssessment

Made = Callable[..., ReadingAssessment]


def _readings(
    made: Made, logs: dict[str, list[float]], hours: float = 1008.0, **more: object
) -> dict[str, list[ReadingAssessment]]:
    return {
        name: [
            made(name, f"{name}{i}", hours, 10.0**value, **more) for i, value in enumerate(values)
        ]
        for name, values in logs.items()
    }


@pytest.mark.parametrize("seed", range(6))
def test_welch_agrees_with_scipy(seed: int) -> None:
    from scipy.stats import ttest_ind

    random = np.random.default_rng(seed)
    first = random.normal(9, 0.3, random.integers(2, 8))
    second = random.normal(8.5, 1.0, random.integers(2, 8))
    expected = ttest_ind(first, second, equal_var=False).pvalue
    assert welch(first, second) == pytest.approx(float(expected), rel=1e-9)


def test_samples_without_spread() -> None:
    assert welch([9.0, 9.0], [9.0, 9.0, 9.0]) == 1.0
    assert welch([9.0, 9.0], [8.0, 8.0]) == 0.0


def test_holm_by_hand() -> None:
    """0.01, 0.04, 0.03 → 3·0.01, 2·0.03, and no less than the one before."""
    assert holm([0.01, 0.04, 0.03]) == pytest.approx([0.03, 0.06, 0.06])
    assert holm([]) == []
    assert holm([0.9, 0.8]) == [1.0, 1.0]


@given(
    count=st.integers(2, 7),
    data=st.data(),
)
def test_letters_are_shared_exactly_where_nothing_is_proved(
    count: int, data: st.DataObject
) -> None:
    names = [f"F{i}" for i in range(count)]
    pairs = [frozenset(pair) for pair in combinations(names, 2)]
    differ = {pair for pair in pairs if data.draw(st.booleans())}
    letters = group_letters(names, differ)
    assert all(letters.values())
    for pair in pairs:
        first, second = pair
        shared = set(letters[first]) & set(letters[second])
        assert bool(shared) == (pair not in differ)


def test_best_is_named_and_the_rest_cannot_be_told_apart(reading_of: Made) -> None:
    logs = {
        "K": [9.8, 9.9, 10.0, 9.7],
        "M": [7.1, 7.9, 7.4, 7.6],
        "P": [7.0, 7.7, 7.5, 7.2],
    }
    found = ranking(_readings(reading_of, logs), 0.1)
    assert found.text.startswith(
        "K is ahead of the rest; M and P cannot be told apart with four panels each."
    )
    by_name = {r.formulation: r for r in found.ranks}
    assert [r.formulation for r in found.ranks] == ["K", "M", "P"]
    assert (by_name["K"].rank_low, by_name["K"].rank_high, by_name["K"].group) == (1, 1, "a")
    for name in ("M", "P"):
        assert (by_name[name].rank_low, by_name[name].rank_high) == (2, 3)
        assert by_name[name].group == "b"


def test_overlapping_groups_and_words(reading_of: Made) -> None:
    logs = {"A": [9.0, 9.05, 9.1, 9.15], "B": [8.4, 8.9, 8.2, 9.2], "C": [8.0, 8.1, 8.05, 8.15]}
    found = ranking(_readings(reading_of, logs), 0.1)
    by_name = {r.formulation: r for r in found.ranks}
    assert by_name["A"].group == "a"
    assert by_name["B"].group == "ab"
    assert by_name["C"].group == "b"
    assert (by_name["B"].rank_low, by_name["B"].rank_high) == (1, 3)
    assert "A is ahead of C" in found.text
    assert "cannot be told apart" in found.text


def test_complete_order(reading_of: Made) -> None:
    logs = {"A": [9.0, 9.01, 9.02], "B": [8.0, 8.01, 8.02], "C": [7.0, 7.01, 7.02]}
    found = ranking(_readings(reading_of, logs), 0.1)
    assert found.text.startswith("A is ahead of the rest; B is ahead of C.")
    assert [(r.rank_low, r.rank_high) for r in found.ranks] == [(1, 1), (2, 2), (3, 3)]


def test_one_panel_is_too_few(reading_of: Made) -> None:
    found = ranking(_readings(reading_of, {"K": [9.0, 9.1], "M": [7.0]}), 0.1)
    assert found.ranks == ()
    assert "M has fewer than two panels" in found.text


def test_one_formulation_is_not_compared(reading_of: Made) -> None:
    assert ranking(_readings(reading_of, {"K": [9.0, 9.1]}), 0.1).ranks == ()


def test_last_shared_inspection_is_used(reading_of: Made) -> None:
    early = _readings(reading_of, {"K": [9.0, 9.1, 9.2], "M": [7.0, 7.1, 7.2]}, 336.0)
    late = _readings(reading_of, {"K": [6.0, 6.1, 6.2]}, 1008.0)
    found = ranking({"K": early["K"] + late["K"], "M": early["M"]}, 0.1)
    assert found.ranks[0].formulation == "K"
    assert "336 h" in found.text


def test_bounds_enter_and_are_said(reading_of: Made) -> None:
    high = _readings(reading_of, {"K": [10.9, 11.0, 11.1]}, bound=Bound.AT_LEAST)
    low = _readings(reading_of, {"M": [7.0, 7.1, 7.2]})
    found = ranking(high | low, 0.1)
    assert [r.group for r in found.ranks] == ["a", "b"]
    assert "3 values at the measuring limit entered as lower bounds" in found.text


def test_a_lower_bound_is_not_proved_worse(reading_of: Made) -> None:
    high = _readings(reading_of, {"K": [11.9, 12.0, 12.1]})
    bounded = _readings(reading_of, {"M": [10.0, 10.1, 10.2]}, bound=Bound.AT_LEAST)
    found = ranking(high | bounded, 0.1)
    assert {r.group for r in found.ranks} == {"a"}
    assert "cannot be told apart" in found.text


@given(factor=st.floats(0.01, 100.0))
def test_scaling_all_areas_changes_no_rank(factor: float) -> None:
    logs = {"K": [9.8, 9.9, 10.0], "M": [7.1, 7.9, 7.4], "P": [7.0, 7.7, 7.5]}

    def groups(shift: float) -> list[float]:
        return [
            welch([v + shift for v in logs[a]], [v + shift for v in logs[b]])
            for a, b in combinations(logs, 2)
        ]

    assert groups(float(np.log10(factor))) == pytest.approx(groups(0.0), rel=1e-6)
