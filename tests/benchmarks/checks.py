"""How often the checks find faults of graded strength, and how often they cry wolf.

Run `python tests/benchmarks/checks.py [--each N] [--unfitted]`. Every spectrum is checked and
fitted as a campaign's readings are, with and without its fault. The table says of each fault

* "all": how often it is named, and how often anything of weight is said of the reading;
* "moving": of the faults that move a reported quantity out of its stated limits (`checks_moved`),
  how many are found, and how many at most a test could find that knows the fault's form: one of the
  Kramers–Kronig relations, one that knows the circuit;
* "in trends": the same for the quantities that trends and rankings are made of;
* "misleading": the same for those where the report itself would be wrong.

Last the time that checking takes as a share of fitting, for spectra that share their frequencies
and for spectra that each have their own.
"""

from __future__ import annotations

import argparse
import time
from collections.abc import Sequence
from dataclasses import dataclass, field

import numpy as np
from checks_faults import FAULTS, FREQUENCY_HZ, Fault, Specimen, scattered, specimens
from checks_moved import (
    AREA_CM2,
    assessed,
    doubted,
    left_by_circuit,
    left_by_model,
    misled,
    most_found,
    moved,
    severities,
)

from coatgui.circuits import catalogue
from coatgui.fitting import fit_spectra
from coatgui.quality import check_spectra, circuit_residuals
from coatgui.records import Check, Finding, Fit, ReadingAssessment, Settings, Severity, Spectrum

NOISE = (0.002, 0.02)
_NOT_FITTED = 1e-13  # scatter of a fault that is looked at by itself


def checked(impedance: Sequence[np.ndarray]) -> list[Check]:
    spectra = [Spectrum(FREQUENCY_HZ, z) for z in impedance]
    return check_spectra(spectra, settings=Settings(), area_cm2=[AREA_CM2] * len(spectra))


def named(check: Check, fault: Fault, points: set[int], more: Sequence[Finding] = ()) -> bool:
    """Whether the fault is named, and its points are suggested out where that is asked; `more` are
    findings on what the circuit leaves over."""
    found = [f for f in (*check.findings, *more) if f.code in fault.codes]
    if fault.all_points and not any(f.code == "step" for f in found):
        return bool(found) and points <= set(dict(check.suggested))
    touched = {p for f in found for p in f.points}
    return bool(found) and (not points or bool(points & touched))


def strength_words(fault: Fault, strength: float) -> str:
    if fault.unit == "%":
        return f"{100 * strength:g} %"
    return f"{strength:g} {fault.unit}" if fault.unit else ""


@dataclass
class Outcome:
    """For every specimen: whether the fault is named, whether anything of weight is said, whether
    it moves a reported quantity, one that trends are made of, whether the report would mislead, and
    what is left of the fault by the measurement model and by the circuit."""

    named: list[bool]
    doubted: list[bool]
    moving: list[bool] = field(default_factory=list)
    in_trends: list[bool] = field(default_factory=list)
    misleading: list[bool] = field(default_factory=list)
    left_by_model: list[float] = field(default_factory=list)
    left_by_circuit: list[float] = field(default_factory=list)


_Clean = dict[tuple[int, int], list[ReadingAssessment]]


def rates(
    fault: Fault, strength: float, each: int, seed: int, with_fits: bool, kept: _Clean | None = None
) -> Outcome:
    """What becomes of a fault in `each` specimens of every circuit. `kept` keeps what is reported
    without the fault, which is the same for all faults."""
    rng = np.random.default_rng(seed)
    faulty, clean, where, by_model, by_circuit = [], [], [], [], []
    for specimen in specimens(rng, each):
        noise = 10 ** rng.uniform(*np.log10(NOISE))
        again = int(rng.integers(2**32))
        z, points = fault.put(np.random.default_rng(again), specimen, noise, strength)
        faulty.append(z)
        where.append(points)
        steady = specimen.impedance()
        clean.append(scattered(np.random.default_rng(again), steady, noise))
        bare, _ = fault.put(np.random.default_rng(again), specimen, _NOT_FITTED, strength)
        off = np.log(bare / steady)
        by_model.append(left_by_model(off, noise))
        by_circuit.append(left_by_circuit(off, noise, specimen))
    checks = checked(faulty)
    if not with_fits:
        return Outcome(
            [named(c, fault, p) for c, p in zip(checks, where, strict=True)],
            [any(f.severity is not Severity.NOTE for f in c.findings) for c in checks],
        )
    kept = {} if kept is None else kept
    if (each, seed) not in kept:
        kept[each, seed] = assessed(clean)
    before = kept[each, seed]
    after = assessed(faulty)
    both = list(zip(before, after, strict=True))
    return Outcome(
        [
            named(c, fault, p, [f for f in a.findings if f.code == "fit_leaves_pattern"])
            for c, p, a in zip(checks, where, after, strict=True)
        ],
        [doubted(reading) for reading in after],
        [bool(moved(*pair)) for pair in both],
        [bool(moved(*pair, in_trends=True)) for pair in both],
        [misled(*pair) for pair in both],
        by_model,
        by_circuit,
    )


def only(values: Sequence[float], those: Sequence[bool]) -> list[float]:
    return [value for value, chosen in zip(values, those, strict=True) if chosen]


def percent(values: Sequence[float]) -> str:
    return f"{100 * sum(values) / len(values):6.1f}" if values else "     –"


def false_alarms(each: int) -> None:
    rng = np.random.default_rng(7)
    heading = (
        f"{'clean spectra, 0.2 to 2 % noise':34} {'number':>8} {'doubts %':>9} {'rejects %':>9}"
    )
    print(f"{heading} {'by the checks alone: doubts %':>30} {'rejects %':>9}")
    total: list[tuple[bool, bool, bool, bool]] = []
    by_model: dict[str, list[Specimen]] = {name: [] for name in catalogue()}
    for specimen in specimens(rng, each):
        by_model[specimen.model].append(specimen)
    for name, those in filter(lambda pair: pair[1], by_model.items()):
        z = [scattered(rng, s.impedance(), 10 ** rng.uniform(*np.log10(NOISE))) for s in those]
        rows = []
        for reading, check in zip(assessed(z), checked(z), strict=True):
            alone = {f.severity for f in check.findings}
            said = severities(reading)
            rows.append(
                (
                    Severity.DOUBT in said,
                    Severity.REJECT in said,
                    Severity.DOUBT in alone,
                    Severity.REJECT in alone,
                )
            )
        total += rows
        _false_row(name, rows)
    _false_row("all", total)
    print()


def _false_row(name: str, rows: list[tuple[bool, bool, bool, bool]]) -> None:
    doubts, rejects, alone, alone_rejects = (percent(column) for column in zip(*rows, strict=True))
    print(f"{name:34} {len(rows):8} {doubts:>9} {rejects:>9} {alone:>30} {alone_rejects:>9}")


def fitted(spectra: Sequence[Spectrum]) -> list[Fit | None]:
    number = len(spectra)
    return fit_spectra(
        spectra,
        [np.ones(len(spectrum), dtype=bool) for spectrum in spectra],
        area_cm2=[AREA_CM2] * number,
        series=[str(i) for i in range(number)],
        exposure_h=[0.0] * number,
        pinned=[""] * number,
    )


def speed(each: int) -> None:
    """Checking against fitting, as a ratio of processor times in one run."""
    rng = np.random.default_rng(3)
    those = list(specimens(rng, each))
    shared = [Spectrum(FREQUENCY_HZ, scattered(rng, s.impedance(), 0.005)) for s in those]
    own = []
    for specimen in those:
        top, end = 5 + rng.uniform(-0.3, 0.3), -2 + rng.uniform(-0.3, 0.3)
        grid = np.logspace(top, end, FREQUENCY_HZ.size)
        own.append(Spectrum(grid, scattered(rng, specimen.impedance(grid), 0.005)))
    fitted(shared[:8])
    for words, spectra in (("that share their frequencies", shared), ("each on its own", own)):
        start = time.process_time()
        check_spectra(spectra, settings=Settings(), area_cm2=[AREA_CM2] * len(spectra))
        checks = time.process_time() - start
        start = time.process_time()
        fits = fitted(spectra)
        fitting = time.process_time() - start
        start = time.process_time()
        circuit_residuals(spectra, [f for f in fits if f is not None], settings=Settings())
        residuals = time.process_time() - start
        number = len(spectra) / 1e3
        print(
            f"{len(spectra)} spectra {words}: checking {(checks + residuals) / number:.2f} ms a "
            f"spectrum ({residuals / number:.2f} of it what circuits leave over), fitting "
            f"{fitting / number:.1f} ms: ratio {(checks + residuals) / fitting:.3f}"
        )


def main() -> None:
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--each", type=int, default=100, help="specimens of every model")
    parser.add_argument("--unfitted", action="store_true", help="the checks alone, no fits")
    options = parser.parse_args()
    false_alarms(5 * options.each)
    heading = f"{'':26} {'all':>37}"
    names = f"{'fault':26} {'strength':>22} {'named %':>8} {'doubt %':>8}"
    if not options.unfitted:
        heading += f" {'moving':>42} {'in trends':>15} {'misleading':>15}"
        names += f" {'number':>7} {'found %':>8} {'most: KK %':>12} {'circuit %':>12}"
        names += f" {'number':>7} {'found %':>7} {'number':>7} {'found %':>7}"
    print(heading)
    print(names)
    kept: _Clean = {}
    for fault in FAULTS:
        for strength in fault.strengths:
            o = rates(fault, strength, options.each, 11, not options.unfitted, kept)
            line = f"{fault.name:26} {strength_words(fault, strength):>22}"
            line += f" {percent(o.named):>8} {percent(o.doubted):>8}"
            if not options.unfitted:
                line += f" {sum(o.moving):7} {percent(only(o.doubted, o.moving)):>8}"
                for lengths, width in ((o.left_by_model, 12), (o.left_by_circuit, 12)):
                    most = most_found(lengths, fault.name)
                    line += f" {percent(only(most, o.moving)):>{width}}"
                for those in (o.in_trends, o.misleading):
                    line += f" {sum(those):7} {percent(only(o.doubted, those)):>7}"
            print(line, flush=True)
    print()
    speed(options.each)


if __name__ == "__main__":
    main()
