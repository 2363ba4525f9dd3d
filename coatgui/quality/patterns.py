"""How faults look in ln Z, and how far one must stand out to be named."""

from __future__ import annotations

import math
from dataclasses import dataclass
from enum import StrEnum
from functools import lru_cache

import numpy as np
from numpy.typing import NDArray

from coatgui.records import BoolArray, FloatArray

# Per point after a step: some stay, some die away, faster or slower. More of them would find hardly
# more steps, and more where there are none.
_DECAYS = (0.0, 0.35)
_STEP_ENDS = 3  # a step needs so many points on either side
_DRIFT_DECADES = (1.0, 2.0, 3.0)  # of the slow end
_DRIFT_SEEN = 0.05  # of its final size, where a drift is said to begin
_USUAL_POINTS = 71  # of the sweeps that the levels are meant for


class Kind(StrEnum):
    WILD = "wild"
    STEP = "step"
    DRIFT = "drift"


@dataclass(frozen=True, slots=True)
class Pattern:
    """A fault as it was found: `place` is the point of a wild point, the first point after a step,
    the first point of a drift; `number` is the row of the patterns, -1 for a wild point."""

    kind: Kind
    place: int
    number: int = -1


@dataclass(frozen=True, slots=True)
class Levels:
    """How far a pattern must stand out: in standard deviations, and as a share of |Z|. Of a sweep
    whose scatter is well known; see `on_sweep`."""

    wild: tuple[float, float]
    step: tuple[float, float]
    drift: tuple[float, float]

    @classmethod
    def of(cls, limits: dict[str, float]) -> Levels:
        pairs = [
            (limits[f"{name}_sigma"], limits[f"{name}_percent"] / 100)
            for name in ("wild_point", "step", "drift")
        ]
        return cls(*pairs)

    def on_sweep(self, points: int, free: int) -> Levels:
        """The levels for a sweep of so many points whose model leaves `free` numbers. Few of them
        tell the scatter less well: the quantile z of a normal distribution becomes that of
        Student's t, about z·(1 + (z² + 1)/(4·free)) (the first term of Fisher and Cornish's
        expansion, from memory). More points are more places for chance, so that a long sweep asks
        for more."""
        places = 2 * math.log(max(points / _USUAL_POINTS, 1.0))

        def raised(level: tuple[float, float], more: float) -> tuple[float, float]:
            z = math.sqrt(level[0] ** 2 + more)
            return z * (1 + (z**2 + 1) / (4 * free)), level[1]

        return Levels(*(raised(level, places) for level in (self.wild, self.step, self.drift)))

    def for_kind(self, kind: Kind) -> tuple[float, float]:
        return {Kind.WILD: self.wild, Kind.STEP: self.step, Kind.DRIFT: self.drift}[kind]


@lru_cache(maxsize=32)
def _steps(number: int) -> tuple[FloatArray, NDArray[np.intp]]:
    """Steps (T, N) on so many points, and the first point after each (T,)."""
    places = np.arange(_STEP_ENDS, number - _STEP_ENDS + 1)
    since = np.arange(number) - places[:, None]
    fading = np.exp(-np.array(_DECAYS)[:, None, None] * np.maximum(since, 0))
    return (fading * (since >= 0)).reshape(-1, number), np.tile(places, len(_DECAYS))


class Patterns:
    """Steps and drifts on one grid of N frequencies: `rows` (T, 2N), in the real parts (|Z|) only,
    and what each of them is. A drift follows the time the sweep has taken (nearly 1/f), its square
    root, or the logarithm of the frequency over the slow decades."""

    def __init__(self, frequency_hz: FloatArray) -> None:
        number = frequency_hz.size
        steps, places = _steps(number)
        time = frequency_hz[-1] / frequency_hz
        above = -np.log10(time)
        slow = [np.clip(1 - above / decades, 0, 1) for decades in _DRIFT_DECADES]
        drifts = np.array([time, np.sqrt(time), *slow])
        real = np.vstack([steps, drifts])
        self.rows: FloatArray = np.hstack([real, np.zeros_like(real)])
        starts = np.argmax(drifts > _DRIFT_SEEN, axis=1)
        self.places = np.concatenate([places, starts])
        self.squares: FloatArray = (real**2).sum(axis=1)
        self.is_step: BoolArray = np.arange(len(real)) < len(steps)

    def found(self, number: int) -> Pattern:
        """What a row is."""
        kind = Kind.STEP if self.is_step[number] else Kind.DRIFT
        return Pattern(kind, int(self.places[number]), number)

    def vectors(self, pattern: Pattern) -> FloatArray:
        """The vectors (1 or 2, 2N) of one pattern."""
        if pattern.kind is not Kind.WILD:
            return self.rows[pattern.number : pattern.number + 1]
        width = self.rows.shape[1]
        result = np.zeros((2, width))
        result[0, pattern.place] = result[1, pattern.place + width // 2] = 1.0
        return result


@lru_cache(maxsize=256)
def _patterns(grid: bytes) -> Patterns:
    return Patterns(np.frombuffer(grid, dtype=np.float64))


def patterns(frequency_hz: FloatArray) -> Patterns:
    """The patterns on a grid (N,), kept for the next spectrum on the same grid."""
    return _patterns(np.ascontiguousarray(frequency_hz, dtype=np.float64).tobytes())
