"""Faults of single readings, searched for as patterns in what the measurement model leaves over.

A wild point moves one complex number; a change of the instrument's range multiplies everything
slower by one factor, or by one that dies away over a few points; a drift during the sweep
multiplies by a factor that grows towards the slow end, where the sweep spends its time. Each is a
vector in ln Z. The search is a matching pursuit: of all patterns the one that explains most, beyond
what chance would, is taken into the model, and so on until none stands out; then each is weighed
against the others once more. So two neighbouring wild points do not hide each other, a step is not
mistaken for a wild point, and neither bends the model around it. All spectra on one grid are
searched at once.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from coatgui.quality.kramers_kronig import MeasurementModel, complexes
from coatgui.quality.patterns import Kind, Levels, Pattern, Patterns, patterns
from coatgui.records import BoolArray, ComplexArray, FloatArray

_MOST = 0.4  # of the points may be found faulty before the search stops
_BARE = 1e-3  # a pattern of whose square the model leaves less cannot be seen
_LEAST = 0.02  # the same for the number that a point's part is divided by
_INNER = 2.5
_INNER_SHARE = 0.9112  # variance of a normal distribution cut off there

_Rows = NDArray[np.intp]


@dataclass(frozen=True, slots=True)
class Fault:
    """`size` is the departure of ln Z: complex for a wild point; of a drift, at its end."""

    kind: Kind
    place: int
    size: complex


@dataclass(frozen=True, slots=True)
class Searched:
    """What was found in one spectrum of N points.

    `residuals` (N,) of ln Z against the model without the faulty parts; `left` (N,), what remains
    when the faults are taken out as well, in units of the scatter (standard deviation 1 of each
    part of a clean point, 0 for a point taken out); `scatter`, the robust standard deviation of one
    part of ln Z.
    """

    faults: tuple[Fault, ...]
    residuals: ComplexArray
    left: ComplexArray
    scatter: float


def _median(values: FloatArray) -> FloatArray:
    """Medians (B,) of rows (B, M) whose NaN are not counted; numpy's own takes many times longer
    for single rows."""
    ordered = np.sort(values, axis=1)  # NaN last
    count = ordered.shape[1] - np.isnan(ordered).sum(axis=1)
    rows = np.arange(len(values))
    return np.asarray((ordered[rows, (count - 1) // 2] + ordered[rows, count // 2]) / 2)


def _deviation(rest: FloatArray, own: FloatArray) -> tuple[FloatArray, FloatArray]:
    """What is left (B, 2N) scaled to one standard deviation for all, and that deviation (B,):
    from the median, made sharper by the mean square of what lies within 2.5 of it. `own` is the
    share of its own square that the model leaves to each part."""
    seen = own > _LEAST
    scaled = np.where(seen, rest / np.sqrt(np.maximum(own, _LEAST)), np.nan)
    size = np.abs(scaled)
    size[~seen.any(axis=1)] = 0.0
    first = 1.4826 * _median(size)
    inner = size <= _INNER * first[:, None]
    squares = np.where(inner, np.nan_to_num(scaled) ** 2, 0.0).sum(axis=1)
    deviation = np.sqrt(squares / np.maximum(inner.sum(axis=1), 1) / _INNER_SHARE)
    return np.nan_to_num(scaled), np.maximum(deviation, 1e-7)


class _Pursuit:
    """The search in spectra (B, 2N) of one grid, with one number of directions."""

    def __init__(self, shapes: Patterns, directions: FloatArray, logarithm: FloatArray) -> None:
        self.shapes, self.logarithm = shapes, logarithm
        count, width = logarithm.shape
        self.half = width // 2
        self.directions = directions
        self.rest = self.bare(logarithm)
        # What model and faults taken so far leave of the square of each point and pattern.
        real, imaginary = directions[: self.half], directions[self.half :]
        self.clean_own = 1 - (directions**2).sum(axis=1)
        self.own = np.tile(self.clean_own, (count, 1))
        self.cross = np.tile(-(real * imaginary).sum(axis=1), (count, 1))
        left = shapes.squares - ((shapes.rows @ directions) ** 2).sum(axis=1)
        self.pattern_own = np.tile(left, (count, 1))
        self.units: list[FloatArray] = []

    def bare(self, vectors: FloatArray) -> FloatArray:
        """What the model's directions leave of vectors (b, 2N)."""
        return np.asarray(vectors - (vectors @ self.directions) @ self.directions.T)

    def take(self, rows: _Rows, vectors: FloatArray) -> None:
        """Take one vector (b, 2N) into the model of each of the spectra `rows`."""
        bare = self.bare(vectors)
        for unit in self.units:
            bare -= (unit[rows] * vectors).sum(axis=1, keepdims=True) * unit[rows]
        length = np.sqrt((bare**2).sum(axis=1, keepdims=True))
        unit = np.where(length > 1e-6, bare / np.maximum(length, 1e-6), 0.0)
        self.rest[rows] -= (self.rest[rows] * unit).sum(axis=1, keepdims=True) * unit
        self.own[rows] -= unit**2
        self.cross[rows] -= unit[:, : self.half] * unit[:, self.half :]
        self.pattern_own[rows] -= (unit @ self.shapes.rows.T) ** 2
        whole = np.zeros_like(self.rest)
        whole[rows] = unit
        self.units.append(whole)

    def take_points(self, rows: _Rows, places: NDArray[np.intp]) -> None:
        """Leave one point of each of the spectra `rows` out of its model."""
        for part in (0, self.half):
            vectors = np.zeros((rows.size, 2 * self.half))
            vectors[np.arange(rows.size), places + part] = 1.0
            self.take(rows, vectors)

    def best(
        self, rows: _Rows, levels: Levels
    ) -> tuple[NDArray[np.intp], FloatArray, NDArray[np.intp], FloatArray]:
        """For each of `rows` the best point and pattern and their scores, above 0 if they stand
        out: the square explained, in units of the scatter's, less the square asked for."""
        rest, own, cross = self.rest[rows], self.own[rows], self.cross[rows]
        variance = _deviation(rest, own)[1][:, None] ** 2
        real, imaginary = rest[:, : self.half], rest[:, self.half :]
        own_real, own_imaginary = own[:, : self.half], own[:, self.half :]
        determinant = own_real * own_imaginary - cross**2
        seen = determinant > _BARE
        safe = np.where(seen, determinant, 1.0)
        by_real = (own_imaginary * real - cross * imaginary) / safe
        by_imaginary = (own_real * imaginary - cross * real) / safe
        sigma, share = levels.wild
        eligible = seen & (by_real**2 + by_imaginary**2 > share**2)
        gain = (by_real * real + by_imaginary * imaginary) / variance
        points = np.where(eligible, gain - sigma**2, -1.0)
        along, pattern_own = rest @ self.shapes.rows.T, self.pattern_own[rows]
        seen = pattern_own > _BARE
        size = along / np.where(seen, pattern_own, 1.0)
        step = self.shapes.is_step
        eligible = seen & (np.abs(size) > np.where(step, levels.step[1], levels.drift[1]))
        sigmas = np.where(step, levels.step[0], levels.drift[0])
        scores = np.where(eligible, along * size / variance - sigmas**2, -1.0)
        return points.argmax(axis=1), points.max(axis=1), scores.argmax(axis=1), scores.max(axis=1)

    def run(self, blocked: BoolArray, levels: Levels) -> list[list[Pattern]]:
        """The patterns taken from each spectrum. `blocked` (B, N) points are left out first."""
        found: list[list[Pattern]] = [[] for _ in range(len(self.logarithm))]
        for place in np.nonzero(blocked.any(axis=0))[0]:
            rows = np.nonzero(blocked[:, place])[0]
            self.take_points(rows, np.full(rows.size, place))
        rows = np.arange(len(found))
        for _ in range(int(_MOST * self.half)):
            point, point_score, number, score = self.best(rows, levels)
            more = np.maximum(point_score, score) > 0
            is_point = (point_score > score)[more]
            rows, point, number = rows[more], point[more], number[more]
            if not rows.size:
                break
            if is_point.any():
                self.take_points(rows[is_point], point[is_point])
            if not is_point.all():
                self.take(rows[~is_point], self.shapes.rows[number[~is_point]])
            for at, row in enumerate(rows.tolist()):
                found[row].append(
                    Pattern(Kind.WILD, int(point[at]))
                    if is_point[at]
                    else self.shapes.found(int(number[at]))
                )
        return found

    def weigh(
        self, row: int, found: list[Pattern], blocked: BoolArray, levels: Levels
    ) -> tuple[tuple[Fault, ...], FloatArray]:
        """Weigh the patterns of one spectrum against one another and give back those that the
        others explain as well. Returns the faults, and the residuals (2N,) against the model
        without the faulty parts; brings the spectrum's row up to date."""
        found = list(found)
        hidden = [self.shapes.vectors(Pattern(Kind.WILD, int(p))) for p in np.nonzero(blocked)[0]]
        deviation = _deviation(self.rest[row][None], self.own[row][None])[1][0]
        while True:
            groups = [*(self.shapes.vectors(pattern) for pattern in found), *hidden]
            vectors = np.concatenate([*groups, np.zeros((0, 2 * self.half))])
            bare = self.bare(vectors).T
            inverse = np.linalg.pinv(bare.T @ bare, rcond=1e-9, hermitian=True)
            sizes = inverse @ (bare.T @ self.logarithm[row])
            weakest, place, first = 0.0, -1, 0
            faults = []
            for number, pattern in enumerate(found):
                own = slice(first, first + len(groups[number]))
                first = own.stop
                size = sizes[own]
                sigma, share = levels.for_kind(pattern.kind)
                gain = float(size @ np.linalg.pinv(inverse[own, own]) @ size) / deviation**2
                # Chosen as the best of many, and weighed with all others: a little less is asked.
                lack = 1.0 - min(gain / (0.8 * sigma**2), float(size @ size) / share**2)
                if lack > weakest:
                    weakest, place = lack, number
                faults.append(Fault(pattern.kind, pattern.place, complex(*size)))
            if place < 0:
                break
            del found[place]
        self.rest[row] = self.bare(self.logarithm[row][None])[0] - bare @ sizes
        self.own[row] = self.clean_own - ((bare @ inverse) * bare).sum(axis=1)
        return tuple(faults), self.rest[row] + vectors.T @ sizes


def search(
    model: MeasurementModel, logarithm: FloatArray, blocked: BoolArray, levels: Levels
) -> list[Searched]:
    """The faults of each of (B, 2N) stacked logarithms on the model's grid. Points `blocked` (B, N)
    do not shape the model and are not searched."""
    kept = np.array(model.level(logarithm))
    result: list[Searched | None] = [None] * len(logarithm)
    for level in np.unique(kept):
        own = np.nonzero(kept == level)[0]
        shapes = patterns(model.frequency_hz)
        work = _Pursuit(shapes, model.directions[:, :level], logarithm[own])
        asked = levels.on_sweep(model.frequency_hz.size, logarithm.shape[1] - int(level))
        found = work.run(blocked[own], asked)
        weighed = {
            row: work.weigh(row, found[row], blocked[i], asked)
            for row, i in enumerate(own.tolist())
            if found[row] or blocked[i].any()
        }
        scaled, scatter = _deviation(work.rest, work.own)
        left = complexes(scaled / scatter[:, None])
        for row, i in enumerate(own.tolist()):
            faults, residuals = weighed.get(row, ((), work.rest[row]))
            result[i] = Searched(faults, complexes(residuals), left[row], float(scatter[row]))
    return [searched for searched in result if searched is not None]
