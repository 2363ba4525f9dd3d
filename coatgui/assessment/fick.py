"""Fick's law for a film on metal, laid on the logarithm of a capacitance.

A film of thickness L takes up water from one face; the metal lets nothing through. With a constant
D and the surface in equilibrium from t = 0 (Crank, The Mathematics of Diffusion, chapter 4), with
x = D t/L²,

    M(x) = M_t/M_∞ = 1 − (8/π²) Σ_{n≥0} (2n+1)^-2 exp(−(2n+1)² π² x/4)              (long times)
         = 2 √x [ π^-½ + 2 Σ_{n≥1} (−1)^n ierfc(n/√x) ]                              (short times)

where ierfc(z) = π^-½ exp(−z²) − z erfc(z). Both hold for all x; each needs only a few terms on its
side of x = 0.2. Such a film is one half of a sheet of thickness 2L that is open on both faces.

With Brasher–Kingsbury the logarithm of the capacitance follows the water,

    ln C(t) = a + b M(k t) + c max(0, t − t₂),      k = D/L²,   a = ln C_0,   a + b = ln C_∞,

linear in a, b and c. So k is searched on a logarithmic grid, then refined, and for each k the line
is solved (separable least squares, weights 1/s_i²). c, the slope of a second stage that begins at
t₂, is there only where the readings demand it: for every k and every t₂ among the exposure times
the fall of the sum of squares is had at once by orthogonal projection.

Limits are by profile: all a (b, a + b) for which some k brings the weighted sum of squares to
within 1.96² × scale of the least, scale = max(1, least/freedom). Small k is the √t line, so that
line needs no case of its own: there b has no upper limit, a has one.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import cache, lru_cache

import numpy as np
from numpy.typing import ArrayLike

from coatgui.assessment.amounts import NORMAL_95
from coatgui.records import FloatArray

_CHANGE_OF_SERIES = 0.2
_TERMS = 6
_COARSE, _FINE = 80, 41
_TABLE_END, _TABLE_POINTS = 3.2, 8001


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


@cache
def _table() -> tuple[FloatArray, FloatArray]:
    root = np.linspace(0.0, _TABLE_END, _TABLE_POINTS)
    return root, fickian_uptake(root**2)


def quick_uptake(x: FloatArray) -> FloatArray:
    """`fickian_uptake` by a table in √x, for the many values of a search; exact to 1e-7."""
    _, share = _table()
    place = np.minimum(np.sqrt(x) * ((_TABLE_POINTS - 1) / _TABLE_END), _TABLE_POINTS - 1.000001)
    whole = place.astype(np.intp)
    low = share[whole]
    quick: FloatArray = low + (place - whole) * (share[whole + 1] - low)
    return quick


def time_to_share(share: float) -> float:
    """x = D t/L² at which the share (0 < share < 1) of the final uptake is reached."""
    root, shares = _table()
    return float(np.interp(share, shares, root)) ** 2


@dataclass(frozen=True, slots=True)
class Limits:
    """A value with its 95 % limits; None on a side that the readings leave open."""

    value: float
    low: float | None
    high: float | None


@dataclass(frozen=True, slots=True)
class FickFit:
    """`dry` = a, `rise` = b, `full` = a + b and `rate_per_h` = k. `closed`: the limits of `dry` are
    held by the readings, not by the end of the grid. `misfit` is the root mean square of the
    weighted residuals per degree of freedom, `freedom` their number. `second_from` is the place of
    the reading where a second stage begins, with its slope per hour."""

    dry: Limits
    rise: Limits
    full: Limits
    rate_per_h: Limits
    closed: bool
    misfit: float
    freedom: int
    second_from: int | None = None
    slope_per_h: float = 0.0


def rates(hours: FloatArray) -> FloatArray:
    """The grid of k: from "even the last reading is on the √t line" to "even the first reading is
    all but saturated"."""
    positive = hours[hours > 0]
    return np.geomspace(0.02 / positive[-1], 3.0 / positive[0], _COARSE)


@lru_cache(maxsize=64)
def _grid(hours: bytes) -> tuple[FloatArray, FloatArray]:
    times = np.frombuffer(hours)
    k = rates(times)
    return k, quick_uptake(k[:, None] * times)


def shares(hours: FloatArray) -> tuple[FloatArray, FloatArray]:
    """The grid of k (K,) and the law on it (K, m). Panels are mostly read together, so these are
    kept; do not change what is handed out."""
    return _grid(np.ascontiguousarray(hours, dtype=np.float64).tobytes())


def misfits(hours: FloatArray, y: FloatArray, weight: FloatArray) -> FloatArray:
    """Least misfit of the line through the first n readings, for every n at once; (m,), infinite
    for n < 3. Needs no limits, so running sums do."""
    _, share = shares(hours)
    y = y - y.mean()
    w = np.cumsum(weight)
    x_mean = np.cumsum(weight * share, axis=1) / w
    y_mean = np.cumsum(weight * y) / w
    sxx = np.cumsum(weight * share**2, axis=1) - w * x_mean**2
    sxy = np.cumsum(weight * share * y, axis=1) - w * x_mean * y_mean
    syy = np.cumsum(weight * y**2) - w * y_mean**2
    slope = np.where(sxx > 1e-9 * w, sxy / np.maximum(sxx, 1e-300), 0.0)
    squares = np.maximum(syy - np.maximum(slope, 0.0) * sxy, 0.0).min(axis=0)
    freedom = np.maximum(np.arange(hours.size) - 2, 1)
    found: FloatArray = np.sqrt(squares / freedom)
    found[:2] = np.inf
    return found


def second_stage(
    hours: FloatArray, y: FloatArray, weight: FloatArray, fewest: int
) -> tuple[int, float, float]:
    """Best place t₂ of a second stage, the sum of squares with it and without it.

    At least `fewest` readings lie up to t₂ and two after it.
    """
    places = np.arange(fewest - 1, hours.size - 2)
    late = np.maximum(0.0, hours[None, :] - hours[places][:, None])
    single, both = _squares(shares(hours)[1], y, weight, late)
    _, at = np.unravel_index(int(np.argmin(both)), both.shape)
    return int(places[at]), max(float(both.min()), 0.0), float(single.min())


def _squares(
    share: FloatArray, y: FloatArray, weight: FloatArray, late: FloatArray
) -> tuple[FloatArray, FloatArray]:
    """The weighted sum of squares for each k, with the law (K, m) on it, without a second stage
    (K,), and with each of some (T, m), (K, T)."""
    root = np.sqrt(weight)
    share, late = share * root, late * root
    one = root / np.linalg.norm(root)

    def without_mean(rows: FloatArray) -> FloatArray:
        return np.asarray(rows - (rows @ one)[..., None] * one, dtype=np.float64)

    share, late, target = without_mean(share), without_mean(late), without_mean(y * root)
    share = share / np.maximum(np.linalg.norm(share, axis=1, keepdims=True), 1e-12)
    along = share @ target
    single = target @ target - along**2
    overlap = share @ late.T
    left = np.maximum((late**2).sum(axis=1) - overlap**2, 1e-12 * (late**2).sum(axis=1))
    gain = (target @ late.T - along[:, None] * overlap) ** 2 / left
    return single, single[:, None] - gain


def fit(
    hours: FloatArray, y: FloatArray, deviation: FloatArray, second_from: int | None = None
) -> FickFit:
    """Lay the law on readings: `hours` (m,) ascending, ln C and its standard error (m,)."""
    weight = 1 / deviation**2
    late = None if second_from is None else np.maximum(0.0, hours - hours[second_from])
    k, share = shares(hours)
    without, with_stage = _squares(
        share, y, weight, np.empty((0, y.size)) if late is None else late[None]
    )
    best = int(np.argmin(without if late is None else with_stage[:, 0]))
    k = np.union1d(k, np.geomspace(k[max(best - 1, 0)], k[min(best + 1, k.size - 1)], _FINE))
    squares, parts, covariance = _solve(quick_uptake(k[:, None] * hours), y, weight, late)
    best = int(np.argmin(squares))
    least = float(squares[best])
    freedom = hours.size - (3 if late is None else 5)
    scale = max(1.0, least / max(freedom, 1))
    room = least + NORMAL_95**2 * scale - squares
    inside = room >= 0
    first, last = int(np.argmax(inside)), inside.size - int(np.argmax(inside[::-1]))

    def limits(combination: FloatArray, low_open: bool, high_open: bool) -> Limits:
        middle = parts @ combination
        variance = np.einsum("i,kij,j->k", combination, covariance, combination)
        reach = np.sqrt(np.maximum(room, 0) * variance)
        return Limits(
            float(middle[best]),
            None if low_open else float((middle - reach)[inside].min()),
            None if high_open else float((middle + reach)[inside].max()),
        )

    size = parts.shape[1]
    dry, rise = np.eye(size)[0], np.eye(size)[1]
    slow_open, fast_open = bool(inside[0]), bool(inside[-1])
    return FickFit(
        dry=limits(dry, fast_open, False),
        rise=limits(rise, False, slow_open or fast_open),
        full=limits(dry + rise, False, slow_open),
        rate_per_h=Limits(
            float(k[best]),
            None if slow_open else _edge(k, room, first),
            None if fast_open else _edge(k, room, last),
        ),
        closed=not fast_open,
        misfit=math.sqrt(least / max(freedom, 1)),
        freedom=freedom,
        second_from=second_from,
        slope_per_h=0.0 if late is None else float(parts[best, 2]),
    )


def _solve(
    share: FloatArray, y: FloatArray, weight: FloatArray, late: FloatArray | None
) -> tuple[FloatArray, FloatArray, FloatArray]:
    """For each k, with the law (K, m) on it: the weighted sum of squares (K,), a, b and c (K, p),
    their covariance (K, p, p).

    The columns are scaled and the smallest pivot is kept off zero, so that a k for which all
    readings are saturated gives a huge variance instead of an error."""
    columns = [np.ones_like(share), share]
    if late is not None:
        columns.append(np.broadcast_to(late / late.max(), share.shape))
    design = np.stack(columns, axis=-1)
    normal = np.swapaxes(design * weight[:, None], 1, 2) @ design
    size = normal.shape[-1]
    normal = normal + 1e-12 * normal[:, :1, :1] * np.eye(size)
    covariance: FloatArray = np.asarray(np.linalg.inv(normal), dtype=np.float64)
    middle = y.mean()
    right = np.swapaxes(design * weight[:, None], 1, 2) @ (y - middle)
    parts: FloatArray = (covariance @ right[..., None])[..., 0]
    residual = (y - middle) - (design @ parts[..., None])[..., 0]
    squares: FloatArray = (weight * residual**2).sum(axis=1)
    parts[:, 0] += middle
    if late is not None:
        parts[:, 2] /= late.max()
    return squares, parts, covariance


def _edge(k: FloatArray, room: FloatArray, place: int) -> float:
    """Where `room` passes zero between the places before `place` and `place`, k on a log scale."""
    before, after = float(room[place - 1]), float(room[place])
    share = before / (before - after)
    return float(k[place - 1] * (k[place] / k[place - 1]) ** share)
