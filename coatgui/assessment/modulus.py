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
from functools import lru_cache

import numpy as np

from coatgui.assessment.amounts import NORMAL_95, at_least, held_by_leads
from coatgui.assessment.rules import rule
from coatgui.quality import leads_admittance
from coatgui.records import (
    BoolArray,
    Bound,
    ComplexArray,
    Fit,
    FloatArray,
    Modulus,
    ModulusStatus,
    Quantity,
    Spectrum,
)

_HALF_DECADE = math.sqrt(10.0) * (1 + 1e-12)
_FEWEST_FOR_SCATTER = 5


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


class Grid:
    """Readings that share their frequencies and the points used, as arrays: `places` in the list
    they come from, `frequency` of the used points from the lowest up, `impedance` there (m, n).
    """

    __slots__ = ("_least", "_running", "_scatter_hz", "frequency", "impedance", "places")

    def __init__(
        self,
        places: Sequence[int],
        spectra: Sequence[Spectrum],
        used: BoolArray,
        fits: Sequence[Fit | None],
    ) -> None:
        self.places = list(places)
        whole = np.array([s.impedance_ohm for s in spectra])
        self.frequency, points = used_points(spectra[0], used)
        self.impedance: ComplexArray = whole[:, points]
        self._running: FloatArray | None = None
        self._scatter_hz: list[float] = []
        fitted = [fit for fit in fits if fit is not None]
        if not fitted:
            self._least = np.array([_roughness(self.frequency, z) for z in self.impedance])
            return
        self._least = np.array([fit.residual_rms_percent for fit in fitted]) / 100
        self._scatter_hz, points = used_points(spectra[0], fitted[0].used)
        measured = whole[:, points]
        miss = measured - np.array([fit.modelled_ohm for fit in fitted])[:, points]
        size = measured.real**2 + measured.imag**2
        with np.errstate(divide="ignore", invalid="ignore"):
            squares = (miss.real**2 + miss.imag**2) / size
        self._running = np.cumsum(squares, axis=1)

    def scatter(self, frequency_hz: float) -> FloatArray:
        """Scatter of one component of Z around a frequency, as a share of |Z|, (m,): from the fit's
        residuals within half a decade, not less than over the whole reading; without a fit from the
        roughness."""
        if self._running is None:
            return self._least
        start = bisect_left(self._scatter_hz, frequency_hz / _HALF_DECADE)
        stop = bisect_right(self._scatter_hz, frequency_hz * _HALF_DECADE)
        if stop - start < _FEWEST_FOR_SCATTER:
            return self._least
        near = self._running[:, stop - 1] - (self._running[:, start - 1] if start else 0.0)
        near = np.sqrt(np.maximum(near, 0.0) / (stop - start) / 2)
        return np.asarray(np.fmax(self._least, near), dtype=np.float64)

    def modulus(self, frequency_hz: float) -> tuple[ModulusStatus, FloatArray]:
        """|Z| in Ω, (m,), at a frequency from the used points only, never beyond their range; empty
        where it is not reached, NaN where |Z| beside it is zero."""
        frequency = self.frequency
        if not frequency:
            return ModulusStatus.NOT_REACHED, np.empty(0)
        above = bisect_left(frequency, frequency_hz)
        beside = [i for i in (above, above - 1) if 0 <= i < len(frequency)]
        nearest = min(beside, key=lambda i: abs(math.log(frequency[i] / frequency_hz)))
        if abs(frequency[nearest] / frequency_hz - 1) <= rule("modulus.measured_within"):
            return ModulusStatus.MEASURED, np.abs(self.impedance[:, nearest])
        if not frequency[0] < frequency_hz < frequency[-1]:
            return ModulusStatus.NOT_REACHED, np.empty(0)
        first, second = beside
        share = math.log(frequency[first] / frequency_hz) / math.log(
            frequency[first] / frequency[second]
        )
        with np.errstate(divide="ignore"):
            logarithms = np.log(np.abs(self.impedance[:, beside]))
        logarithms[~np.isfinite(logarithms).all(axis=1)] = np.nan
        log_modulus = (1 - share) * logarithms[:, 0] + share * logarithms[:, 1]
        return ModulusStatus.INTERPOLATED, np.exp(log_modulus)


def grids(
    spectra: Sequence[Spectrum], used: Sequence[BoolArray], fits: Sequence[Fit | None]
) -> list[Grid]:
    """Readings put together by the grid they share; `used[i]` (N_i,) says which points of spectrum
    i count."""
    alike: dict[tuple[bytes, bytes, bytes | None], list[int]] = {}
    for place, (spectrum, mask, fit) in enumerate(zip(spectra, used, fits, strict=True)):
        fitted = None if fit is None else fit.used.tobytes()
        key = spectrum.frequency_hz.tobytes(), mask.tobytes(), fitted
        alike.setdefault(key, []).append(place)
    return [
        Grid(places, [spectra[i] for i in places], used[places[0]], [fits[i] for i in places])
        for places in alike.values()
    ]


def relative_scatter(
    spectrum: Spectrum, used: BoolArray, fit: Fit | None, frequency_hz: float
) -> float:
    """Standard deviation of one component of Z around a frequency, as a share of |Z|."""
    return float(Grid([0], [spectrum], used, [fit]).scatter(frequency_hz)[0])


def _roughness(frequency: Sequence[float], impedance: ComplexArray) -> float:
    """Scatter from each used point's distance to the line through its two neighbours in log–log;
    the median keeps single wild points from ruling it."""
    modulus = np.abs(impedance)
    if modulus.size < _FEWEST_FOR_SCATTER or not modulus.all():
        return 0.0
    x: FloatArray = np.log(np.asarray(frequency))
    y: FloatArray = np.log(modulus)
    width = x[2:] - x[:-2]
    apart = width != 0
    weight = (x[1:-1] - x[:-2])[apart] / width[apart]
    distance = y[1:-1][apart] - (1 - weight) * y[:-2][apart] - weight * y[2:][apart]
    distance /= np.sqrt(1 + weight**2 + (1 - weight) ** 2)
    return float(np.median(np.abs(distance)) / 0.6745) if distance.size else 0.0


def moduli(
    on: Sequence[Grid],
    area_cm2: Sequence[float | None],
    frequencies_hz: Sequence[float],
    open_lead: Spectrum | None = None,
) -> list[tuple[Modulus, ...]]:
    """|Z|·A of readings on their grids at each wanted frequency, in the order of `area_cm2`. Unit
    "Ω cm²", or "Ω" per specimen where the area is None."""
    leads = _leads_modulus(open_lead, frequencies_hz)
    found: list[list[Modulus]] = [[] for _ in area_cm2]
    for grid in on:
        for frequency_hz, leads_ohm in zip(frequencies_hz, leads, strict=True):
            status, ohm = grid.modulus(frequency_hz)
            if not ohm.size:
                missing = Modulus(frequency_hz, status, None)
                for place in grid.places:
                    found[place].append(missing)
                continue
            spread = np.exp(NORMAL_95 * grid.scatter(frequency_hz))
            for place, z, wide in zip(grid.places, ohm.tolist(), spread.tolist(), strict=True):
                found[place].append(_one(frequency_hz, status, z, wide, area_cm2[place], leads_ohm))
    return [tuple(own) for own in found]


def _leads_modulus(
    open_lead: Spectrum | None, frequencies_hz: Sequence[float]
) -> list[float | None]:
    if open_lead is None:
        return [None] * len(frequencies_hz)
    admittance = np.abs(leads_admittance(open_lead, np.asarray(frequencies_hz, dtype=np.float64)))
    return [1 / float(y) if y > 0 else None for y in admittance]


_HOW = {
    ModulusStatus.MEASURED: "measured at this frequency",
    ModulusStatus.INTERPOLATED: "interpolated in log–log between the neighbouring points",
}


def _one(
    frequency_hz: float,
    status: ModulusStatus,
    ohm: float,
    spread: float,
    area_cm2: float | None,
    leads_ohm: float | None,
) -> Modulus:
    if math.isnan(ohm):
        return Modulus(frequency_hz, ModulusStatus.NOT_REACHED, None)
    unit = "Ω" if area_cm2 is None else "Ω cm²"
    area = 1.0 if area_cm2 is None else area_cm2
    how = _HOW[status]
    if held_by_leads(ohm, leads_ohm):
        assert leads_ohm is not None
        method = (
            f"{how}; the open leads read only {leads_ohm / ohm:.2g} times as much, "
            "so this is the least that the film can have"
        )
        return Modulus(frequency_hz, status, at_least(ohm * area / spread, unit, method))
    high = ohm if leads_ohm is None else 1 / (1 / ohm - 1 / leads_ohm)
    if leads_ohm is not None:
        how += "; upper limit with the leads' share"
    quantity = Quantity(
        ohm * area, ohm * area / spread, high * area * spread, Bound.TWO_SIDED, unit, how
    )
    return Modulus(frequency_hz, status, quantity)
