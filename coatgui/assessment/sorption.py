"""Sorption of water into a film on metal, and the dry film's capacitance by extrapolation.

A film of thickness L takes up water from one face; the metal lets nothing through. By Fick's law
with a constant D and the surface in equilibrium from t = 0 (Crank, The Mathematics of Diffusion,
chapter 4), with x = D t/L²,

    M(x) = M_t/M_∞ = 1 − (8/π²) Σ_{n≥0} (2n+1)^-2 exp(−(2n+1)² π² x/4)              (long times)
         = 2 √x [ π^-½ + 2 Σ_{n≥1} (−1)^n ierfc(n/√x) ]                              (short times)

where ierfc(z) = π^-½ exp(−z²) − z erfc(z). Both hold for all x; each needs only a few terms on its
side of x = 0.2. Such a film is one half of a sheet of thickness 2L that is open on both faces.

With Brasher–Kingsbury the logarithm of the capacitance follows the water,

    ln C(t) = a + b M(k t),      k = D/L²,   a = ln C_0,   b = φ_∞ ln ε_w,

which is linear in a and b. So k is searched on a logarithmic grid and then refined, and for each k
the line is solved (separable least squares, weights 1/s_i²). Limits of a are by profile: all a for
which some k and b bring the weighted sum of squares to within 1.96² × scale of the least, scale =
max(1, least/(m−3)). Small k is the √t line, so that line needs no case of its own.

The dry capacitance counts as known only where this interval closes inside the range of k that the
exposure times can tell apart, at least three readings lie before 95 % saturation, and Fick's law
describes the readings. Later readings often leave it (a second stage, conducting pores): they are
dropped from the end until the rest follows, and how many followed is said. Otherwise the first
reading is the reference and the dry value is at most that.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import ArrayLike

from coatgui.assessment.amounts import NORMAL_95, from_logarithm, log_deviation, scaled
from coatgui.assessment.rules import rule
from coatgui.records import Bound, FloatArray, Quantity

_CHANGE_OF_SERIES = 0.2
_TERMS = 6
_GRID = 240
_SECONDS_PER_HOUR = 3600.0
_CM_PER_UM = 1e-4


def fickian_uptake(x: ArrayLike) -> FloatArray:
    """M_t/M_∞ at x = D t/L² for a film open on one face, any shape, x ≥ 0; exact to 1e-15."""
    from scipy.special import erfc

    x = np.asarray(x, dtype=np.float64)
    long = np.maximum(x, _CHANGE_OF_SERIES)
    odd = 2 * np.arange(_TERMS) + 1
    decay = np.exp(-(odd**2) * np.pi**2 / 4 * long[..., None]) / odd**2
    late = 1 - 8 / np.pi**2 * decay.sum(axis=-1)
    root = np.sqrt(np.minimum(x, _CHANGE_OF_SERIES))
    count = np.arange(1, _TERMS)
    with np.errstate(divide="ignore"):
        z = np.where(root[..., None] > 0, count / root[..., None], np.inf)
    z = np.minimum(z, 30.0)  # beyond it, ierfc is nothing and z·erfc(z) would be ∞·0
    ierfc = np.exp(-(z**2)) / math.sqrt(np.pi) - z * erfc(z)
    early = 2 * root * (1 / math.sqrt(np.pi) + 2 * ((-1.0) ** count * ierfc).sum(axis=-1))
    share: FloatArray = np.where(x > _CHANGE_OF_SERIES, late, early)
    return share


@dataclass(frozen=True, slots=True)
class Sorption:
    """What the early readings of a panel say about its dry film.

    `dry_capacitance`: two-sided where extrapolated or measured at 0 h, AT_MOST where the first
    reading had to serve; `reference_h` its exposure time. `rate_per_h` = D/L², in 1/h, is None
    where Fick's law does not fit or the readings do not hold it from both sides. `misfit` is the
    root mean square of the weighted residuals (1 = the readings' own scatter), over the first
    `followed` readings.
    """

    dry_capacitance: Quantity
    reference_h: float
    rate_per_h: Quantity | None = None
    misfit: float | None = None
    followed: int = 0
    text: str = ""


@dataclass(frozen=True, slots=True)
class _Profile:
    """For each k of the grid: the weighted sum of squares, a, b and the variance of a."""

    k: FloatArray
    squares: FloatArray
    a: FloatArray
    b: FloatArray
    variance: FloatArray


def _lines(k: FloatArray, hours: FloatArray, y: FloatArray, weight: FloatArray) -> _Profile:
    share = fickian_uptake(k[:, None] * hours)
    total = weight.sum()
    mean_share = (share * weight).sum(axis=1) / total
    mean_y = float((y * weight).sum() / total)
    centred = share - mean_share[:, None]
    spread = np.maximum((weight * centred**2).sum(axis=1), 1e-300)
    b = (weight * centred * (y - mean_y)).sum(axis=1) / spread
    a = mean_y - b * mean_share
    residual = y - a[:, None] - b[:, None] * share
    squares = (weight * residual**2).sum(axis=1)
    return _Profile(k, squares, a, b, 1 / total + mean_share**2 / spread)


@dataclass(frozen=True, slots=True)
class _FickFit:
    k: float
    a: float
    b: float
    a_low: float
    a_high: float
    closed: bool
    k_low: float | None
    k_high: float | None
    misfit: float
    before_saturation: int


def _fit(hours: FloatArray, y: FloatArray, deviation: FloatArray) -> _FickFit:
    weight = 1 / deviation**2
    positive = hours[hours > 0]
    # From "even the last reading is on the √t line" to "even the first is all but saturated".
    k = np.geomspace(0.02 / positive[-1], 3.0 / positive[0], _GRID)
    freedom = max(hours.size - 3, 1)
    best = int(np.argmin(_lines(k, hours, y, weight).squares))
    near = np.geomspace(k[max(best - 1, 0)], k[min(best + 1, k.size - 1)], 101)
    k = np.unique(np.concatenate([k, near]))
    profile = _lines(k, hours, y, weight)
    best = int(np.argmin(profile.squares))
    least = float(profile.squares[best])
    allowed = NORMAL_95**2 * max(1.0, least / freedom)
    room = least + allowed - profile.squares
    inside = room >= 0
    reach = np.sqrt(np.maximum(room, 0) * profile.variance)
    return _FickFit(
        k=float(k[best]),
        a=float(profile.a[best]),
        b=float(profile.b[best]),
        a_low=float((profile.a - reach)[inside].min()),
        a_high=float((profile.a + reach)[inside].max()),
        closed=not inside[-1],
        k_low=None if inside[0] else _edge(k, room, int(np.argmax(inside))),
        k_high=None if inside[-1] else _edge(k, room, inside.size - int(np.argmax(inside[::-1]))),
        misfit=math.sqrt(least / freedom),
        before_saturation=int((fickian_uptake(k[best] * hours) < rule("sorption.saturated")).sum()),
    )


def _edge(k: FloatArray, room: FloatArray, place: int) -> float:
    """Where `room` passes zero between the places before `place` and `place`, k on a log scale."""
    before, after = float(room[place - 1]), float(room[place])
    share = before / (before - after)
    return float(k[place - 1] * (k[place] / k[place - 1]) ** share)


def dry_capacitance(
    hours: Sequence[float], capacitance: Sequence[Quantity], method: str
) -> Sorption | None:
    """The dry film's capacitance from a panel's readings while it soaks.

    `hours` (m,) ascending and not negative; `capacitance` (m,) on one basis, named by `method`.
    Readings that do not count, and those after a drying, are to be left away by the caller. None
    where no reading has a capacitance with limits.
    """
    known = [
        (t, c, s)
        for t, c in zip(hours, capacitance, strict=True)
        if c.value and (s := log_deviation(c)) is not None
    ]
    if not known:
        return None
    time = np.array([t for t, _, _ in known], dtype=np.float64)
    y = np.log([float(c.value or 0) for _, c, _ in known])
    deviation = np.hypot([s for _, _, s in known], rule("capacitance.repeatability"))
    unit = known[0][1].unit
    early = int(rule("sorption.early_readings"))
    worst = rule("sorption.misfit")
    why = f"fewer than {early} readings"
    for count in range(time.size, early - 1, -1):
        if time[count - 1] <= time[0]:
            break
        fit = _fit(time[:count], y[:count], deviation[:count])
        if fit.misfit > worst or fit.b < 0:
            why = "the early readings do not follow Fick's law"
            continue
        if not fit.closed or fit.before_saturation < early:
            why = "the film was near saturation before enough readings were taken"
            break
        return _extrapolated(fit, count, time.size, unit, method)
    return _first_reading(float(time[0]), float(y[0]), float(deviation[0]), unit, method, why)


def _extrapolated(fit: _FickFit, count: int, total: int, unit: str, method: str) -> Sorption:
    dry = Quantity(
        math.exp(fit.a),
        math.exp(fit.a_low),
        math.exp(fit.a_high),
        Bound.TWO_SIDED,
        unit,
        f"extrapolated to 0 h along Fickian sorption through the first {count} readings; {method}",
    )
    rate = None
    if fit.k_low is not None and fit.k_high is not None:
        rate = Quantity(fit.k, fit.k_low, fit.k_high, Bound.TWO_SIDED, "1/h", "Fickian sorption")
    text = (
        f"Fickian sorption describes the first {count} of {total} readings, with residuals "
        f"{fit.misfit:.1f} times their own scatter."
    )
    return Sorption(dry, 0.0, rate, fit.misfit, count, text)


def _first_reading(
    hour: float, y: float, deviation: float, unit: str, method: str, why: str
) -> Sorption:
    if hour == 0:
        dry = from_logarithm(math.exp(y), deviation, unit, f"measured at 0 h; {method}")
        return Sorption(dry, 0.0, text="The dry capacitance is that of the reading at 0 h.")
    most = math.exp(y + NORMAL_95 * deviation)
    named = f"taken from the first reading, at {hour:g} h, which was already wet ({why}); {method}"
    text = (
        f"The dry capacitance could not be extrapolated: {why}. The first reading, at {hour:g} h, "
        "serves as the reference, so every uptake is a lower bound."
    )
    return Sorption(Quantity(most, None, most, Bound.AT_MOST, unit, named), hour, text=text)


def diffusion_coefficient(sorption: Sorption, thickness_um: float | None) -> Quantity | None:
    """D = k L² in cm²/s; None where Fick's law does not hold the rate or no thickness is known."""
    if sorption.rate_per_h is None or thickness_um is None:
        return None
    rate = sorption.rate_per_h
    factor = (thickness_um * _CM_PER_UM) ** 2 / _SECONDS_PER_HOUR
    method = f"Fickian sorption into {thickness_um:g} µm from one face; {sorption.text}"
    return replace(scaled(rate, factor, "cm²/s"), method=method)
