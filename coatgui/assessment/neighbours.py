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
from typing import Any

import numpy as np
from numpy.typing import NDArray

from coatgui.assessment.rules import rule
from coatgui.assessment.words import hours
from coatgui.records import Campaign, ComplexArray, Finding, FloatArray, Panel, Reading, Severity

_FREQUENCIES = 12
_DECADES = 2.0  # that all readings must share
_FEWEST_PANELS = 3  # whose changes have a median
_UNITS = {1e3: "kΩ", 1e6: "MΩ"}
_NONE = -1  # in place of a reading
Places = NDArray[np.intp]


def shared_logarithms(
    readings: Sequence[Reading], areas: Mapping[str, float | None]
) -> tuple[list[Reading], ComplexArray]:
    """The readings with two usable points or more, and their ln Z, per area where the panel has
    one, (N, F) on F frequencies that all readings share; none where they share too few decades."""
    if not readings:
        return [], np.empty((0, _FREQUENCIES), dtype=np.complex128)
    fast = min(float(r.spectrum.frequency_hz[0]) for r in readings)
    slow = max(float(r.spectrum.frequency_hz[-1]) for r in readings)
    if fast < slow * 10**_DECADES:
        return [], np.empty((0, _FREQUENCIES), dtype=np.complex128)
    wanted = np.linspace(math.log(slow), math.log(fast), _FREQUENCIES)
    # Readings with the same usable points on one grid of frequencies are interpolated together.
    alike: dict[tuple[bytes, bytes], list[int]] = {}
    for place, reading in enumerate(readings):
        use = reading.spectrum.impedance_ohm != 0
        use[[p for p, _ in reading.left_out if 0 <= p < use.size]] = False
        key = reading.spectrum.frequency_hz.tobytes(), use.tobytes()
        alike.setdefault(key, []).append(place)
    found = np.full((len(readings), _FREQUENCIES), np.nan, dtype=np.complex128)
    for (frequency, points), places in alike.items():
        use = np.frombuffer(points, dtype=np.bool_)
        if use.sum() >= 2:
            x = np.log(np.frombuffer(frequency)[use])[::-1]
            impedance = np.array([readings[place].spectrum.impedance_ohm for place in places])
            found[places] = _interpolated(wanted, x, impedance[:, use][:, ::-1])
    size = np.log([areas[r.panel_id] or 1.0 for r in readings])
    kept = np.flatnonzero(~np.isnan(found[:, 0]))
    return [readings[place] for place in kept.tolist()], found[kept] + size[kept, np.newaxis]


def _interpolated(wanted: FloatArray, x: FloatArray, impedance: ComplexArray) -> ComplexArray:
    """ln Z (B, F) at the wanted ln f from impedances (B, N) at ascending x; modulus and phase are
    interpolated, and held at the ends."""
    low = np.clip(np.searchsorted(x, wanted, side="right") - 1, 0, x.size - 2)
    step = x[low + 1] - x[low]
    share = np.where(step > 0, np.clip((wanted - x[low]) / np.maximum(step, 1e-300), 0.0, 1.0), 1.0)
    below, above = impedance[:, low], impedance[:, low + 1]
    modulus = (1 - share) * np.log(np.abs(below)) + share * np.log(np.abs(above))
    phase = (1 - share) * np.angle(below) + share * np.angle(above)
    return np.asarray(modulus + 1j * phase, dtype=np.complex128)


class Courses:
    """ln Z of the readings of each panel, in order of time.

    The readings lie panel by panel in `readings`, `hour` (N,) and `logarithm` (N, F). Panels are
    rows: `hours` (P, T) holds their exposure times, infinite behind the last; `begin` and `count`
    (P,) say where a panel's readings begin and how many there are.
    """

    def __init__(self, campaign: Campaign, counting: set[str], limits: Mapping[str, float]) -> None:
        self.limits = limits
        self.panels = {panel.panel_id: panel for panel in campaign.panels}
        self.row = {panel_id: row for row, panel_id in enumerate(self.panels)}
        there = [r for r in campaign.readings if r.reading_id in counting]
        # The first of two readings at one time stays the first.
        self.order = {r.reading_id: place for place, r in enumerate(there)}
        there.sort(key=lambda r: (self.row[r.panel_id], r.exposure_h))
        areas = {panel_id: panel.area_cm2 for panel_id, panel in self.panels.items()}
        self.readings, self.logarithm = shared_logarithms(there, areas)
        self.same = 1 + rule("inspection.same_within")
        self.hour = np.array([r.exposure_h for r in self.readings], dtype=np.float64)
        self.panel = np.array([self.row[r.panel_id] for r in self.readings], dtype=np.intp)
        self.count = np.bincount(self.panel, minlength=len(self.panels))
        self.begin = np.cumsum(self.count) - self.count
        self.hours = np.full((len(self.panels), int(self.count.max(initial=0))), np.inf)
        self.hours[self.panel, np.arange(self.panel.size) - self.begin[self.panel]] = self.hour
        self.before, self.after = self._beside_each()
        self._changes: dict[tuple[float, float], tuple[Places, FloatArray]] = {}

    # --- what is expected ------------------------------------------------------------------

    def beside(self, exposure_h: float) -> tuple[Places, Places]:
        """Each panel's last reading before an inspection and its first after it, (P,) places."""
        earlier = (self.hours * self.same < exposure_h).sum(axis=1)
        later = (self.hours <= exposure_h * self.same).sum(axis=1)
        return (
            np.where(earlier > 0, self.begin + earlier - 1, _NONE),
            np.where(later < self.count, self.begin + later, _NONE),
        )

    def _beside_each(self) -> tuple[Places, Places]:
        """The same for every reading in its own panel, (N,)."""
        before, after = np.full((2, self.hour.size), _NONE)
        for begin, count in zip(self.begin.tolist(), self.count.tolist(), strict=True):
            own = self.hour[begin : begin + count]
            earlier = np.searchsorted(own * self.same, own, side="left")
            later = np.searchsorted(own, own * self.same, side="right")
            stretch = slice(begin, begin + count)
            before[stretch] = np.where(earlier > 0, begin + earlier - 1, _NONE)
            after[stretch] = np.where(later < count, begin + later, _NONE)
        return before, after

    def between(
        self, before: Places, after: Places, exposure_h: FloatArray | float
    ) -> tuple[ComplexArray, FloatArray]:
        """What readings before and after leave to expect (B, F), and how far these are apart."""
        first, last = self.logarithm[before], self.logarithm[after]
        start, now, end = (
            np.log(np.maximum(t, 1e-3)) for t in (self.hour[before], exposure_h, self.hour[after])
        )
        share = ((now - start) / (end - start))[:, np.newaxis]
        return (1 - share) * first + share * last, _apart(first, last)

    def at_end(
        self, row: int, before: int, after: int, exposure_h: float
    ) -> tuple[ComplexArray, float] | None:
        """What a panel's readings leave to expect at a time before or after all of them, and how
        much is in motion there: between the two nearest, or in the other panels."""
        begin, end = self.begin[row], self.begin[row] + self.count[row]
        nearest, next_to = (before, before - 1) if after == _NONE else (after, after + 1)
        if nearest == _NONE or not begin <= next_to < end:
            return None
        common = self._common_change(row, float(self.hour[nearest]), exposure_h)
        first, second = self.logarithm[nearest], self.logarithm[next_to]
        return first + common, max(float(_apart(first, second)), float(_apart(common, 0.0)))

    def _common_change(self, but: int, start_h: float, end_h: float) -> ComplexArray:
        """Median of the changes of the other panels from one inspection to another; 0 where too few
        were read at both."""
        if (start_h, end_h) not in self._changes:
            start, end = self._first_at(start_h), self._first_at(end_h)
            both = np.flatnonzero((start != _NONE) & (end != _NONE))
            change = self.logarithm[end[both]] - self.logarithm[start[both]]
            self._changes[start_h, end_h] = both, change.view(np.float64)
        rows, change_of = self._changes[start_h, end_h]
        others = change_of[rows != but]
        if len(others) < _FEWEST_PANELS:
            return np.zeros(_FREQUENCIES, dtype=np.complex128)
        return np.asarray(np.median(others, axis=0)).view(np.complex128)

    def _first_at(self, exposure_h: float) -> Places:
        """Each panel's first reading of an inspection, (P,)."""
        place = (self.hours * self.same < exposure_h).sum(axis=1)
        there = (self.hours <= exposure_h * self.same).sum(axis=1) > place
        return np.where(there, self.begin + place, _NONE)

    # --- what is odd -----------------------------------------------------------------------

    def findings(self) -> Iterator[tuple[str, Finding]]:
        """Reading ids with what is odd about them, in the campaign's order."""
        found = [*self._odd_between(), *self._odd_at_ends()]
        found.sort(key=lambda pair: self.order[pair[0]])
        yield from found

    def _odd_between(self) -> Iterator[tuple[str, Finding]]:
        places = np.flatnonzero((self.before != _NONE) & (self.after != _NONE))
        expected, gaps = self.between(self.before[places], self.after[places], self.hour[places])
        off = self.logarithm[places] - expected
        for i in np.flatnonzero(self._is_odd(_apart(off, 0.0), gaps)):
            reading, odd = self.readings[places[i]], float(_apart(off[i], 0.0))
            allowed = self.limits["fits_better_share"] * odd
            known = self._known(allowed, float(gaps[i]))
            finding = self._unit(reading, off[i], known, "readings before and after")
            finding = finding or self._panel(reading, self.logarithm[places[i]], odd, allowed)
            if finding is not None:
                yield reading.reading_id, finding

    def _odd_at_ends(self) -> Iterator[tuple[str, Finding]]:
        for place in np.flatnonzero((self.before == _NONE) != (self.after == _NONE)).tolist():
            own = self._expected(place)
            if own is None:
                continue
            expectation, gap = own
            off = self.logarithm[place] - expectation
            odd = float(_apart(off, 0.0))
            if not self._is_odd(odd, gap):
                continue
            allowed = self.limits["fits_better_share"] * odd
            beside = "reading before" if self.after[place] == _NONE else "reading after"
            reading, known = self.readings[place], self._known(allowed, gap)
            finding = self._unit(reading, off, known, beside, at_end=True)
            finding = finding or self._exchanged(place, expectation, odd, allowed)
            if finding is not None:
                yield reading.reading_id, finding

    def _expected(self, place: int) -> tuple[ComplexArray, float] | None:
        """What the others of its panel leave to expect of a reading, and what moves there."""
        before, after = self.before[[place]], self.after[[place]]
        if before[0] != _NONE and after[0] != _NONE:
            expected, gap = self.between(before, after, self.hour[place])
            return expected[0], float(gap[0])
        return self.at_end(
            int(self.panel[place]), int(before[0]), int(after[0]), float(self.hour[place])
        )

    def _is_odd(self, odd: Any, gap: Any) -> Any:
        return odd >= np.maximum(self.limits["odd_share"], 2 * gap)

    def _known(self, allowed: float, gap: float) -> float:
        """A course is known no better than what moves there."""
        return min(allowed, max(self.limits["odd_share"], gap))

    def _exchanged(
        self, place: int, expectation: ComplexArray, odd: float, allowed: float
    ) -> Finding | None:
        """At the end of a series: a panel whose reading of the same inspection stands off its own
        course and fits this one's, as this reading fits that one's."""
        best: tuple[float, Panel] | None = None
        now = self.hour[place]
        alike = (self.hour <= now * self.same) & (now <= self.hour * self.same)
        for other in np.flatnonzero(alike & (self.panel != self.panel[place])).tolist():
            theirs = self._expected(other)
            if theirs is None:
                continue
            there = self.logarithm[other]
            apart = float(_apart(self.logarithm[place], theirs[0]))
            back, their_odd = _apart(there, expectation), _apart(there, theirs[0])
            mutual = back < self.limits["fits_better_share"] * their_odd
            if apart < allowed and mutual and (best is None or apart < best[0]):
                best = apart, self.panels[self.readings[other].panel_id]
        return None if best is None else _panel_finding(self.readings[place], odd, *best)

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
        before, after = self.beside(reading.exposure_h)
        others = (before != _NONE) & (after != _NONE)
        others[self.row[reading.panel_id]] = False
        rows = np.flatnonzero(others)
        if not rows.size:
            return None
        expected, _ = self.between(before[rows], after[rows], reading.exposure_h)
        apart = _apart(here, expected)
        best = int(np.argmin(apart))
        if apart[best] >= allowed:
            return None
        panel = self.panels[list(self.panels)[rows[best]]]
        return _panel_finding(reading, odd, float(apart[best]), panel)


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


def _apart(first: ComplexArray, second: ComplexArray | float) -> FloatArray:
    """Root mean square of the difference of two courses of ln Z (…, F)."""
    return np.asarray(np.sqrt((np.abs(first - second) ** 2).mean(axis=-1)))


def course_findings(
    campaign: Campaign, counting: Sequence[str], limits: Mapping[str, float]
) -> Iterator[tuple[str, Finding]]:
    """Reading ids of `counting` with a finding where a reading fits another panel's course or
    another unit far better."""
    yield from Courses(campaign, set(counting), limits).findings()
