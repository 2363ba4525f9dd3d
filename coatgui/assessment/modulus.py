"""|Z|·A at wanted frequencies.

A used point closer than 0.5 % to the wanted frequency is the measured value. Otherwise log |Z| is
interpolated on log f between the two used points on either side; beyond the used range nothing is
said. Errors of impedance are proportional, so the limits are |Z| exp(±1.96 s), where s is the
scatter of one component around the wanted frequency: the root mean square of the fit's residuals
within half a decade, but not less than over the whole reading. Where there is no fit, s comes from
the second differences of log |Z|, which a smooth curve hardly has.

The leads lie in parallel with the film: Y = Y_film + Y_leads. Both are passive, so their phases
differ by at most 90° and |Z| ≤ |Z_film| ≤ 1/(1/|Z| − 1/|Z_leads|). The second is the upper limit's
place. Where |Z_leads| < 10 |Z| the reading says only how large the film's |Z| is at least.
"""

from __future__ import annotations

import math
from bisect import bisect_left, bisect_right
from collections.abc import Sequence
from dataclasses import dataclass
from functools import lru_cache

import numpy as np

from coatgui.assessment.amounts import NORMAL_95, at_least, held_by_leads
from coatgui.assessment.rules import rule
from coatgui.quality import leads_admittance
from coatgui.records import (
    BoolArray,
    Bound,
    Fit,
    FloatArray,
    Modulus,
    ModulusStatus,
    Quantity,
    Spectrum,
)

_HALF_DECADE = math.sqrt(10.0) * (1 + 1e-12)
_FEWEST_FOR_SCATTER = 5


@dataclass(frozen=True, slots=True)
class ModulusAt:
    """|Z| of the specimen at one frequency, Ω, before limits and area; None if not reached."""

    ohm: float | None
    status: ModulusStatus


_NOT_REACHED = ModulusAt(None, ModulusStatus.NOT_REACHED)


@lru_cache(maxsize=256)
def _places(frequency: bytes, used: bytes) -> tuple[list[float], list[int]]:
    places = np.flatnonzero(np.frombuffer(used, dtype=np.bool_))[::-1]
    return np.frombuffer(frequency)[places].tolist(), places.tolist()


def used_points(spectrum: Spectrum, used: BoolArray) -> tuple[list[float], list[int]]:
    """Frequencies of the used points from the lowest up, and their places. The readings of a
    campaign share a few grids, so these are kept; do not change what is handed out."""
    return _places(spectrum.frequency_hz.tobytes(), used.tobytes())


def neighbours(frequency: Sequence[float], wanted_hz: float) -> tuple[int, int] | None:
    """Places of the points on either side of a wanted frequency, the higher first; `frequency`
    rises. None beyond its range."""
    above = bisect_left(frequency, wanted_hz)
    if above == len(frequency):
        return None
    if above == 0:
        return (0, 0) if frequency[0] == wanted_hz else None
    return above, above - 1


def modulus_at(spectrum: Spectrum, used: BoolArray, frequency_hz: float) -> ModulusAt:
    """|Z| at `frequency_hz` from the used points only, never beyond their range."""
    frequency, places = used_points(spectrum, used)
    if not frequency:
        return _NOT_REACHED
    above = bisect_left(frequency, frequency_hz)
    beside = [i for i in (above, above - 1) if 0 <= i < len(frequency)]
    nearest = min(beside, key=lambda i: abs(math.log(frequency[i] / frequency_hz)))
    impedance = spectrum.impedance_ohm
    if abs(frequency[nearest] / frequency_hz - 1) <= rule("modulus.measured_within"):
        return ModulusAt(float(abs(impedance[places[nearest]])), ModulusStatus.MEASURED)
    if not frequency[0] < frequency_hz < frequency[-1]:
        return _NOT_REACHED
    first, second = beside
    moduli_ = abs(complex(impedance[places[first]])), abs(complex(impedance[places[second]]))
    if not all(moduli_):
        return _NOT_REACHED
    share = math.log(frequency[first] / frequency_hz) / math.log(
        frequency[first] / frequency[second]
    )
    log_modulus = (1 - share) * math.log(moduli_[0]) + share * math.log(moduli_[1])
    return ModulusAt(math.exp(log_modulus), ModulusStatus.INTERPOLATED)


class Scatter:
    """Scatter of one component of Z around a frequency, as a share of |Z|: from the fit's residuals
    within half a decade, not less than over the whole reading; without a fit from the roughness.
    Worked out once for all frequencies that are asked for."""

    __slots__ = ("_frequency", "_least", "_running")

    def __init__(self, spectrum: Spectrum, used: BoolArray, fit: Fit | None) -> None:
        self._running: list[float] | None = None
        self._frequency: list[float] = []
        if fit is None:
            self._least = _roughness(spectrum, used)
            return
        self._least = fit.residual_rms_percent / 100
        impedance = spectrum.impedance_ohm[fit.used]
        miss = impedance - fit.modelled_ohm[fit.used]
        size = impedance.real**2 + impedance.imag**2
        with np.errstate(divide="ignore", invalid="ignore"):
            squares = (miss.real**2 + miss.imag**2) / size
        self._frequency, _ = used_points(spectrum, fit.used)
        self._running = [0.0, *np.cumsum(squares[::-1]).tolist()]

    def at(self, frequency_hz: float) -> float:
        if self._running is None:
            return self._least
        start = bisect_left(self._frequency, frequency_hz / _HALF_DECADE)
        stop = bisect_right(self._frequency, frequency_hz * _HALF_DECADE)
        if stop - start < _FEWEST_FOR_SCATTER:
            return self._least
        near = self._running[stop] - self._running[start]
        return max(self._least, math.sqrt(max(near, 0.0) / (stop - start) / 2))


def relative_scatter(
    spectrum: Spectrum, used: BoolArray, fit: Fit | None, frequency_hz: float
) -> float:
    """Standard deviation of one component of Z around a frequency, as a share of |Z|."""
    return Scatter(spectrum, used, fit).at(frequency_hz)


def _roughness(spectrum: Spectrum, used: BoolArray) -> float:
    """Scatter from each used point's distance to the line through its two neighbours in log–log;
    the median keeps single wild points from ruling it."""
    modulus = np.abs(spectrum.impedance_ohm[used])
    if modulus.size < _FEWEST_FOR_SCATTER or not modulus.all():
        return 0.0
    x: FloatArray = np.log(spectrum.frequency_hz[used])
    y: FloatArray = np.log(modulus)
    width = x[2:] - x[:-2]
    apart = width != 0
    weight = (x[1:-1] - x[:-2])[apart] / width[apart]
    distance = y[1:-1][apart] - (1 - weight) * y[:-2][apart] - weight * y[2:][apart]
    distance /= np.sqrt(1 + weight**2 + (1 - weight) ** 2)
    return float(np.median(np.abs(distance)) / 0.6745) if distance.size else 0.0


def moduli(
    spectra: Sequence[Spectrum],
    used: Sequence[BoolArray],
    fits: Sequence[Fit | None],
    area_cm2: Sequence[float | None],
    frequencies_hz: Sequence[float],
    open_lead: Spectrum | None = None,
    scatters: Sequence[Scatter] | None = None,
) -> list[tuple[Modulus, ...]]:
    """|Z|·A of many spectra at each wanted frequency, in the order of `spectra`; their scatter may
    be handed in.

    `used[i]` (N_i,) says which points of spectrum i count. Unit "Ω cm²", or "Ω" per specimen where
    the area is None.
    """
    leads = _leads_modulus(open_lead, frequencies_hz)
    if scatters is None:
        scatters = [Scatter(s, mask, fit) for s, mask, fit in zip(spectra, used, fits, strict=True)]
    return [
        tuple(
            _one(spectrum, mask, scatter, area, frequency, leads_ohm)
            for frequency, leads_ohm in zip(frequencies_hz, leads, strict=True)
        )
        for spectrum, mask, scatter, area in zip(spectra, used, scatters, area_cm2, strict=True)
    ]


def _leads_modulus(
    open_lead: Spectrum | None, frequencies_hz: Sequence[float]
) -> list[float | None]:
    if open_lead is None:
        return [None] * len(frequencies_hz)
    admittance = np.abs(leads_admittance(open_lead, np.asarray(frequencies_hz, dtype=np.float64)))
    return [1 / float(y) if y > 0 else None for y in admittance]


def _one(
    spectrum: Spectrum,
    used: BoolArray,
    scatter: Scatter,
    area_cm2: float | None,
    frequency_hz: float,
    leads_ohm: float | None,
) -> Modulus:
    at = modulus_at(spectrum, used, frequency_hz)
    if at.ohm is None:
        return Modulus(frequency_hz, at.status, None)
    unit = "Ω" if area_cm2 is None else "Ω cm²"
    area = 1.0 if area_cm2 is None else area_cm2
    spread = math.exp(NORMAL_95 * scatter.at(frequency_hz))
    how = (
        "measured at this frequency"
        if at.status is ModulusStatus.MEASURED
        else "interpolated in log–log between the neighbouring points"
    )
    if held_by_leads(at.ohm, leads_ohm):
        assert leads_ohm is not None
        method = (
            f"{how}; the open leads read only {leads_ohm / at.ohm:.2g} times as much, "
            "so this is the least that the film can have"
        )
        bound = at_least(at.ohm * area / spread, unit, method)
        return Modulus(frequency_hz, at.status, bound)
    film_at_most = at.ohm if leads_ohm is None else 1 / (1 / at.ohm - 1 / leads_ohm)
    quantity = Quantity(
        at.ohm * area,
        at.ohm * area / spread,
        film_at_most * area * spread,
        Bound.TWO_SIDED,
        unit,
        how + ("; upper limit with the leads' share" if leads_ohm is not None else ""),
    )
    return Modulus(frequency_hz, at.status, quantity)
