"""Whether the assessment holds the truth of campaigns that are made of known films.

Run it with `python -m tests.benchmarks.assessment_truth [panels of each kind]` (20). Spectra with
half a percent of noise, from 1 h on, go the whole way: checks, choice and fit of circuits,
conclusions. Water rises by Crank's law to 3 vol-%; the pores' resistance falls evenly from a day
on, so that |Z| at 0.1 Hz falls through the usual limit at a time that is known from the circuit.

Prints, for each thickness and D: how many panels' uptake at saturation is within 0.3 vol-%, the
worst miss, how often the 95 percent limits of D hold it, and how often the interval between two
inspections holds the crossing of the limit.
"""

from __future__ import annotations

import sys

import numpy as np

from coatgui.assessment import assess
from coatgui.assessment.fick import fickian_uptake
from coatgui.records import (
    Campaign,
    Criterion,
    Formulation,
    Panel,
    Reading,
    Settings,
    Source,
    Spectrum,
)

KINDS = ((80.0, 1e-9), (120.0, 1e-9), (50.0, 2e-10), (80.0, 1e-10))  # µm, cm²/s
HOURS = (1.0, 2.0, 4.0, 8.0, 24.0, 72.0, 168.0, 336.0, 504.0, 672.0, 840.0, 1008.0)
FREQUENCY_HZ = np.geomspace(1e5, 1e-2, 57)
AREA_CM2, UPTAKE = 10.0, 0.03
LIMIT = Criterion("limit", 0.1, 1e8, "")


def _pores_ohm(hours: float, start: float, pace: float) -> float:
    """Ω; from 24 h on the resistance falls by `pace` decades in 1,000 h."""
    return float(10.0 ** (start - pace * max(0.0, hours - 24.0) / 1000))


def _impedance(
    hours: float, thickness_um: float, diffusion: float, start: float, pace: float
) -> np.ndarray:
    s = 2j * np.pi * FREQUENCY_HZ
    share = float(fickian_uptake(diffusion * hours * 3600 / (thickness_um * 1e-4) ** 2))
    q = 1e-9 * 80 / thickness_um * 78.3033 ** (UPTAKE * share)
    inner = 1 / (2e-7 * s**0.85 + 1 / 3e7)
    return np.asarray(80.0 + 1 / (q * s**0.98 + 1 / (_pores_ohm(hours, start, pace) + inner)))


def _crossing_h(thickness_um: float, diffusion: float, start: float, pace: float) -> float:
    """When |Z|·A at the limit's frequency falls through it, from the circuit without noise."""
    place = int(np.argmin(np.abs(FREQUENCY_HZ - LIMIT.frequency_hz)))
    times = np.linspace(1.0, 1200.0, 2400)
    sizes = np.array(
        [
            AREA_CM2 * abs(_impedance(float(t), thickness_um, diffusion, start, pace)[place])
            for t in times
        ]
    )
    below = np.flatnonzero(sizes < LIMIT.ohm_cm2)
    return float(times[below[0]]) if below.size else np.inf


def main(panels: int = 20) -> None:
    random = np.random.default_rng(5)
    # The limit's frequency must be one that is measured.
    FREQUENCY_HZ[np.argmin(np.abs(FREQUENCY_HZ - 0.1))] = 0.1
    for thickness_um, diffusion in KINDS:
        made, readings, truth = [], [], {}
        for number in range(panels):
            name = f"P{number}"
            made.append(Panel(name, name, "F", AREA_CM2, thickness_um, temperature_c=25.0))
            start, pace = random.uniform(8.5, 9.5), random.uniform(1.5, 4.0)
            truth[name] = _crossing_h(thickness_um, diffusion, start, pace)
            for hours in HOURS:
                z = _impedance(hours, thickness_um, diffusion, start, pace)
                noise = 0.005 * random.standard_normal((2, z.size))
                z = z + np.abs(z) * (noise[0] + 1j * noise[1])
                source = Source(f"{name}_{hours:g}h.csv", "0")
                spectrum = Spectrum(FREQUENCY_HZ, z)
                readings.append(Reading(f"{name}@{hours:g}", name, hours, spectrum, source))
        found = assess(
            Campaign(
                "c",
                "Known films",
                Settings(criteria=(LIMIT,)),
                (Formulation("F", "F"),),
                tuple(made),
                tuple(readings),
            )
        )
        misses, inside, told, held, crossed = [], 0, 0, 0, 0
        for panel in found.panels:
            if panel.saturation_uptake is not None:
                value = panel.saturation_uptake.quantity.value
                misses.append(abs((value or 0.0) - 100 * UPTAKE))
            d = panel.diffusion_coefficient
            if d is not None and d.low is not None and d.high is not None:
                told += 1
                inside += d.low <= diffusion <= d.high
            (crossing,) = panel.limit_crossings
            low = crossing.after_h or 0.0
            high = np.inf if crossing.by_h is None else crossing.by_h
            if crossing.by_h is None:
                low = crossing.watched_h or 0.0
            held += low <= truth[panel.panel] <= high
            crossed += crossing.by_h is not None
        near = sum(miss <= 0.3 for miss in misses)
        print(
            f"{thickness_um:g} µm, {diffusion:g} cm²/s: uptake told for {len(misses)} of {panels}, "
            f"within 0.3 vol-% {near}, worst {max(misses, default=0.0):.2f}; D told for {told}, "
            f"held {inside}; crossings {crossed}, intervals that hold the truth {held} of {panels}",
            flush=True,
        )


if __name__ == "__main__":
    main(*(int(argument) for argument in sys.argv[1:2]))
