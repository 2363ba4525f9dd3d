"""How long the conclusions from a large campaign take, checks and fits given.

Run it with `python -m tests.benchmarks.assessment_of_many`; the campaign is 200 panels of 40
formulations, 50 readings each. The target is 2 seconds on one core. Prints the time, and beside it
those of a fixed piece of array work and of a fixed piece of plain Python in the same run, so that
machines, idle and busy, can be compared.
"""

from __future__ import annotations

import time

import numpy as np

from coatgui.assessment.assess import conclude
from coatgui.assessment.drawn import Drawn
from coatgui.assessment.fick import fickian_uptake
from coatgui.assessment.readings import start_reading
from coatgui.progress import Progress
from coatgui.records import (
    Bound,
    Campaign,
    Check,
    Fit,
    Formulation,
    Panel,
    Parameter,
    Quantity,
    Reading,
    Source,
    Spectrum,
)

PANELS, FORMULATIONS, TIMES = 200, 40, 50
FREQUENCY_HZ = np.geomspace(1e5, 1e-2, 71)


def _fit(values: dict[str, float], spectrum: Spectrum, modelled: np.ndarray) -> Fit:
    parameters = tuple(
        Parameter(
            symbol,
            symbol,
            layer,
            Quantity(value, value / 1.01, value * 1.01, Bound.TWO_SIDED, unit),
        )
        for layer, (symbol, value, unit) in enumerate(
            (s, v, {"R": "Ω", "Q": "S·sⁿ", "n": ""}[s[0]]) for s, v in values.items()
        )
    )
    return Fit(
        "pores_reacting_interface",
        "Pores with reacting interface",
        parameters,
        modelled,
        np.ones(len(spectrum), dtype=np.bool_),
        0.5,
        True,
        "",
        log_covariance=np.eye(len(parameters)) * 2.5e-5,
    )


def large_campaign(
    panels: int = PANELS, formulations: int = FORMULATIONS, times: int = TIMES
) -> tuple[Campaign, list[Drawn]]:
    """The campaign and its readings, checked (nothing found) and fitted (to their own circuit)."""
    random = np.random.default_rng(1)
    hours = np.geomspace(1, 5000, times)
    s = 2j * np.pi * FREQUENCY_HZ
    all_panels, readings, drawn = [], [], []
    for number in range(panels):
        group = number % formulations
        panel = Panel(f"p{number}", f"P{number}", f"f{group}", 10.0, 80.0, temperature_c=25.0)
        all_panels.append(panel)
        share = fickian_uptake(1e-9 * hours * 3600 / 80e-4**2)
        level = random.normal(9.5 - group / 20, 0.3)
        for hour, wet in zip(hours.tolist(), share.tolist(), strict=True):
            values = {
                "R_s": 50.0,
                "Q_c": 1.2e-9 * 78.3 ** (0.03 * wet) * (1 + 0.002 * random.standard_normal()),
                "n_c": 0.98,
                "R_po": 10 ** (level - 0.5 * hour / 1000) / 10,
                "Q_dl": 1e-7,
                "n_dl": 0.85,
                "R_ct": 1e8,
            }
            inner = 1 / (values["Q_dl"] * s ** values["n_dl"] + 1 / values["R_ct"])
            film = values["Q_c"] * s ** values["n_c"] + 1 / (values["R_po"] + inner)
            modelled = values["R_s"] + 1 / film
            noise = 0.005 * random.standard_normal((2, s.size))
            spectrum = Spectrum(
                FREQUENCY_HZ, modelled + np.abs(modelled) * (noise[0] + 1j * noise[1])
            )
            reading = Reading(
                f"{number}@{hour:g}", panel.panel_id, hour, spectrum, Source("x", "0")
            )
            readings.append(reading)
            one = start_reading(reading, panel, Check(), 25.0)
            one.fit = _fit(values, spectrum, modelled)
            drawn.append(one)
    campaign = Campaign(
        "c",
        "Large",
        formulations=tuple(Formulation(f"f{i}", f"F{i}") for i in range(formulations)),
        panels=tuple(all_panels),
        readings=tuple(readings),
    )
    return campaign, drawn


def main() -> None:
    campaign, drawn = large_campaign()
    start = time.process_time()
    conclude(campaign, drawn, Progress())
    taken = time.process_time() - start
    start = time.process_time()
    for _ in range(20):
        np.linalg.svd(np.random.default_rng(0).standard_normal((200, 200)))
    arrays = time.process_time() - start
    start = time.process_time()
    total = 0
    for number in range(5_000_000):
        total += number
    plain = time.process_time() - start
    print(f"{len(drawn)} readings of {PANELS} panels: {taken:.2f} s of processor time")
    print(
        f"yardsticks: 20 decompositions of 200 × 200 {arrays:.2f} s, 5,000,000 sums {plain:.2f} s"
    )


if __name__ == "__main__":
    main()
