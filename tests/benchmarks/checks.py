"""How often the checks find faults of graded strength, and how often they cry wolf.

Run `python tests/benchmarks/checks.py [--each N] [--moved]`. With --moved every spectrum is fitted
with and without its fault, and the columns "moving" count only faults that move a fitted parameter
out of the 95 % limits of the fit without the fault. "Misleading" are those of them where the value
without the fault lies outside the limits stated with it as well: there the report itself would be
wrong, for limits widen with the scatter and the correlation of the residuals.

The last column is the share of the moving faults that no test of the Kramers–Kronig relations can
tell (a phase past -90° shows in the sign of the real part all the same): where what the measurement
model leaves of the fault, in standard deviations of the scatter, is below 3.7. To find such a fault
in 95 of 100 spectra and to doubt 2 of 100 clean ones, a test that knew its form and place would
need 3.7 (the 98th and the 95th percentile of a normal distribution), and it is not known.
"""

from __future__ import annotations

import argparse
import time
from dataclasses import dataclass

import numpy as np
from checks_faults import FAULTS, FREQUENCY_HZ, Fault, Specimen, scattered, specimens

from coatgui.circuits import catalogue
from coatgui.fitting import fit_spectra
from coatgui.quality import check_spectra
from coatgui.quality.kramers_kronig import measurement_model, parts
from coatgui.records import Bound, Check, Fit, Settings, Severity, Spectrum

NOISE = (0.002, 0.02)
_SEEN = 3.7  # standard deviations that even a test which knows the fault needs


def checked(impedance: list[np.ndarray]) -> list[Check]:
    spectra = [Spectrum(FREQUENCY_HZ, z) for z in impedance]
    return check_spectra(spectra, settings=Settings(), area_cm2=[10.0] * len(spectra))


def named(check: Check, fault: Fault, points: set[int]) -> bool:
    """Whether the fault is named, and its points are suggested out where that is asked."""
    found = [f for f in check.findings if f.code in fault.codes]
    if fault.all_points and not any(f.code == "step" for f in found):
        return bool(found) and points <= set(dict(check.suggested))
    touched = {p for f in found for p in f.points}
    return bool(found) and (not points or bool(points & touched))


def fitted(impedance: list[np.ndarray], models: list[str]) -> list[Fit | None]:
    number = len(impedance)
    return fit_spectra(
        [Spectrum(FREQUENCY_HZ, z) for z in impedance],
        [np.ones(FREQUENCY_HZ.size, dtype=bool)] * number,
        area_cm2=[10.0] * number,
        series=[str(i) for i in range(number)],
        exposure_h=[0.0] * number,
        pinned=models,
    )


def moved(before: Fit | None, after: Fit | None) -> bool:
    """Whether a parameter that the data held has left its limits."""
    if before is None or after is None:
        return False
    for parameter in before.parameters:
        q, new = parameter.quantity, after.parameter(parameter.symbol)
        if q.bound is Bound.TWO_SIDED and new is not None and new.value is not None:
            assert q.low is not None
            assert q.high is not None
            if not q.low <= new.value <= q.high:
                return True
    return False


def beyond_scatter(faulty: np.ndarray, clean: np.ndarray, noise: float, level: int) -> float:
    """What the measurement model leaves of a fault, in standard deviations of the scatter."""
    model = measurement_model(FREQUENCY_HZ)
    off = parts(np.log(faulty / clean))[None]
    return float(np.linalg.norm(model.residuals(off, level))) / noise


def strength_words(fault: Fault, strength: float) -> str:
    if fault.unit == "%":
        return f"{100 * strength:g} %"
    return f"{strength:g} {fault.unit}" if fault.unit else ""


@dataclass(frozen=True)
class Outcome:
    """For every specimen: whether the fault is named, whether anything of weight is said, whether
    the fault moves a fitted parameter, whether the report would mislead, whether no test of the
    Kramers–Kronig relations can tell the fault from scatter."""

    named: list[bool]
    doubted: list[bool]
    moving: list[bool]
    misleading: list[bool]
    hidden: list[bool]


def rates(fault: Fault, strength: float, each: int, seed: int, with_fits: bool) -> Outcome:
    rng = np.random.default_rng(seed)
    faulty, clean, where, models, hidden = [], [], [], [], []
    level = measurement_model(FREQUENCY_HZ).levels[1]
    for specimen in specimens(rng, each):
        noise = 10 ** rng.uniform(*np.log10(NOISE))
        again = int(rng.integers(2**32))
        z, points = fault.put(np.random.default_rng(again), specimen, noise, strength)
        faulty.append(z)
        where.append(points)
        models.append(specimen.model)
        steady = specimen.impedance()
        clean.append(scattered(np.random.default_rng(again), steady, noise))
        bare, _ = fault.put(np.random.default_rng(again), specimen, 1e-13, strength)
        hidden.append(beyond_scatter(bare, steady, noise, level) < _SEEN)
    answers = checked(faulty)
    hits = [named(c, fault, p) for c, p in zip(answers, where, strict=True)]
    weighty = [any(f.severity is not Severity.NOTE for f in c.findings) for c in answers]
    moving = misleading = [False] * len(hits)
    if with_fits:
        pairs = list(zip(fitted(clean, models), fitted(faulty, models), strict=True))
        moving = [moved(before, after) for before, after in pairs]
        misleading = [moved(before, after) and moved(after, before) for before, after in pairs]
    return Outcome(hits, weighty, moving, misleading, hidden)


def only(values: list[bool], those: list[bool]) -> list[bool]:
    return [value for value, chosen in zip(values, those, strict=True) if chosen]


def percent(values: list[bool]) -> str:
    return f"{100 * sum(values) / len(values):6.1f}" if values else "     –"


def false_alarms(each: int) -> None:
    rng = np.random.default_rng(7)
    print(f"{'clean spectra, 0.2 to 2 % noise':34} {'number':>8} {'doubts %':>9} {'rejects %':>9}")
    total = []
    by_model: dict[str, list[Specimen]] = {name: [] for name in catalogue()}
    for specimen in specimens(rng, each):
        by_model[specimen.model].append(specimen)
    for name, those in filter(lambda pair: pair[1], by_model.items()):
        answers = checked(
            [scattered(rng, s.impedance(), 10 ** rng.uniform(*np.log10(NOISE))) for s in those]
        )
        severities = [{f.severity for f in c.findings} for c in answers]
        total += severities
        doubts = [Severity.DOUBT in s for s in severities]
        rejects = [Severity.REJECT in s for s in severities]
        print(f"{name:34} {len(those):8} {percent(doubts):>9} {percent(rejects):>9}")
    doubts = [Severity.DOUBT in s for s in total]
    rejects = [Severity.REJECT in s for s in total]
    print(f"{'all':34} {len(total):8} {percent(doubts):>9} {percent(rejects):>9}\n")


def speed() -> None:
    """Checking against fitting, as a ratio."""
    rng = np.random.default_rng(3)
    impedance = [scattered(rng, s.impedance(), 0.005) for s in specimens(rng, 25)]
    checked(impedance[:8])
    start = time.perf_counter()
    checked(impedance)
    checking = time.perf_counter() - start
    start = time.perf_counter()
    fitted(impedance, [""] * len(impedance))
    fitting = time.perf_counter() - start
    number = len(impedance)
    print(
        f"checking {1e3 * checking / number:.2f} ms a spectrum, fitting "
        f"{1e3 * fitting / number:.1f} ms: ratio {checking / fitting:.3f}"
    )


def main() -> None:
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--each", type=int, default=100, help="specimens of every model")
    parser.add_argument("--moved", action="store_true", help="fit with and without the fault")
    options = parser.parse_args()
    false_alarms(5 * options.each)
    heading = f"{'fault':26} {'strength':>22} {'named %':>8} {'any doubt %':>12}"
    if options.moved:
        heading += (
            f" {'moving':>7} {'found %':>8} {'misleading':>11} {'found %':>8} {'hidden %':>9}"
        )
    print(heading)
    for fault in FAULTS:
        for strength in fault.strengths:
            outcome = rates(fault, strength, options.each, 11, options.moved)
            line = f"{fault.name:26} {strength_words(fault, strength):>22}"
            line += f" {percent(outcome.named):>8} {percent(outcome.doubted):>12}"
            if options.moved:
                moving = only(outcome.doubted, outcome.moving)
                misleading = only(outcome.doubted, outcome.misleading)
                line += f" {len(moving):7} {percent(moving):>8}"
                line += f" {len(misleading):11} {percent(misleading):>8}"
                line += f" {percent(only(outcome.hidden, outcome.moving)):>9}"
            print(line, flush=True)
    print()
    speed()


if __name__ == "__main__":
    main()
