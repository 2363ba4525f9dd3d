"""What it would take: the power of Welch's test, panels needed, differences that would show.

With three panels Welch's degrees of freedom are themselves at the mercy of chance, and the
noncentral t distribution promises a tenth too much. So the power is counted over 2,000 invented
pairs of samples, always the same ones, normal with the given standard deviations. α is divided by
the number of pairs, the first step of Holm.
"""

from __future__ import annotations

import math
from functools import cache

import numpy as np

from coatgui.records import FloatArray

_TRIALS, _SEED, _MOST_PANELS = 2000, 7, 50


@cache
def _moments(panels: int) -> tuple[FloatArray, FloatArray]:
    """Means and variances of invented samples, (2, trials): the same ones every time."""
    draws = np.random.default_rng(_SEED + panels).standard_normal((2, _TRIALS, panels))
    return draws.mean(axis=2), draws.var(axis=2, ddof=1) / panels


def power(difference: float, first_sd: float, second_sd: float, panels: int, alpha: float) -> float:
    """Chance of proving a difference with so many panels of each, two at least."""
    from scipy.special import stdtr

    if first_sd == 0 and second_sd == 0:
        return 1.0 if difference else 0.0
    means, variances = _moments(panels)
    first, second = variances[0] * first_sd**2, variances[1] * second_sd**2
    freedom = (panels - 1) * (first + second) ** 2 / (first**2 + second**2)
    apart = difference + means[0] * first_sd - means[1] * second_sd
    probability = 2 * stdtr(freedom, -np.abs(apart) / np.sqrt(first + second))
    return float((probability < alpha).mean())


def panels_needed(
    difference: float, first_sd: float, second_sd: float, alpha: float, wanted: float
) -> int | None:
    """Panels of each formulation for the wanted power; None for more than 50."""
    low, high = 1, _MOST_PANELS
    if power(difference, first_sd, second_sd, high, alpha) < wanted:
        return None
    while high - low > 1:
        middle = (low + high) // 2
        if power(difference, first_sd, second_sd, middle, alpha) < wanted:
            low = middle
        else:
            high = middle
    return high


def detectable(
    first_sd: float, second_sd: float, panels: int, alpha: float, wanted: float
) -> float:
    """The difference that so many panels each would prove with the wanted power."""
    low, high = 0.0, 10 * max(first_sd, second_sd, 1e-6)
    while power(high, first_sd, second_sd, panels, alpha) < wanted:
        low, high = high, 2 * high
        if high > 1e6:
            return math.inf
    while high - low > 0.01 * high:
        middle = (low + high) / 2
        if power(middle, first_sd, second_sd, panels, alpha) < wanted:
            low = middle
        else:
            high = middle
    return high
