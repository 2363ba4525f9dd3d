"""The checks of a reading, each a finding with a plain sentence, and the points they suggest to
leave out."""

from __future__ import annotations

from collections.abc import Iterator, Sequence

import numpy as np

from coatgui.progress import Progress
from coatgui.quality.kramers_kronig import residuals
from coatgui.quality.leads import leads_admittance
from coatgui.quality.thresholds import thresholds
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

_BURST = 5  # points of a stretch


def hertz(frequency: float) -> str:
    """A frequency as people say it: 6.3 kHz, 0.63 Hz, 10 mHz."""
    for factor, unit in ((1e6, "MHz"), (1e3, "kHz"), (1.0, "Hz")):
        if frequency >= 0.1 * factor and (factor == 1.0 or frequency >= factor):
            return f"{frequency / factor:.3g} {unit}"
    return f"{frequency * 1e3:.3g} mHz"


def check_spectra(
    spectra: Sequence[Spectrum],
    *,
    settings: Settings,
    area_cm2: Sequence[float | None],
    open_lead: Spectrum | None = None,
    progress: Progress | None = None,
) -> list[Check]:
    """The checks' answer for every spectrum, in order. Raises Cancelled."""
    progress = progress or Progress()
    limits = thresholds(settings)
    result: list[Check | None] = [None] * len(spectra)
    grids: dict[bytes, list[int]] = {}
    for i, spectrum in enumerate(spectra):
        grids.setdefault(spectrum.frequency_hz.tobytes(), []).append(i)
    done = 0
    for own in grids.values():
        for start in range(0, len(own), 50):
            share = own[start : start + 50]
            frequency = spectra[share[0]].frequency_hz
            impedance = np.stack([spectra[i].impedance_ohm for i in share])
            positive = _positive_end(impedance)
            if frequency.size >= limits["fewest_points"]:
                off, scatter = residuals(frequency, impedance, ~positive)
            else:
                off, scatter = np.zeros_like(impedance), np.zeros(len(share))
            for row, i in enumerate(share):
                reading = _Reading(spectra[i], off[row], float(scatter[row]), positive[row])
                result[i] = reading.check(settings, limits, open_lead)
            done += len(share)
            progress.at("Checking readings", done, len(spectra))
    return [check for check in result if check is not None]


def _positive_end(impedance: ComplexArray) -> BoolArray:
    """Points of the fast end, as one stretch, whose imaginary part is positive. Where most points
    are, the sign is wrong and none is marked."""
    positive = impedance.imag > 0
    stretch = np.cumprod(positive, axis=1).astype(bool)
    stretch[positive.mean(axis=1) > 0.5] = False
    return stretch


class _Reading:
    """One spectrum with the residuals (N,) of its measurement model and its usual scatter."""

    def __init__(
        self, spectrum: Spectrum, off: ComplexArray, scatter: float, positive: BoolArray
    ) -> None:
        self.spectrum, self.off, self.scatter, self.positive = spectrum, off, scatter, positive
        self.frequency: FloatArray = spectrum.frequency_hz
        self.size: FloatArray = np.abs(off) / np.sqrt(2.0)

    def check(
        self, settings: Settings, limits: dict[str, float], open_lead: Spectrum | None
    ) -> Check:
        if len(self.spectrum) < limits["fewest_points"]:
            text = f"Only {len(self.spectrum)} points were measured: too few to conclude from."
            return Check((Finding("too_few_points", Severity.REJECT, text),))
        if (self.spectrum.impedance_ohm.imag > 0).mean() > 0.5:
            text = (
                "Most points have a positive imaginary part, which no coated panel has: the sign "
                "is turned or the cell was connected wrongly."
            )
            return Check((Finding("wrong_sign", Severity.REJECT, text),))
        findings: list[Finding] = []
        suggested: dict[int, str] = {}
        findings += self._positive(suggested)
        findings += self._wild(settings, limits, suggested)
        findings += self._bursts(limits, suggested)
        findings += self._steps(limits, suggested)
        findings += self._model(limits, suggested)
        findings += self._leads(limits, open_lead)
        findings += self._range(settings, limits)
        findings += self._useless(limits, findings, suggested)
        return Check(tuple(findings), tuple(sorted(suggested.items())))

    def _positive(self, suggested: dict[int, str]) -> Iterator[Finding]:
        places = np.nonzero(self.positive)[0]
        z = self.spectrum.impedance_ohm[places]
        # Where the impedance is all but real, scatter alone turns a sign now and then.
        if places.size and float((z.imag / np.abs(z)).max()) > 3.0 * self.scatter:
            lowest = hertz(float(self.frequency[places[-1]]))
            for place in places:
                suggested[int(place)] = "positive imaginary part at the fast end"
            yield Finding(
                "positive_imaginary_part",
                Severity.DOUBT if places.size > 2 else Severity.NOTE,
                f"The imaginary part is positive from {lowest} up: leads or instrument, not the "
                "panel. Shorten the leads or leave these points out.",
                tuple(int(p) for p in places),
                (("points", float(places.size)),),
            )

    def _wild(
        self, settings: Settings, limits: dict[str, float], suggested: dict[int, str]
    ) -> Iterator[Finding]:
        least = max(limits["wild_point_sigma"] * self.scatter, limits["wild_point_percent"] / 100)
        far = (self.size > least) & ~self.positive
        alone = far.copy()
        # Neighbours that stand off as well are a stretch of scatter, or a fault of the slow end.
        alone[1:] &= self.size[:-1] < 0.5 * self.size[1:]
        alone[:-1] &= self.size[1:] < 0.5 * self.size[:-1]
        for place in np.nonzero(alone)[0]:
            at = float(self.frequency[place])
            harmonic = at / settings.mains_hz
            mains = harmonic < 7.5 and abs(harmonic - max(round(harmonic), 1)) < 0.08
            words = "mains pick-up" if mains else "wild point"
            suggested[int(place)] = words
            advice = "screen the cell" if mains else "measure it again or leave it out"
            yield Finding(
                "mains_pick_up" if mains else "wild_point",
                Severity.DOUBT,
                f"The point at {hertz(at)} stands {100 * self.size[place]:.1f} % off what its "
                f"neighbours allow ({words}): {advice}.",
                (int(place),),
                (("percent_off", 100 * float(self.size[place])),),
            )

    def _bursts(self, limits: dict[str, float], suggested: dict[int, str]) -> Iterator[Finding]:
        squares = self.size**2 * ~self.positive
        for place in suggested:
            squares[place] = 0.0
        window = np.convolve(squares, np.ones(_BURST) / _BURST, mode="same")
        least = max(
            limits["scatter_burst_factor"] * self.scatter, limits["scatter_burst_percent"] / 100
        )
        loud = np.sqrt(window) > least
        for start, stop in _stretches(loud):
            if stop - start < 3 or stop == loud.size:
                continue
            rms = 100 * float(np.sqrt(squares[start:stop].mean()))
            fast, slow = hertz(float(self.frequency[start])), hertz(float(self.frequency[stop - 1]))
            yield Finding(
                "scatter",
                Severity.DOUBT,
                f"Between {slow} and {fast} the points scatter by {rms:.1f} %, far more than "
                "elsewhere: look for a loose contact or a disturbance, and measure again.",
                tuple(range(start, stop)),
                (("percent", rms),),
            )

    def _steps(self, limits: dict[str, float], suggested: dict[int, str]) -> Iterator[Finding]:
        kept = np.array([i for i in range(self.size.size) if i not in suggested], dtype=np.intp)
        slow = kept[self.frequency[kept] <= 1.0]
        if slow.size < 4:
            return
        least = max(limits["wild_point_sigma"] * self.scatter, limits["step_percent"] / 100)
        jump = np.abs(np.diff(self.off[slow].real))
        places = np.nonzero(jump > least)[0]
        if places.size > 3:
            fast = hertz(float(self.frequency[slow[places[0]]]))
            end = hertz(float(self.frequency[slow[places[-1] + 1]]))
            yield Finding(
                "step",
                Severity.DOUBT,
                f"|Z| steps by {100 * jump[places].min():.1f} to {100 * jump[places].max():.1f} % "
                f"at {places.size} places between {fast} and {end}, which no circuit does: the "
                "panel or the instrument's range changed during the sweep.",
                tuple(int(slow[p]) for p in places),
                (("percent", 100 * float(jump[places].max())),),
            )
            return
        for place in places:
            here, there = int(slow[place]), int(slow[place + 1])
            yield Finding(
                "step",
                Severity.DOUBT,
                f"|Z| steps by {100 * jump[place]:.1f} % between "
                f"{hertz(float(self.frequency[here]))} and "
                f"{hertz(float(self.frequency[there]))}, which no circuit does: the panel or "
                "the instrument's range changed during the sweep.",
                (here, there),
                (("percent", 100 * float(jump[place])),),
            )

    def _model(self, limits: dict[str, float], suggested: dict[int, str]) -> Iterator[Finding]:
        kept = np.array([i for i in range(self.size.size) if i not in suggested], dtype=np.intp)
        rms = 100 * float(np.sqrt((self.size[kept] ** 2).mean()))
        if rms > limits["kramers_kronig_reject_percent"]:
            yield Finding(
                "kramers_kronig",
                Severity.REJECT,
                f"The reading breaks the Kramers–Kronig relations by {rms:.1f} %: it is not the "
                "answer of a steady panel and cannot be fitted. Measure again.",
                (),
                (("percent", rms),),
            )
            return
        if rms > limits["kramers_kronig_doubt_percent"] and rms > 3 * 100 * self.scatter:
            yield Finding(
                "kramers_kronig",
                Severity.DOUBT,
                f"The reading departs from the Kramers–Kronig relations by {rms:.1f} %, more than "
                "its scatter explains.",
                (),
                (("percent", rms),),
            )
        slow = kept[self.frequency[kept] <= 10 * self.frequency[-1]]
        if slow.size >= 5:
            mean = self.off[slow].mean()
            error = max(self.scatter, 1e-5) / np.sqrt(slow.size)
            far = max(abs(mean.real), abs(mean.imag))
            if far > limits["trend_sigma"] * error and far > 0.01:
                yield Finding(
                    "drift",
                    Severity.DOUBT,
                    f"The slowest decade stands {100 * far:.1f} % off, all to one side: the panel "
                    "probably drifted during the sweep.",
                    tuple(int(p) for p in slow),
                    (("percent", 100 * float(far)),),
                )

    def _leads(self, limits: dict[str, float], open_lead: Spectrum | None) -> Iterator[Finding]:
        modulus = np.abs(self.spectrum.impedance_ohm)
        if open_lead is None:
            if modulus.max() > limits["plausible_modulus_ohm"]:
                yield Finding(
                    "no_open_lead",
                    Severity.NOTE,
                    f"|Z| reaches {modulus.max():.1e} Ω and there is no open-lead run: the leads "
                    "may set this, so take it as a lower bound.",
                )
            return
        share = modulus * np.abs(leads_admittance(open_lead, self.frequency))
        near = np.nonzero(share > 1.0 / limits["leads_factor"])[0]
        if near.size:
            fastest = hertz(float(self.frequency[near[0]]))
            yield Finding(
                "measuring_limit",
                Severity.NOTE,
                f"At {near.size} frequencies, the first {fastest}, |Z| is within a factor of "
                f"{limits['leads_factor']:g} of the open lead's: there the leads count, and a "
                "resistance is a lower bound.",
                tuple(int(p) for p in near),
                (("largest_share", float(share.max())),),
            )

    def _range(self, settings: Settings, limits: dict[str, float]) -> Iterator[Finding]:
        decades = float(np.log10(self.frequency[0] / self.frequency[-1]))
        density = (self.frequency.size - 1) / max(decades, 1e-9)
        if density < limits["points_per_decade"] - 1e-6:
            yield Finding(
                "few_points",
                Severity.NOTE,
                f"There are {density:.1f} points a decade; {limits['points_per_decade']:g} or more "
                "hold a circuit better.",
            )
        wanted = [f for f in settings.modulus_frequencies_hz if f < 0.995 * self.frequency[-1]]
        if wanted:
            yield Finding(
                "range",
                Severity.NOTE,
                f"The sweep ends at {hertz(float(self.frequency[-1]))}: |Z| at "
                f"{hertz(max(wanted))} was not reached and is not guessed.",
            )

    def _useless(
        self, limits: dict[str, float], findings: list[Finding], suggested: dict[int, str]
    ) -> Iterator[Finding]:
        codes = {finding.code for finding in findings}
        share = float(self.positive.mean())
        reasons = []
        if share > limits["positive_points_reject_share"] and codes & {"wild_point", "scatter"}:
            reasons.append("a positive imaginary part over much of the fast end")
            reasons += [
                words
                for code, words in (("wild_point", "wild points"), ("scatter", "bursts of scatter"))
                if code in codes
            ]
        if len(suggested) > limits["left_out_reject_share"] * self.size.size:
            reasons.append(f"{len(suggested)} of {self.size.size} points would have to go")
        if reasons:
            yield Finding(
                "useless",
                Severity.REJECT,
                f"The reading cannot be trusted as a whole ({'; '.join(reasons)}): measure again.",
            )


def _stretches(mask: BoolArray) -> list[tuple[int, int]]:
    """Start and end of every run of True."""
    edges = np.diff(np.concatenate([[0], mask.astype(np.int8), [0]]))
    starts, stops = np.nonzero(edges == 1)[0], np.nonzero(edges == -1)[0]
    return list(zip(starts.tolist(), stops.tolist(), strict=True))
