"""Readings held against the course of their own panel and of the others: wrong panel, wrong unit.

A reading is odd if it stands off what the readings before and after it leave to expect, and these
two agree with each other. The expectation is ln Z interpolated on the logarithm of exposure time,
on a few frequencies that all readings share. One of a panel that fails and stays failed is not odd
by this measure. Only odd readings are tried in other units and against other panels.

At either end of a series there is a reading on one side only. What it leaves to expect is moved by
what most other panels did between the two times. As a panel may well fail at the last reading, more
is asked there: another unit must show at the fast end as well, where the film's capacitance changes
little, and an exchange must show in both panels, each fitting where the other should be.
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
_FEWEST_PANELS = 3  # whose changes have a median
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
        self.same = 1 + rule("inspection.same_within")
        self.logarithms = self._logarithms()
        self._changes: dict[tuple[str, float, float], ComplexArray | float] = {}

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
        earlier, later = self._sides(panel_id, exposure_h, without)
        if not earlier or not later:
            return None
        before, after = earlier[-1], later[0]
        first, last = (self.logarithms[r.reading_id] for r in (before, after))
        start, now, end = (
            math.log(max(t, 1e-3)) for t in (before.exposure_h, exposure_h, after.exposure_h)
        )
        share = (now - start) / (end - start)
        return (1 - share) * first + share * last, _apart(first, last)

    def _sides(
        self, panel_id: str, exposure_h: float, without: str = ""
    ) -> tuple[list[Reading], list[Reading]]:
        """A panel's readings before and after an inspection."""
        own = [
            r
            for r in self.series.get(panel_id, ())
            if r.reading_id != without and r.reading_id in self.logarithms
        ]
        earlier = [r for r in own if r.exposure_h * self.same < exposure_h]
        return earlier, [r for r in own if r.exposure_h > exposure_h * self.same]

    def expected_at_end(
        self, panel_id: str, exposure_h: float, without: str = ""
    ) -> tuple[ComplexArray, float] | None:
        """What a panel's other readings leave to expect at a time before or after all of them, and
        how much is in motion there: between the two nearest, or in the other panels."""
        earlier, later = self._sides(panel_id, exposure_h, without)
        if earlier and later:
            return None
        nearest = [*reversed(earlier), *later][:2]
        if len(nearest) < 2:
            return None
        first, second = (self.logarithms[r.reading_id] for r in nearest)
        common = self._common_change(panel_id, nearest[0].exposure_h, exposure_h)
        return first + common, max(_apart(first, second), _apart(common, 0.0))

    def _common_change(self, but: str, start_h: float, end_h: float) -> ComplexArray | float:
        """Median of the changes of the other panels from one inspection to another; 0 where too few
        were read at both."""
        if (but, start_h, end_h) in self._changes:
            return self._changes[but, start_h, end_h]
        changes = []
        for panel_id, series in self.series.items():
            those = [r for r in series if r.reading_id in self.logarithms]
            start = [r for r in those if self._one_inspection(r.exposure_h, start_h)]
            end = [r for r in those if self._one_inspection(r.exposure_h, end_h)]
            if panel_id != but and start and end:
                last, first = (self.logarithms[r[0].reading_id] for r in (end, start))
                changes.append(last - first)
        result: ComplexArray | float = 0.0
        if len(changes) >= _FEWEST_PANELS:
            result = np.median(np.real(changes), axis=0) + 1j * np.median(np.imag(changes), axis=0)
        self._changes[but, start_h, end_h] = result
        return result

    def _one_inspection(self, first_h: float, second_h: float) -> bool:
        return first_h <= second_h * self.same and second_h <= first_h * self.same

    def findings(self) -> Iterator[tuple[str, Finding]]:
        """Reading ids with what is odd about them."""
        for reading in self.readings:
            finding = self._between(reading) or self._at_end(reading)
            if finding is not None:
                yield reading.reading_id, finding

    def _between(self, reading: Reading) -> Finding | None:
        here = self.logarithms.get(reading.reading_id)
        own = self.expected(reading.panel_id, reading.exposure_h, reading.reading_id)
        if here is None or own is None:
            return None
        expectation, gap = own
        odd = _apart(here, expectation)
        if not self._is_odd(odd, gap):
            return None
        allowed = self.limits["fits_better_share"] * odd
        return self._unit(
            reading, here - expectation, self._known(allowed, gap), "readings before and after"
        ) or self._panel(reading, here, odd, allowed)

    def _at_end(self, reading: Reading) -> Finding | None:
        here = self.logarithms.get(reading.reading_id)
        own = self.expected_at_end(reading.panel_id, reading.exposure_h, reading.reading_id)
        if here is None or own is None:
            return None
        expectation, gap = own
        odd = _apart(here, expectation)
        if not self._is_odd(odd, gap):
            return None
        allowed = self.limits["fits_better_share"] * odd
        off = here - expectation
        earlier, _ = self._sides(reading.panel_id, reading.exposure_h, reading.reading_id)
        beside = "reading before" if earlier else "reading after"
        return self._unit(reading, off, self._known(allowed, gap), beside, at_end=True) or (
            self._exchanged(reading, here, odd, allowed)
        )

    def _is_odd(self, odd: float, gap: float) -> bool:
        return odd >= max(self.limits["odd_share"], 2 * gap)

    def _known(self, allowed: float, gap: float) -> float:
        """A course is known no better than what moves there."""
        return min(allowed, max(self.limits["odd_share"], gap))

    def _exchanged(
        self, reading: Reading, here: ComplexArray, odd: float, allowed: float
    ) -> Finding | None:
        """At the end of a series: a panel whose reading of the same inspection stands off its own
        course and fits this one's, as this reading fits that one's."""
        best: tuple[float, Panel] | None = None
        for panel_id, series in self.series.items():
            if panel_id == reading.panel_id:
                continue
            for other in series:
                there = self.logarithms.get(other.reading_id)
                if there is None or not self._one_inspection(other.exposure_h, reading.exposure_h):
                    continue
                theirs = self._any_expected(panel_id, other)
                ours = self._any_expected(reading.panel_id, reading)
                if theirs is None or ours is None:
                    continue
                apart, back = _apart(here, theirs[0]), _apart(there, ours[0])
                their_odd = _apart(there, theirs[0])
                mutual = back < self.limits["fits_better_share"] * their_odd
                if apart < allowed and mutual and (best is None or apart < best[0]):
                    best = apart, self.panels[panel_id]
        return None if best is None else _panel_finding(reading, odd, *best)

    def _any_expected(self, panel_id: str, reading: Reading) -> tuple[ComplexArray, float] | None:
        wanted = (panel_id, reading.exposure_h, reading.reading_id)
        return self.expected(*wanted) or self.expected_at_end(*wanted)

    def _unit(
        self,
        reading: Reading,
        off: ComplexArray,
        allowed: float,
        beside: str,
        at_end: bool = False,
    ) -> Finding | None:
        area = self.panels[reading.panel_id].area_cm2
        factors = {f: f"written in {unit} and read as Ω" for f, unit in _UNITS.items()}
        if area is not None and abs(math.log(area)) > self.limits["odd_share"]:
            factors[area] = "divided by the area already"
        for factor, words in factors.items():
            for sign, said in ((-1, words), (1, _other_way(words))):
                rest = off - sign * math.log(factor)
                if at_end and abs(rest[-1]) > self.limits["odd_share"]:
                    continue
                if _apart(rest, 0.0) < allowed:
                    ratio = float(factor) ** sign
                    larger = ratio > 1
                    times = f"{max(ratio, 1 / ratio):.3g} times {'larger' if larger else 'smaller'}"
                    return Finding(
                        "unit_suspected",
                        Severity.DOUBT,
                        f"At all frequencies this reading is {times} than the {beside} it: it "
                        f"looks as if it had been {said}. Look at the file's units.",
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
        return None if best is None else _panel_finding(reading, odd, *best)


def _panel_finding(reading: Reading, odd: float, apart: float, panel: Panel) -> Finding:
    return Finding(
        "panel_suspected",
        Severity.DOUBT,
        f"This reading stands off the course of its own panel by a factor of {math.exp(odd):.2g}, "
        f"but fits that of panel {panel.name} at {hours(reading.exposure_h)} to a factor of "
        f"{math.exp(apart):.2g}: files or panels may have been exchanged. Compare file name, label "
        "and panel.",
        evidence=(("apart_own", odd), ("apart_other", apart)),
    )


def _other_way(words: str) -> str:
    if words.startswith("written"):
        unit = words.split()[2]
        return f"written in Ω and read as {unit}"
    return "multiplied by the area already"


def _apart(first: ComplexArray | float, second: ComplexArray | float) -> float:
    """Root mean square of the difference of two courses of ln Z."""
    return float(np.sqrt((np.abs(first - second) ** 2).mean()))


def course_findings(
    campaign: Campaign, counting: Sequence[str], limits: Mapping[str, float]
) -> Iterator[tuple[str, Finding]]:
    """Reading ids of `counting` with a finding where a reading fits another panel's course or
    another unit far better."""
    yield from Courses(campaign, set(counting), limits).findings()
