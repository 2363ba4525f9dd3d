"""Every test against scipy's, letters against their definition over all graphs, power against
simulation."""

from __future__ import annotations

from itertools import combinations, product

import numpy as np
import pytest
from scipy import stats

from coatgui.assessment.effort import detectable, panels_needed, power
from coatgui.assessment.letters import group_letters
from coatgui.assessment.significance import (
    Entry,
    all_pairs_range,
    difference_limits,
    dunn,
    dunnett,
    fewest_provable,
    gehan,
    holm,
    kruskal_wallis,
    mean_scores,
    welch,
)


def _samples(seed: int, count: int = 4) -> list[np.ndarray]:
    random = np.random.default_rng(seed)
    return [
        random.normal(
            9 - 0.5 * i * random.random(), random.uniform(0.1, 0.6), random.integers(3, 8)
        )
        for i in range(count)
    ]


def _exact(values: np.ndarray) -> list[Entry]:
    return [Entry(float(v), float(v), float(v)) for v in values]


@pytest.mark.parametrize("seed", range(6))
def test_welch_and_its_limits_agree_with_scipy(seed: int) -> None:
    first, second, *_ = _samples(seed)
    reference = stats.ttest_ind(first, second, equal_var=False)
    assert welch(first, second) == pytest.approx(float(reference.pvalue), rel=1e-9)
    interval = reference.confidence_interval(0.95)
    assert difference_limits(first, second)[1:] == pytest.approx(
        (interval.low, interval.high), rel=1e-9
    )


@pytest.mark.parametrize("seed", range(3))
@pytest.mark.parametrize("equal", [True, False])
def test_tukey_and_games_howell_agree_with_scipy(seed: int, equal: bool) -> None:
    samples = _samples(seed)
    reference = stats.tukey_hsd(*samples, equal_var=equal)
    for (i, j), probability in all_pairs_range(samples, equal).items():
        assert probability == pytest.approx(float(reference.pvalue[i, j]), rel=1e-6, abs=1e-9)


@pytest.mark.parametrize("seed", range(4))
def test_dunnett_agrees_with_scipy(seed: int) -> None:
    """scipy integrates by random points, to about three digits."""
    control, *samples = _samples(seed)
    reference = stats.dunnett(*samples, control=control, rng=np.random.default_rng(1))
    assert dunnett(samples, control) == pytest.approx(reference.pvalue.tolist(), abs=2e-3)


def test_dunnett_of_one_sample_is_students_t() -> None:
    control, sample, *_ = _samples(5)
    expected = stats.ttest_ind(sample, control, equal_var=True).pvalue
    assert dunnett([sample], control) == pytest.approx([float(expected)], rel=1e-6)


@pytest.mark.parametrize("seed", range(5))
def test_gehan_without_censoring_is_mann_whitney(seed: int) -> None:
    first, second, *_ = _samples(seed)
    expected = stats.mannwhitneyu(first, second, method="exact").pvalue
    assert gehan(_exact(first), _exact(second)) == pytest.approx(float(expected), rel=1e-9)


def test_gehan_with_ties_is_the_permutation_test() -> None:
    random = np.random.default_rng(2)
    first, second = random.integers(0, 4, 5), random.integers(1, 6, 4)

    def statistic(a: np.ndarray, b: np.ndarray) -> float:
        return abs(float(np.sign(np.subtract.outer(a, b)).sum()))

    expected = stats.permutation_test(
        (first, second), statistic, alternative="greater", n_resamples=np.inf
    ).pvalue
    found = gehan(_exact(first.astype(float)), _exact(second.astype(float)))
    assert found == pytest.approx(float(expected), rel=1e-9)


def test_open_order_scores_nothing() -> None:
    held = Entry(5.0, 5.0, np.inf)
    assert gehan([held, held], [held, held]) == 1.0
    assert mean_scores([[held], [Entry(4.0, 4.0, 4.0)]]) == [1.0, -1.0]
    assert mean_scores([[held], [Entry(6.0, 6.0, 6.0)]]) == [0.0, 0.0]
    # intervals of time (24, 168] and (168, 336] only touch: the second is later
    assert mean_scores([[Entry(96, 24, 168)], [Entry(252, 168, 336)]]) == [-1.0, 1.0]


def test_three_against_three_can_prove_nothing_by_ranks() -> None:
    assert fewest_provable(3, 3) == pytest.approx(0.1)
    assert gehan(_exact(np.array([7.0, 8, 9])), _exact(np.array([1.0, 2, 3]))) == pytest.approx(0.1)


def test_many_panels_are_dealt_at_random_and_alike_each_time() -> None:
    random = np.random.default_rng(4)
    first, second = random.normal(0, 1, 20), random.normal(0.7, 1, 20)
    expected = stats.mannwhitneyu(first, second, method="exact").pvalue
    found = gehan(_exact(first), _exact(second))
    assert found == pytest.approx(float(expected), abs=0.01)
    assert gehan(_exact(first), _exact(second)) == found


def test_holm_by_hand() -> None:
    """0.01, 0.04, 0.03 → 3·0.01, 2·0.03, and no less than the one before."""
    assert holm([0.01, 0.04, 0.03]) == pytest.approx([0.03, 0.06, 0.06])
    assert holm([]) == []
    assert holm([0.9, 0.8]) == [1.0, 1.0]


@pytest.mark.parametrize("count", [1, 2, 3, 4, 5])
def test_letters_over_all_graphs(count: int) -> None:
    """Shared exactly where nothing is proved; no letter's group lies within another's, each is as
    large as can be, every name has a letter and the first has an a."""
    names = [f"F{i}" for i in range(count)]
    pairs = [frozenset(pair) for pair in combinations(names, 2)]
    for choice in product((False, True), repeat=len(pairs)):
        differ = {pair for pair, differs in zip(pairs, choice, strict=True) if differs}
        letters = group_letters(names, differ)
        groups = {
            letter: {name for name in names if letter in letters[name]}
            for letter in sorted(set("".join(letters.values())))
        }
        assert all(letters.values())
        assert "a" in letters[names[0]]
        for pair in pairs:
            first, second = pair
            shared = set(letters[first]) & set(letters[second])
            assert bool(shared) == (pair not in differ)
        for letter, group in groups.items():
            assert not any(group <= other for key, other in groups.items() if key != letter)
            for name in set(names) - group:
                assert any(frozenset((name, member)) in differ for member in group)


def test_letters_for_many_formulations_that_are_alike() -> None:
    """Sixty alike take one letter at once, not after 2⁶⁰ steps."""
    names = [f"F{i}" for i in range(60)]
    assert set(group_letters(names, set()).values()) == {"a"}
    apart = {frozenset((a, b)) for i, a in enumerate(names) for b in names[i + 20 :]}
    letters = group_letters(names, apart)
    assert letters["F0"] == "a"
    assert len(letters["F30"]) == 20 or len(letters["F30"]) > 2


def test_power_is_what_simulation_gives() -> None:
    random = np.random.default_rng(6)
    for difference, first_sd, second_sd, panels in ((1.0, 0.4, 0.4, 3), (0.8, 0.2, 0.6, 5)):
        proved = np.mean(
            [
                welch(
                    random.normal(difference, first_sd, panels),
                    random.normal(0, second_sd, panels),
                )
                < 0.05
                for _ in range(3000)
            ]
        )
        assert power(difference, first_sd, second_sd, panels, 0.05) == pytest.approx(
            proved, abs=0.03
        )


def test_panels_needed_and_detectable_answer_each_other() -> None:
    needed = panels_needed(0.7, 0.3, 0.3, 0.05, 0.8)
    assert needed is not None
    assert power(0.7, 0.3, 0.3, needed, 0.05) >= 0.8
    assert power(0.7, 0.3, 0.3, needed - 1, 0.05) < 0.8
    assert detectable(0.3, 0.3, needed, 0.05, 0.8) <= 0.7
    assert panels_needed(0.01, 0.3, 0.3, 0.05, 0.8) is None
    assert power(0.0, 0.3, 0.3, 4, 0.05) == pytest.approx(0.05, abs=0.015)


@pytest.mark.parametrize("seed", range(6))
@pytest.mark.parametrize("ties", [False, True])
def test_kruskal_and_wallis_is_scipys(seed: int, ties: bool) -> None:
    samples = [np.round(s, 1) if ties else s for s in _samples(seed)]
    found = kruskal_wallis([_exact(s) for s in samples])
    assert found == pytest.approx(stats.kruskal(*samples).pvalue, rel=1e-9)


@pytest.mark.parametrize("seed", range(6))
@pytest.mark.parametrize("ties", [False, True])
def test_dunn_is_its_formula_on_ranks(seed: int, ties: bool) -> None:
    """z = (R̄_i − R̄_j)/√((N(N+1)/12 − ΣT/(12(N−1)))(1/n_i + 1/n_j)), T = t³ − t for every tie."""
    samples = [np.round(s, 1) if ties else s for s in _samples(seed)]
    pool = np.concatenate(samples)
    count = pool.size
    ranks = np.split(stats.rankdata(pool), np.cumsum([s.size for s in samples])[:-1])
    times = np.unique(pool, return_counts=True)[1].astype(float)
    spread = count * (count + 1) / 12 - (times**3 - times).sum() / (12 * (count - 1))
    for (i, j), found in dunn([_exact(s) for s in samples]).items():
        error = np.sqrt(spread * (1 / samples[i].size + 1 / samples[j].size))
        z = (ranks[i].mean() - ranks[j].mean()) / error
        assert found == pytest.approx(2 * stats.norm.sf(abs(z)), rel=1e-9)


def test_rank_tests_say_nothing_where_no_order_is_known() -> None:
    held = [Entry(5.0, 5.0, np.inf)] * 3
    assert kruskal_wallis([held, held]) == 1.0
    assert dunn([held, held]) == {(0, 1): 1.0}
