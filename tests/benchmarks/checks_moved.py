"""Which faults would move what is reported, and which of them no test could tell from scatter.

"Reported" is what `assess` says of a reading with all its points in use: |Z| at the wanted
frequencies, the film's capacitance (from the circuit and measured), the pore resistance, and every
parameter of the circuit. A fault moves one of them if the value with the fault lies outside the
95 % limits stated without it; it misleads if, besides, the value without the fault lies outside the
limits stated with it (they widen with the scatter and the correlation of the residuals).

A fault can be told from scatter only by what is left of it (as a vector in ln Z, r standard
deviations of the scatter long) when all that the panel itself may do is taken away. For a test of
the Kramers–Kronig relations that is what the measurement model follows; for a test that knows the
circuit, what its parameters do. A test that knows the fault's form finds it with the probability
Φ(r - z), where z is what it must ask for to doubt 2 of 100 clean spectra: 2.05 if it knows the
place and the sign as well (the 98th percentile of a normal distribution), more if it must look for
them. That is the most that any test can find.
"""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence
from functools import cache

import numpy as np
from checks_faults import FREQUENCY_HZ, Specimen, step_forms

from coatgui.assessment import assess
from coatgui.circuits import catalogue
from coatgui.quality.kramers_kronig import measurement_model, parts
from coatgui.records import (
    Bound,
    Campaign,
    Formulation,
    Panel,
    Quantity,
    Reading,
    ReadingAssessment,
    Severity,
    Source,
    Spectrum,
)

AREA_CM2 = 10.0
_FALSE = 0.02  # of the clean spectra
_KNOWN = 2.05
_OWN = frozenset({"rejection_overruled"})  # findings about the benchmark's own doing


def assessed(impedance: Sequence[np.ndarray]) -> list[ReadingAssessment]:
    """What is reported of spectra on the benchmarks' grid, each the only reading of a panel, with
    all points in use whatever the checks suggest or reject."""
    panels = [Panel(f"{i:06}", f"P{i}", "F", AREA_CM2) for i in range(len(impedance))]
    readings = [
        Reading(
            panel.panel_id, panel.panel_id, 24.0, Spectrum(FREQUENCY_HZ, z), Source("", ""),
            kept_in=tuple(range(z.size)), overruled_because="to see what would be reported",
        )
        for panel, z in zip(panels, impedance, strict=True)
    ]  # fmt: skip
    campaign = Campaign(
        "C", "", formulations=(Formulation("F", "F"),), panels=tuple(panels),
        readings=tuple(readings),
    )  # fmt: skip
    return list(assess(campaign).readings)


def severities(reading: ReadingAssessment) -> set[Severity]:
    return {f.severity for f in reading.findings if f.code not in _OWN}


def doubted(reading: ReadingAssessment) -> bool:
    return bool(severities(reading) - {Severity.NOTE})


def _in_trends(reading: ReadingAssessment) -> Iterator[tuple[str, Quantity | None]]:
    """What trends and rankings are made of."""
    for modulus in reading.modulus:
        yield f"|Z| at {modulus.frequency_hz:g} Hz", modulus.quantity
    yield "film capacitance", reading.coating_capacitance
    yield "capacitance at high frequency", reading.capacitance_at_high_frequency
    yield "pore resistance", reading.pore_resistance


def _all(reading: ReadingAssessment) -> Iterator[tuple[str, Quantity | None]]:
    yield from _in_trends(reading)
    for parameter in reading.parameters:
        yield parameter.symbol, parameter.quantity


def _outside(value: Quantity, limits: Quantity) -> bool:
    """Whether a stated value lies outside other stated limits, as far as both say anything."""
    if value.value is None or value.unit != limits.unit:
        return False
    above = limits.high is not None and value.value > limits.high
    below = limits.low is not None and value.value < limits.low
    return (above and value.bound is not Bound.AT_MOST) or (
        below and value.bound is not Bound.AT_LEAST
    )


def moved(clean: ReadingAssessment, faulty: ReadingAssessment, in_trends: bool = False) -> set[str]:
    """The reported quantities that a fault moves out of the limits stated without it, or only those
    that trends and rankings are made of."""
    those = _in_trends if in_trends else _all
    before = dict(those(clean))
    return {
        name
        for name, new in those(faulty)
        if new is not None and (old := before.get(name)) is not None and _outside(new, old)
    }


def misled(clean: ReadingAssessment, faulty: ReadingAssessment) -> bool:
    return bool(moved(clean, faulty) & moved(faulty, clean))


def left_by_model(fault: np.ndarray, noise: float) -> float:
    """What the measurement model leaves of a fault (N,) in ln Z, in standard deviations."""
    model = measurement_model(FREQUENCY_HZ)
    return float(np.linalg.norm(model.residuals(parts(fault)[None], model.levels[1]))) / noise


def left_by_circuit(fault: np.ndarray, noise: float, specimen: Specimen) -> float:
    """What the specimen's own circuit leaves of a fault (N,) in ln Z, in standard deviations."""
    model = catalogue()[specimen.model]
    theta = model.natural(specimen.values[None])
    steps = 1e-4 * np.eye(theta.size)
    near = np.log(model.impedance(np.vstack([theta, theta + steps]), FREQUENCY_HZ))
    u, singular, _ = np.linalg.svd(parts((near[1:] - near[0]) / 1e-4).T, full_matrices=False)
    # A parameter that does not show does not bend.
    u = u[:, singular > noise]
    off = parts(fault)
    return float(np.linalg.norm(off - u @ (u.T @ off))) / noise


@cache
def asked(fault: str) -> float:
    """What the best test of a fault must ask for, in standard deviations: with the place to look
    for where that is counted easily, else as if the place were known."""
    if fault == "drift of the resistances":
        return 2.33  # either sign
    if fault == "one wild point":
        return math.sqrt(2 * math.log(FREQUENCY_HZ.size / _FALSE))  # any direction
    if not fault.startswith("step"):
        return _KNOWN
    model = measurement_model(FREQUENCY_HZ)
    forms = parts(step_forms(0.0 if "stays" in fault else 0.3) + 0j)
    bare = model.residuals(forms, model.levels[1])
    bare /= np.linalg.norm(bare, axis=1, keepdims=True)
    noise = np.random.default_rng(5).standard_normal((5000, bare.shape[1]))
    return float(np.quantile(np.abs(noise @ bare.T).max(axis=1), 1 - _FALSE))


def most_found(lengths: Sequence[float], fault: str) -> list[float]:
    """Probabilities of finding faults of which so much is left, by the best test there can be."""
    return [0.5 * math.erfc((asked(fault) - length) / math.sqrt(2)) for length in lengths]
