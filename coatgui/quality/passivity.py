"""Signs and units: what no panel can do, whatever its circuit.

A panel gives out no energy: its real part is not negative, and apart from leads its imaginary part
is not positive. The phase follows from the modulus (see `kramers_kronig`), so a phase that was
written with the other sign or in the other unit gives itself away.
"""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from coatgui.quality.consistency import stretches
from coatgui.quality.kramers_kronig import MeasurementModel
from coatgui.quality.words import hertz
from coatgui.records import BoolArray, ComplexArray, Finding, FloatArray, Severity

_MOST = 0.5  # share of the points
_BETTER = 0.3  # of the departure is left if another reading of the phase is right
_FOLLOWED = 0.01  # departure of a phase that was understood
_SURE_SIGMA = 5.0
_TOGETHER = 3  # points whose real parts are averaged
_TOGETHER_SIGMA = 3.7
_AT_END = 4  # points of the fast end whose real parts are averaged
_END_SIGMA = 2.8
_LEAST_NEGATIVE = 0.005  # share of |Z|
_ROUNDS = 8
_WOUND = 0.018

_MISTAKES = {
    "wrong_sign": (
        "The phase fits the modulus only with the other sign: the imaginary part was counted the "
        "other way round, or the cell was connected wrongly. Turn the sign of its column."
    ),
    "phase_in_radians": (
        "The phase fits the modulus only when it is 57.3 times larger: radians were taken for "
        "degrees. Correct the unit of the phase column."
    ),
    "phase_in_degrees": (
        "The phase fits the modulus only when its numbers are degrees: they were taken for "
        "radians. Correct the unit of the phase column."
    ),
}


def positive_end(impedance: ComplexArray) -> BoolArray:
    """Points of the fast end (B, N), as one stretch, whose imaginary part is positive. Where most
    points are, the sign is wrong and none is marked."""
    positive = impedance.imag > 0
    stretch = np.cumprod(positive, axis=1).astype(bool)
    stretch[positive.mean(axis=1) > _MOST] = False
    return stretch


def misread_phase(model: MeasurementModel, logarithm: FloatArray) -> list[Finding | None]:
    """For each of (B, 2N) stacked logarithms a rejection where the phase only fits the modulus when
    it is read otherwise."""
    half = logarithm.shape[1] // 2

    def departure(values: FloatArray) -> FloatArray:
        off = model.residuals(values, model.levels[-1])
        return 1.4826 * np.median(np.abs(off), axis=1)

    def with_phase(phase: FloatArray) -> FloatArray:
        return np.hstack([logarithm[rows, :half], phase])

    result: list[Finding | None] = [None] * len(logarithm)
    as_read = departure(logarithm)
    mostly = (logarithm[:, half:] > 0).mean(axis=1) > _MOST
    rows = np.nonzero((as_read > _FOLLOWED) | mostly)[0]
    if not rows.size:
        return result
    phase = logarithm[rows, half:]
    others = {
        "wrong_sign": -phase,
        "phase_in_radians": np.degrees(phase),
        "phase_in_degrees": _wound(model, logarithm[rows, :half], phase),
    }
    left = {code: departure(with_phase(other)) for code, other in others.items()}
    turned = left["wrong_sign"]
    sure = {code: off < _BETTER * as_read[rows] for code, off in left.items()}
    # Turns can always be found that leave about 0.03, so less is asked of them.
    wound = left["phase_in_degrees"]
    other_readings = np.minimum(turned, left["phase_in_radians"])
    sure["phase_in_degrees"] &= (wound < _WOUND) & (wound < _BETTER * other_readings)
    likely = {"wrong_sign": mostly[rows] & (turned < as_read[rows])}
    for verdict in (likely, sure):
        for code, right in verdict.items():
            for row in rows[right].tolist():
                result[row] = Finding(code, Severity.REJECT, _MISTAKES[code])
    return result


def mostly_positive(impedance: ComplexArray) -> Finding | None:
    """The same from the plain sight of one spectrum (N,), where no model can be laid on it: most
    imaginary parts are positive although |Z| falls with frequency, as it does for capacitors."""
    modulus = np.abs(impedance[impedance != 0])
    if (impedance.imag > 0).mean() > _MOST and modulus[0] < modulus[-1]:
        return Finding("wrong_sign", Severity.REJECT, _MISTAKES["wrong_sign"])
    return None


def _wound(model: MeasurementModel, modulus: FloatArray, phase: FloatArray) -> FloatArray:
    """Phases (b, N) in rad, had their numbers been degrees: turns are added back to come closest to
    the phase that follows from the modulus."""
    half = modulus.shape[1]
    u = model.directions[:, : model.levels[0]]
    answer = np.linalg.lstsq(u[:half], modulus.T, rcond=1e-3)[0]
    expected = (u[half:] @ answer).T
    wound = phase
    for _ in range(_ROUNDS):
        wound = np.radians(phase + 2 * np.pi * np.round((np.degrees(expected) - phase) / 2 / np.pi))
        both = np.hstack([modulus, wound])
        expected = wound - model.residuals(both, model.levels[0])[:, half:]
    return np.asarray(wound, dtype=np.float64)


def positive_imaginary(
    frequency_hz: FloatArray,
    impedance: ComplexArray,
    stretch: BoolArray,
    scatter: float,
    suggested: dict[int, str],
) -> Iterator[Finding]:
    """A positive imaginary part at the fast end: an inductive tail, or an artefact."""
    places = np.nonzero(stretch)[0]
    z = impedance[places]
    # Where the impedance is all but real, scatter alone turns a sign now and then.
    if not places.size or float((z.imag / np.abs(z)).max()) < _SURE_SIGMA * scatter:
        return
    lowest = hertz(float(frequency_hz[places[-1]]))
    inductance = z.imag / (2 * np.pi * frequency_hz[places])
    tail = places.size > 2 and inductance.max() < 2 * inductance[0]
    for place in places.tolist():
        suggested[place] = "positive imaginary part at the fast end"
    what = (
        f"an inductance of about {1e6 * inductance[0]:.2g} µH, as leads have"
        if tail
        else "leads or instrument, not the panel"
    )
    yield Finding(
        "positive_imaginary_part",
        Severity.DOUBT if places.size > 2 else Severity.NOTE,
        f"The imaginary part is positive from {lowest} up: {what}. Shorten or twist the leads, or "
        "leave these points out.",
        tuple(places.tolist()),
        (
            ("points", float(places.size)),
            ("lowest_hz", float(frequency_hz[places[-1]])),
            *((("inductance_h", float(inductance[0])),) if tail else ()),
        ),
    )


def negative_real(
    frequency_hz: FloatArray,
    impedance: ComplexArray,
    scatter: float,
    suggested: dict[int, str],
) -> Iterator[Finding]:
    """A negative real part over several points or at the fast end: a phase beyond -90°, from
    cables, their screens or the instrument's input."""
    share = impedance.real / np.maximum(np.abs(impedance), 1e-300)
    neighbours = np.convolve(np.ones(share.size), np.ones(_TOGETHER), mode="same")
    mean = np.convolve(share, np.ones(_TOGETHER), mode="same") / neighbours
    together = mean < -np.maximum(_TOGETHER_SIGMA * scatter / np.sqrt(neighbours), _LEAST_NEGATIVE)
    alone = share < -max(_SURE_SIGMA * scatter, _LEAST_NEGATIVE)
    # Cables and inputs act at the fast end: few places to look at, so less is asked there.
    count = np.arange(1, min(_AT_END, share.size) + 1)
    first = np.cumsum(share)[: count.size] / count
    beyond = first < -np.maximum(_END_SIGMA * scatter / np.sqrt(count), _LEAST_NEGATIVE)
    at_end = np.arange(share.size) < (count[beyond].max() if beyond.any() else 0)
    mask = (share < 0) & (together | alone | at_end)
    for start, stop in stretches(mask):
        if stop - start == 1 and start > 0:
            continue  # one point alone is a wild point, if it is one
        slow, fast = (hertz(float(frequency_hz[p])) for p in (stop - 1, start))
        degrees = float(np.degrees(np.abs(np.angle(impedance[start:stop]))).max())
        for place in range(start, stop):
            suggested[place] = "negative real part"
        where = f"At {slow}" if stop - start == 1 else f"Between {slow} and {fast}"
        yield Finding(
            "negative_real_part",
            Severity.DOUBT,
            f"{where} the real part is negative (phase up to {degrees:.3g}° from the real axis), "
            "which no panel does: cables, their screens or the instrument's input at its limit. "
            "Leave these points out.",
            tuple(range(start, stop)),
            (("largest_phase_degrees", degrees),),
        )
