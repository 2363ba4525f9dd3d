"""The relaxation outline: how the resistance of a spectrum is spread over time constants.

Exploratory. It says where time constants lie and about how much resistance belongs to each, without
a circuit; many outlines fit the same data, and its width is half the regularisation's doing.

Mathematics. Z(ω) = R_∞ + jωL + 1/(jωC_b) + Σ_k g_k/(1 + jωτ_k) with everything ≥ 0 and τ_k evenly
spaced in ln τ over the measured range and a little beyond. A film that blocks has no resistance to
spread; its capacitance C_b is a term of its own and takes that part out first. Rows are divided by
|Z|. Tikhonov: λ² |D (g/s)|² is added, D the second difference and s_k = |Z| near ω = 1/τ_k, so that
a small arc is smoothed no more than a large one. λ is the one that predicts left-out points best
(five interleaved folds). The band comes from refitting the outline with its residuals, sign by
sign, dealt out again (wild bootstrap).

Sources: Tikhonov & Arsenin, regularisation; Lawson & Hanson, non-negative least squares (scipy);
the form of the problem as in any text on distributions of relaxation times; from memory.
"""

from __future__ import annotations

import itertools
from dataclasses import dataclass

import numpy as np

from coatgui.circuits.elements import ComplexArray
from coatgui.fitting.solver import BoolArray, FloatArray

_PER_DECADE = 8
_BEYOND = 0.5  # decades beyond the measured range on either side
_STRENGTHS = np.logspace(-2.5, 0.5, 7)
_FOLDS = 5
_DEALS = 40
_FEWEST_POINTS = 16
_LEAST_SHARE = 0.1  # of |Z| near its own frequency: a smaller hump is not listed as a peak
_LEAST_BLOCKING = 0.05  # of the largest |Z|


@dataclass(frozen=True, eq=False)
class Peak:
    """One hump of the outline: its time constant (s), the resistance under it (Ω), and that
    resistance's share of all."""

    time_constant_s: float
    resistance_ohm: float
    share: float


@dataclass(frozen=True, eq=False)
class RelaxationOutline:
    """`density_ohm` (M,) is resistance per unit of ln τ at `time_constant_s` (M,), with a 95 %
    band `low_ohm`, `high_ohm` (M,) around it. `blocking_capacitance_f` is None where the film
    conducts. `strength` is the regularisation that cross-validation chose; `peaks` run from fast
    to slow."""

    time_constant_s: FloatArray
    density_ohm: FloatArray
    low_ohm: FloatArray
    high_ohm: FloatArray
    series_resistance_ohm: float
    blocking_capacitance_f: float | None
    strength: float
    residual_rms_percent: float
    peaks: tuple[Peak, ...]


def relaxation_outline(
    frequency_hz: FloatArray, impedance_ohm: ComplexArray, used: BoolArray
) -> RelaxationOutline | None:
    """The outline of one spectrum: `frequency_hz`, `impedance_ohm`, `used` (N,). None where fewer
    than 16 points are used."""
    frequency_hz, impedance_ohm = frequency_hz[used], impedance_ohm[used]
    if frequency_hz.size < _FEWEST_POINTS:
        return None
    problem = _Problem(frequency_hz, impedance_ohm)
    strength = problem.best_strength()
    amounts = problem.solve(strength, problem.right)
    modelled = problem.left @ amounts
    bands = problem.deal_again(strength, modelled)
    density = amounts[problem.own] / problem.step
    low, high = (band[problem.own] / problem.step for band in bands)
    # Data dealt again are smoothed once more, which may push a whole band a little off its middle.
    low, high = np.minimum(low, density), np.maximum(high, density)
    inverse = float(amounts[2])
    reactance = inverse / (2.0 * np.pi * frequency_hz.min())
    # A capacitance in series that the slowest point can hardly tell from a short circuit is none.
    blocks = reactance > _LEAST_BLOCKING * float(np.abs(impedance_ohm).max())
    rest = modelled - problem.right
    return RelaxationOutline(
        time_constant_s=problem.tau,
        density_ohm=density,
        low_ohm=low,
        high_ohm=high,
        series_resistance_ohm=float(amounts[0]),
        blocking_capacitance_f=1.0 / inverse if blocks else None,
        strength=float(strength),
        residual_rms_percent=100.0 * float(np.sqrt(np.mean(rest**2))),
        peaks=_peaks(problem, density),
    )


class _Problem:
    """The linear problem of one spectrum: `left` (2N, 3 + M), `right` (2N,), rows over |Z|."""

    def __init__(self, frequency_hz: FloatArray, impedance: ComplexArray) -> None:
        omega = 2.0 * np.pi * frequency_hz
        fastest = -np.log10(omega.max()) - _BEYOND
        slowest = -np.log10(omega.min()) + _BEYOND
        count = round((slowest - fastest) * _PER_DECADE) + 1
        self.tau = np.logspace(fastest, slowest, count)
        self.step = float(np.log(self.tau[1] / self.tau[0]))
        self.own = slice(3, 3 + count)
        size = np.abs(impedance)
        columns = np.column_stack(
            [
                np.ones_like(omega),
                1j * omega,
                -1j / omega,
                1.0 / (1.0 + 1j * omega[:, None] * self.tau),
            ]
        )
        weighted = columns / size[:, None]
        self.left = np.concatenate([weighted.real, weighted.imag])
        unit = impedance / size
        self.right = np.concatenate([unit.real, unit.imag])
        order = np.argsort(omega)
        self.near = np.exp(np.interp(-np.log(self.tau), np.log(omega[order]), np.log(size[order])))
        self.penalty = np.zeros((count - 2, 3 + count))
        for row in range(count - 2):
            places = 3 + row + np.arange(3)
            self.penalty[row, places] = np.array([1.0, -2.0, 1.0]) / self.near[row : row + 3]
        # Unknowns of like size: what a column of one would add.
        self.scale = np.linalg.norm(self.left, axis=0)

    def solve(
        self, strength: float, right: FloatArray, kept: BoolArray | None = None
    ) -> FloatArray:
        """Non-negative amounts (3 + M,)."""
        from scipy.optimize import nnls

        left = self.left if kept is None else self.left[kept]
        right = right if kept is None else right[kept]
        system = np.concatenate([left, strength * self.penalty]) / self.scale
        whole = np.concatenate([right, np.zeros(self.penalty.shape[0])])
        amounts: FloatArray = nnls(system, whole)[0] / self.scale
        return amounts

    def best_strength(self) -> float:
        """The regularisation that predicts left-out points best."""
        fold = np.tile(np.arange(self.right.size // 2) % _FOLDS, 2)
        missed = []
        for strength in _STRENGTHS:
            total = 0.0
            for out in range(_FOLDS):
                amounts = self.solve(strength, self.right, fold != out)
                rest = (self.left @ amounts - self.right)[fold == out]
                total += float(rest @ rest)
            missed.append(total)
        return float(_STRENGTHS[int(np.argmin(missed))])

    def deal_again(self, strength: float, modelled: FloatArray) -> tuple[FloatArray, FloatArray]:
        """2.5 % and 97.5 % points of the amounts over fits to data dealt again."""
        random = np.random.default_rng(0)
        rest = self.right - modelled
        deals = [
            self.solve(strength, modelled + rest * random.choice([-1.0, 1.0], rest.size))
            for _ in range(_DEALS)
        ]
        low, high = np.quantile(deals, [0.025, 0.975], axis=0)
        return np.asarray(low), np.asarray(high)


def _peaks(problem: _Problem, density: FloatArray) -> tuple[Peak, ...]:
    """Humps between valleys of the outline."""
    total = float(density.sum()) * problem.step
    if total <= 0:
        return ()
    padded = np.concatenate([[0.0], density, [0.0]])
    tops = [
        int(i) for i in np.flatnonzero((padded[1:-1] > padded[:-2]) & (padded[1:-1] >= padded[2:]))
    ]
    cuts = [0, *(_valley(density, a, b) for a, b in itertools.pairwise(tops)), density.size]
    peaks = []
    for top, (begin, end) in zip(tops, itertools.pairwise(cuts), strict=True):
        hump = density[begin:end]
        amount = float(hump.sum()) * problem.step
        if amount >= _LEAST_SHARE * problem.near[top]:
            middle = float(np.exp(np.average(np.log(problem.tau[begin:end]), weights=hump)))
            peaks.append(Peak(middle, amount, amount / total))
    return tuple(peaks)


def _valley(density: FloatArray, first: int, last: int) -> int:
    return int(first + np.argmin(density[first : last + 1]))
