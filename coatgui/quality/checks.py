"""The checks of a reading, each a finding with a plain sentence, and the points they suggest to
leave out. Spectra on one grid are worked on together."""

from __future__ import annotations

from collections.abc import Iterator, Sequence

import numpy as np

from coatgui.progress import Progress
from coatgui.quality.consistency import Consistency
from coatgui.quality.faults import Searched, search
from coatgui.quality.kramers_kronig import grid_key, measurement_model, parts
from coatgui.quality.leads import Limit
from coatgui.quality.passivity import (
    misread_phase,
    mostly_positive,
    negative_real,
    positive_end,
    positive_imaginary,
)
from coatgui.quality.patterns import Levels
from coatgui.quality.sweep import coverage, repeats
from coatgui.quality.thresholds import thresholds
from coatgui.quality.words import hertz, listed
from coatgui.records import (
    BoolArray,
    Check,
    ComplexArray,
    Finding,
    FloatArray,
    Settings,
    Severity,
    Spectrum,
)

_TOGETHER = 200  # spectra between two reports of progress
_SUPPOSED = 0.01  # scatter where it cannot be told

_NOT_TESTED = Finding(
    "kramers_kronig_not_tested",
    Severity.NOTE,
    "The points are too far apart to test the Kramers–Kronig relations or to find wild points, "
    "steps and drift. Measure five or more points a decade.",
)


def check_spectra(
    spectra: Sequence[Spectrum],
    *,
    settings: Settings,
    area_cm2: Sequence[float | None],
    open_lead: Spectrum | None = None,
    input_resistance_ohm: float | None = None,
    input_capacitance_f: float | None = None,
    progress: Progress | None = None,
) -> list[Check]:
    """The checks' answer for every spectrum, in order.

    `input_resistance_ohm` and `input_capacitance_f` are what the instrument's maker states; they
    give the measuring limit where there is no open-lead run. Raises Cancelled.
    """
    progress = progress or Progress()
    limits = thresholds(settings)
    limit = Limit(open_lead, input_resistance_ohm, input_capacitance_f)
    result: list[Check | None] = [None] * len(spectra)
    grids: dict[bytes, list[int]] = {}
    for i, spectrum in enumerate(spectra):
        whole = _too_little(spectrum, limits)
        if whole is None:
            grids.setdefault(grid_key(spectrum.frequency_hz), []).append(i)
        else:
            result[i] = whole
    done = sum(check is not None for check in result)
    for own in grids.values():
        for start in range(0, len(own), _TOGETHER):
            share = own[start : start + _TOGETHER]
            batch = _Batch(
                spectra[share[0]].frequency_hz,
                np.stack([spectra[i].impedance_ohm for i in share]),
                limits,
            )
            for row, i in enumerate(share):
                result[i] = _check(batch, row, spectra[i], settings, limits, limit)
            done += len(share)
            progress.at("Checking readings", done, len(spectra))
    return [check for check in result if check is not None]


def kramers_kronig_residuals(spectrum: Spectrum, settings: Settings) -> ComplexArray:
    """Relative departures (N,) of a spectrum from its measurement model, as the checks see them, to
    be shown against frequency: real part of |Z|, imaginary part of the phase (rad). NaN where
    nothing was measured, and everywhere if there are too few points to test them."""
    limits = thresholds(settings)
    if _too_little(spectrum, limits) is not None:
        return np.full(len(spectrum), np.nan + 0j)
    batch = _Batch(spectrum.frequency_hz, spectrum.impedance_ohm[None], limits)
    hidden = batch.dead[0] if batch.testable else True
    return np.where(hidden, np.nan, batch.searched[0].residuals)


def _too_little(spectrum: Spectrum, limits: dict[str, float]) -> Check | None:
    points = int(np.count_nonzero(spectrum.impedance_ohm))
    one_frequency = spectrum.frequency_hz[0] <= spectrum.frequency_hz[-1]
    if points >= limits["fewest_points"] and not one_frequency:
        return None
    text = f"Only {points} points were measured: too few to conclude from."
    if one_frequency:
        text = "All points were measured at one frequency: that is no spectrum."
    return Check((Finding("too_few_points", Severity.REJECT, text),))


class _Batch:
    """What array work finds out about spectra (B, N) on one grid."""

    def __init__(
        self, frequency_hz: FloatArray, impedance: ComplexArray, limits: dict[str, float]
    ) -> None:
        self.dead: BoolArray = impedance == 0
        model = measurement_model(frequency_hz)
        filled = np.where(self.dead, np.abs(impedance).max(axis=1, keepdims=True), impedance)
        logarithm = parts(np.log(filled))
        self.testable = model.testable
        self.positive = positive_end(impedance)
        self.blocked: BoolArray = self.positive | self.dead
        self.misread: list[Finding | None]
        self.searched: list[Searched]
        if model.testable:
            self.misread = misread_phase(model, logarithm)
            self.searched = search(model, logarithm, self.blocked, Levels.of(limits))
        else:
            nothing = np.zeros(frequency_hz.size, dtype=np.complex128)
            self.misread = [mostly_positive(z) for z in impedance]
            self.searched = [Searched((), nothing, nothing, _SUPPOSED) for _ in impedance]


def _check(
    batch: _Batch,
    row: int,
    spectrum: Spectrum,
    settings: Settings,
    limits: dict[str, float],
    limit: Limit,
) -> Check:
    misread = batch.misread[row]
    if misread is not None:
        return Check((misread,))
    frequency, impedance = spectrum.frequency_hz, spectrum.impedance_ohm
    searched, blocked = batch.searched[row], batch.blocked[row]
    suggested: dict[int, str] = {}
    findings = list(_dead(frequency, batch.dead[row], suggested))
    findings += positive_imaginary(
        frequency, impedance, batch.positive[row], searched.scatter, suggested
    )
    named = [
        *repeats(frequency, impedance, limits),
        *negative_real(frequency, impedance, searched.scatter, suggested),
    ]
    consistency = Consistency(
        frequency,
        searched,
        limits,
        settings.mains_hz,
        blocked,
        {p for f in named for p in f.points},
    )
    findings += named
    if batch.testable:
        findings += consistency.findings(suggested)
    else:
        findings.append(_NOT_TESTED)
    findings += limit.findings(spectrum, limits)
    used = ~blocked
    used[list(suggested)] = False
    findings += coverage(frequency, impedance, used, settings.modulus_frequencies_hz, limits)
    findings += _useless(frequency.size, limits, findings, suggested, batch.positive[row])
    return Check(tuple(findings), tuple(sorted(suggested.items())))


def _dead(frequency: FloatArray, dead: BoolArray, suggested: dict[int, str]) -> Iterator[Finding]:
    places = np.nonzero(dead)[0].tolist()
    if places:
        for place in places:
            suggested[place] = "nothing measured"
        where = listed([hertz(float(frequency[place])) for place in places[:5]])
        yield Finding(
            "zero_impedance",
            Severity.DOUBT,
            f"The impedance is written as zero at {where}{' and elsewhere' * (len(places) > 5)}: "
            "nothing was measured there, or the instrument was overloaded. Leave these points out.",
            tuple(places),
        )


def _useless(
    number: int,
    limits: dict[str, float],
    findings: list[Finding],
    suggested: dict[int, str],
    positive: BoolArray,
) -> Iterator[Finding]:
    """A rejection of the whole, with its reasons: faults together, or too little that stays."""
    by_code: dict[str, list[dict[str, float]]] = {}
    for finding in findings:
        by_code.setdefault(finding.code, []).append(dict(finding.evidence))
    reasons = []
    faulty = by_code.keys() & {"wild_point", "scatter"}
    if float(positive.mean()) > limits["positive_points_reject_share"] and faulty:
        ends = [evidence["lowest_hz"] for evidence in by_code.get("positive_imaginary_part", [])]
        reasons += [f"a positive imaginary part from {hertz(end)} up" for end in ends]
        wild = [hertz(evidence["frequency_hz"]) for evidence in by_code.get("wild_point", [])]
        if wild:
            reasons.append(
                f"wild points at {listed(wild)}" if wild[1:] else f"a wild point at {wild[0]}"
            )
        reasons += [
            f"scatter between {hertz(evidence['low_hz'])} and {hertz(evidence['high_hz'])}"
            for evidence in by_code.get("scatter", [])
        ]
    if len(suggested) > limits["left_out_reject_share"] * number:
        reasons.append(f"{len(suggested)} of {number} points would have to go")
    if reasons:
        yield Finding(
            "useless",
            Severity.REJECT,
            f"The reading cannot be trusted as a whole ({'; '.join(reasons)}): measure again.",
        )
