"""How faults look in ln Z, and how far one must stand out to be named."""

from __future__ import annotations

from dataclasses import dataclass
from enum import StrEnum
from functools import lru_cache

import numpy as np

from coatgui.records import BoolArray, FloatArray

_DECAYS = (0.0, 0.2, 0.4, 0.7)  # per point after a step: some stay, some die away
_STEP_ENDS = 3  # a step needs so many points on either side
_DRIFT_DECADES = (1.0, 2.0, 3.0)  # of the slow end
_DRIFT_SEEN = 0.05  # of its final size, where a drift is said to begin


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
    """How far a pattern must stand out: in standard deviations, and as a share of |Z|."""

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

    def for_kind(self, kind: Kind) -> tuple[float, float]:
        return {Kind.WILD: self.wild, Kind.STEP: self.step, Kind.DRIFT: self.drift}[kind]


class Patterns:
    """Steps and drifts on one grid of N frequencies: `rows` (T, 2N), in the real parts (|Z|) only,
    and what each of them is. A drift follows the time the sweep has taken (nearly 1/f), its square
    root, or the logarithm of the frequency over the slow decades."""

    def __init__(self, frequency_hz: FloatArray) -> None:
        number = frequency_hz.size
        places = np.arange(_STEP_ENDS, number - _STEP_ENDS + 1)
        since = np.arange(number) - places[:, None]
        fading = np.exp(-np.array(_DECAYS)[:, None, None] * np.maximum(since, 0))
        steps = (fading * (since >= 0)).reshape(-1, number)
        time = frequency_hz[-1] / frequency_hz
        above = -np.log10(time)
        slow = [np.clip(1 - above / decades, 0, 1) for decades in _DRIFT_DECADES]
        drifts = np.array([time, np.sqrt(time), *slow])
        real = np.vstack([steps, drifts])
        self.rows: FloatArray = np.hstack([real, np.zeros_like(real)])
        starts = np.argmax(drifts > _DRIFT_SEEN, axis=1)
        kinds = [Kind.STEP] * len(steps) + [Kind.DRIFT] * len(drifts)
        self.found = [
            Pattern(kind, place, row)
            for row, (kind, place) in enumerate(
                zip(kinds, [*places.tolist() * len(_DECAYS), *starts.tolist()], strict=True)
            )
        ]
        self.squares: FloatArray = (real**2).sum(axis=1)
        self.is_step: BoolArray = np.arange(len(real)) < len(steps)

    def vectors(self, pattern: Pattern) -> FloatArray:
        """The vectors (1 or 2, 2N) of one pattern."""
        if pattern.kind is not Kind.WILD:
            return self.rows[pattern.number : pattern.number + 1]
        width = self.rows.shape[1]
        result = np.zeros((2, width))
        result[0, pattern.place] = result[1, pattern.place + width // 2] = 1.0
        return result


@lru_cache(maxsize=32)
def _patterns(grid: bytes) -> Patterns:
    return Patterns(np.frombuffer(grid, dtype=np.float64))


def patterns(frequency_hz: FloatArray) -> Patterns:
    """The patterns on a grid (N,), kept for the next spectrum on the same grid."""
    return _patterns(np.ascontiguousarray(frequency_hz, dtype=np.float64).tobytes())
