"""What a fitted circuit leaves over, searched for steps, drift and the leads' inductance.

The measurement model of `kramers_kronig` follows whatever any panel may do, and with it part of a
fault. A circuit has few parameters and follows less, so that a step or a drift too small for the
Kramers–Kronig relations can still show in its residuals. Near the fit, with residuals r of ln Z and
the derivatives of ln Z by the parameters as columns of J, a fault p leaves p' = p - J(JᵀJ)⁻¹Jᵀp;
its size is (p'·r)/(p'·p'), and it stands out by |p'·r|/(σ|p'|) standard deviations, σ from what is
left without it. Where residuals follow one another even then, the circuit lacks something else: σ²
is raised by (1 + ρ)/(1 - ρ), ρ their lag-one correlation, as it is for the limits of the fit.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from enum import StrEnum

import numpy as np

from coatgui.circuits import CoatingModel, Grid, catalogue
from coatgui.quality.kramers_kronig import complexes, parts
from coatgui.quality.patterns import Levels, Patterns, patterns
from coatgui.quality.thresholds import thresholds
from coatgui.quality.words import hertz
from coatgui.records import (
    BoolArray,
    ComplexArray,
    Finding,
    Fit,
    FloatArray,
    Settings,
    Severity,
    Spectrum,
)

_BARE = 1e-3  # a pattern of whose square the circuit leaves less cannot be seen
_SHOWS = 1e-3  # a parameter that moves ln Z by less, doubled or halved, does not show
_AGREE = 0.5  # of the scatter, how far the circuit may be from the fit that was made
_COIL_SEEN = 0.2  # of its largest effect, down to where an inductance is said to show
_FEWEST_FREE = 10  # numbers that a circuit leaves free


class _Kind(StrEnum):
    STEP = "step"
    DRIFT = "drift"
    INDUCTANCE = "inductance"


@dataclass(frozen=True, slots=True)
class _Found:
    """`place` is the first point after a step or of a drift, the last where an inductance shows;
    `size` is the departure of ln Z, or the inductance in H."""

    kind: _Kind
    place: int
    size: float


class _Circuit:
    """Circuits of one model (B spectra) near the fits that were made, on the points `used` (N,)."""

    def __init__(
        self,
        model: CoatingModel,
        frequency_hz: FloatArray,
        used: BoolArray,
        theta: FloatArray,
        modelled: ComplexArray,
    ) -> None:
        with np.errstate(all="ignore"):
            evaluation = model.evaluate(theta, Grid.of_hertz(frequency_hz))
            self.apart = np.where(used, np.log(evaluation.impedance / modelled), 0)
            slopes = evaluation.derivatives(np.where(used, 1 / evaluation.impedance, 0))
        slopes = np.where(np.isfinite(slopes), slopes, 0)
        u, singular, _ = np.linalg.svd(parts(slopes).transpose(0, 2, 1), full_matrices=False)
        self.bent: FloatArray = u * (singular > _SHOWS)[:, None, :]
        # The leads' inductance, per H.
        self.coil: FloatArray = parts(2j * np.pi * frequency_hz / modelled * used)

    def bare(self, vectors: FloatArray) -> FloatArray:
        """What the circuits leave of vectors (B, M, 2N)."""
        return np.asarray(vectors - (vectors @ self.bent) @ self.bent.transpose(0, 2, 1))


def circuit_residuals(
    spectra: Sequence[Spectrum],
    fits: Sequence[Fit],
    *,
    settings: Settings,
    own_models: Sequence[CoatingModel] = (),
) -> list[Finding | None]:
    """For each spectrum and the circuit laid on it a doubt where the residuals hold a step or a
    drift, else None. A fit whose parameters the data leave so open that its circuit cannot be
    drawn from them is not tested."""
    limits = thresholds(settings)
    models = {**catalogue(), **{model.model_id: model for model in own_models}}
    alike: dict[tuple[str, bytes, bytes], list[int]] = {}
    for place, (spectrum, fit) in enumerate(zip(spectra, fits, strict=True)):
        dead = fit.used & (spectrum.impedance_ohm != 0)
        key = fit.model, spectrum.frequency_hz.tobytes(), dead.tobytes()
        alike.setdefault(key, []).append(place)
    result: list[Finding | None] = [None] * len(spectra)
    for (name, grid, mask), places in alike.items():
        model, used = models[name], np.frombuffer(mask, dtype=np.bool_)
        free = 2 * int(used.sum()) - len(model.parameters) - 1
        if free < _FEWEST_FREE:
            continue
        frequency_hz = np.frombuffer(grid, dtype=np.float64)
        modelled = np.stack([fits[i].modelled_ohm for i in places])
        ratio = np.stack([spectra[i].impedance_ohm for i in places]) / modelled
        off = np.where(used, np.log(np.where(used, ratio, 1.0)), 0)
        theta = np.stack([_natural(model, fits[i]) for i in places])
        circuit = _Circuit(model, frequency_hz, used, theta, modelled)
        levels = _levels(limits, int(used.sum()), free)
        found = _search(off, circuit, patterns(frequency_hz), used, free, levels)
        for place, one in zip(places, found, strict=True):
            if one is not None:
                result[place] = _finding(one, frequency_hz, fits[place])
    return result


def _levels(limits: dict[str, float], points: int, free: int) -> dict[_Kind, tuple[float, float]]:
    """How far each kind must stand out: standard deviations, and the least size in ln Z."""
    step, drift, coil = (
        (limits[f"fit_{name}_sigma"], limits[f"{share}_percent"] / 100)
        for name, share in (("step", "step"), ("drift", "drift"), ("inductance", "drift"))
    )
    on = Levels(coil, step, drift).on_sweep(points, free)
    return {
        _Kind.STEP: on.step,
        _Kind.DRIFT: on.drift,
        _Kind.INDUCTANCE: on.wild,
    }


def _natural(model: CoatingModel, fit: Fit) -> FloatArray:
    """Natural coordinates (P,) of a fit: the value, or the bound, or the middle of the search."""
    values = []
    for spec in model.parameters:
        q = fit.parameter(spec.symbol)
        known = None if q is None else q.value
        values.append(math.sqrt(spec.low * spec.high) if known is None else known)
    return model.natural(np.array(values))


def _search(
    off: ComplexArray,
    circuit: _Circuit,
    shapes: Patterns,
    used: BoolArray,
    free: int,
    levels: dict[_Kind, tuple[float, float]],
) -> list[_Found | None]:
    """The pattern that stands out most in residuals (B, N), where one does."""
    rest = circuit.bare(parts(off)[:, None, :])[:, 0]
    rows = shapes.rows * np.concatenate([used, used])
    coil = circuit.bare(circuit.coil[:, None, :])[:, 0]
    squares = np.tile((rows**2).sum(axis=1), (len(off), 1))
    whole = np.column_stack([squares, (circuit.coil**2).sum(axis=1)])
    own = squares - ((rows @ circuit.bent) ** 2).sum(axis=2)
    own = np.column_stack([own, (coil**2).sum(axis=1)])
    along = np.column_stack([rest @ rows.T, (coil * rest).sum(axis=1)])
    seen = own > _BARE * whole
    size = np.where(seen, along / np.where(seen, own, 1.0), 0.0)
    gain = size * along
    variance = ((rest**2).sum(axis=1, keepdims=True) - gain) / free
    kinds = [_Kind.STEP if step else _Kind.DRIFT for step in shapes.is_step]
    kinds.append(_Kind.INDUCTANCE)
    sigma, share = np.array([levels[kind] for kind in kinds]).T
    largest = np.ones_like(size)
    largest[:, -1] = np.abs(circuit.coil).max(axis=1)
    score = gain / np.maximum(variance, 1e-300) - sigma**2
    score[~(np.abs(size) * largest > share)] = -1.0
    score[size[:, -1] < 0, -1] = -1.0  # no inductance is negative
    # Where the data leave parameters open, what is stated of them may be another circuit.
    drawn = (np.abs(circuit.apart) ** 2).sum(axis=1) < _AGREE**2 * (np.abs(off) ** 2).sum(axis=1)
    result: list[_Found | None] = []
    for row, number in enumerate(score.argmax(axis=1).tolist()):
        result.append(None)
        if not drawn[row] or not score[row, number] > 0:
            continue
        kind = kinds[number]
        if number < len(rows):
            vector, place = rows[number], int(shapes.places[number])
        else:
            vector = circuit.coil[row]
            turned = np.abs(complexes(vector))
            place = int(np.flatnonzero(turned > _COIL_SEEN * turned.max())[-1])
        bare = vector - circuit.bent[row] @ (circuit.bent[row].T @ vector)
        rho = _following(complexes(rest[row] - size[row, number] * bare), used)
        raised = variance[row, number] * (1 + rho) / (1 - rho)
        if gain[row, number] > sigma[number] ** 2 * raised:
            result[-1] = _Found(kind, place, float(size[row, number]))
    return result


def _following(left: ComplexArray, used: BoolArray) -> float:
    """Lag-one correlation along the sweep (N,); what scatter alone gives counts as none."""
    left = left[used]
    rho = float((left[1:] * left[:-1].conj()).real.sum() / max((np.abs(left) ** 2).sum(), 1e-300))
    return min(rho, 0.9) if rho > 2 / math.sqrt(2 * (left.size - 1)) else 0.0


def _finding(found: _Found, frequency_hz: FloatArray, fit: Fit) -> Finding:
    size, place = found.size, found.place
    percent = 100 * float(np.expm1(size))
    way = "up" if percent > 0 else "down"
    beyond = hertz(float(frequency_hz[place]))
    if found.kind is _Kind.STEP:
        before = hertz(float(frequency_hz[place - 1]))
        what = f"as a step {way} by {abs(percent):.2g} % between {before} and {beyond} would"
        points, named = range(place - 1, place + 1), ("percent", percent)
        cause = "the instrument changed its range or the panel changed during the sweep"
    elif found.kind is _Kind.DRIFT:
        what = f"as if |Z| had run {way} by {abs(percent):.2g} % towards the slow end"
        points, named = range(place, frequency_hz.size), ("percent", percent)
        cause = "the panel changed during the sweep"
    else:
        what = f"as an inductance of {1e6 * size:.2g} µH would, from {beyond} up"
        points, named = range(place + 1), ("inductance_h", size)
        cause = "leads, as they have it, or the instrument"
    return Finding(
        "fit_leaves_pattern",
        Severity.DOUBT,
        f"What the circuit “{fit.model_name}” leaves over lies {what}: {cause}; or the circuit "
        "lacks something. Look at the residuals, and measure again to tell which.",
        tuple(points),
        (named,),
    )
