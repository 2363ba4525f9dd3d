"""Readings held against the course of their own panel and of the others: wrong panel, wrong unit.

A reading is odd if it stands off what the readings before and after it leave to expect, and these
two agree with each other. The expectation is ln Z interpolated on the logarithm of exposure time,
on a few frequencies that all readings share. A reading at either end of a series, or one of a
panel that fails and stays failed, is not odd by this measure. Only odd readings are tried in other
units and against other panels.
"""

from __future__ import annotations

import math
from collections.abc import Iterator, Mapping, Sequence

import numpy as np

from coatgui.assessment.rules import rule
from coatgui.assessment.words import hours
from coatgui.records import Campaign, ComplexArray, Finding, Panel, Reading, Severity

_FREQUENCIES = 12
_DECADES = 2.0  # that all readings must share
_UNITS = {1e3: "kΩ", 1e6: "MΩ"}


class Courses:
    """ln Z (per area where there is one) of the readings of each panel, in order of time."""

    def __init__(self, campaign: Campaign, counting: set[str], limits: Mapping[str, float]) -> None:
        self.limits = limits
        self.panels = {panel.panel_id: panel for panel in campaign.panels}
        self.readings = [r for r in campaign.readings if r.reading_id in counting]
        self.series: dict[str, list[Reading]] = {}
        for reading in sorted(self.readings, key=lambda r: r.exposure_h):
            self.series.setdefault(reading.panel_id, []).append(reading)
        self.logarithms = self._logarithms()

    def _logarithms(self) -> dict[str, ComplexArray]:
        if not self.readings:
            return {}
        fast = min(float(r.spectrum.frequency_hz[0]) for r in self.readings)
        slow = max(float(r.spectrum.frequency_hz[-1]) for r in self.readings)
        if fast < slow * 10**_DECADES:
            return {}
        wanted = np.linspace(math.log(slow), math.log(fast), _FREQUENCIES)
        result = {}
        for reading in self.readings:
            left_out = [p for p, _ in reading.left_out]
            use = reading.spectrum.impedance_ohm != 0
            use[[p for p in left_out if 0 <= p < use.size]] = False
            if use.sum() < 2:
                continue
            x = np.log(reading.spectrum.frequency_hz[use])[::-1]
            z = reading.spectrum.impedance_ohm[use][::-1]
            modulus = np.interp(wanted, x, np.log(np.abs(z)))
            phase = np.interp(wanted, x, np.angle(z))
            area = self.panels[reading.panel_id].area_cm2 or 1.0
            result[reading.reading_id] = modulus + math.log(area) + 1j * phase
        return result

    def expected(
        self, panel_id: str, exposure_h: float, without: str = ""
    ) -> tuple[ComplexArray, float] | None:
        """What a panel's other readings leave to expect at a time between two of them, and how far
        these two are apart. None at the ends of a series. Readings of the same inspection are left
        aside."""
        same = 1 + rule("inspection.same_within")
        before = after = None
        for reading in self.series.get(panel_id, ()):
            if reading.reading_id == without or reading.reading_id not in self.logarithms:
                continue
            if reading.exposure_h * same < exposure_h:
                before = reading
            elif reading.exposure_h > exposure_h * same:
                after = reading
                break
        if before is None or after is None:
            return None
        first, last = (self.logarithms[r.reading_id] for r in (before, after))
        start, now, end = (
            math.log(max(t, 1e-3)) for t in (before.exposure_h, exposure_h, after.exposure_h)
        )
        share = (now - start) / (end - start)
        return (1 - share) * first + share * last, _apart(first, last)

    def findings(self) -> Iterator[tuple[str, Finding]]:
        """Reading ids with what is odd about them."""
        for reading in self.readings:
            here = self.logarithms.get(reading.reading_id)
            own = self.expected(reading.panel_id, reading.exposure_h, reading.reading_id)
            if here is None or own is None:
                continue
            expectation, gap = own
            odd = _apart(here, expectation)
            if odd < max(self.limits["odd_share"], 2 * gap):
                continue
            allowed = self.limits["fits_better_share"] * odd
            # A course between two readings is known no better than these are apart.
            known = min(allowed, max(self.limits["odd_share"], gap))
            finding = self._unit(reading, here - expectation, known) or self._panel(
                reading, here, odd, allowed
            )
            if finding is not None:
                yield reading.reading_id, finding

    def _unit(self, reading: Reading, off: ComplexArray, allowed: float) -> Finding | None:
        area = self.panels[reading.panel_id].area_cm2
        factors = {f: f"written in {unit} and read as Ω" for f, unit in _UNITS.items()}
        if area is not None and abs(math.log(area)) > self.limits["odd_share"]:
            factors[area] = "divided by the area already"
        for factor, words in factors.items():
            for sign, said in ((-1, words), (1, _other_way(words))):
                if _apart(off, sign * math.log(factor)) < allowed:
                    ratio = float(factor) ** sign
                    larger = ratio > 1
                    times = f"{max(ratio, 1 / ratio):.3g} times {'larger' if larger else 'smaller'}"
                    return Finding(
                        "unit_suspected",
                        Severity.DOUBT,
                        f"At all frequencies this reading is {times} than the readings before and "
                        f"after it: it looks as if it had been {said}. Look at the file's units.",
                        evidence=(("factor", ratio),),
                    )
        return None

    def _panel(
        self, reading: Reading, here: ComplexArray, odd: float, allowed: float
    ) -> Finding | None:
        best: tuple[float, Panel] | None = None
        for panel_id, panel in self.panels.items():
            if panel_id == reading.panel_id:
                continue
            expected = self.expected(panel_id, reading.exposure_h)
            if expected is None:
                continue
            apart = _apart(here, expected[0])
            if apart < allowed and (best is None or apart < best[0]):
                best = apart, panel
        if best is None:
            return None
        apart, panel = best
        return Finding(
            "panel_suspected",
            Severity.DOUBT,
            f"This reading stands off the course of its own panel by a factor of "
            f"{math.exp(odd):.2g}, but fits that of panel {panel.name} at "
            f"{hours(reading.exposure_h)} to a factor of {math.exp(apart):.2g}: files or panels "
            "may have been exchanged. Compare file name, label and panel.",
            evidence=(("apart_own", odd), ("apart_other", apart)),
        )


def _other_way(words: str) -> str:
    if words.startswith("written"):
        unit = words.split()[2]
        return f"written in Ω and read as {unit}"
    return "multiplied by the area already"


def _apart(first: ComplexArray, second: ComplexArray | float) -> float:
    """Root mean square of the difference of two courses of ln Z."""
    return float(np.sqrt((np.abs(first - second) ** 2).mean()))


def course_findings(
    campaign: Campaign, counting: Sequence[str], limits: Mapping[str, float]
) -> Iterator[tuple[str, Finding]]:
    """Reading ids of `counting` with a finding where a reading fits another panel's course or
    another unit far better."""
    yield from Courses(campaign, set(counting), limits).findings()
