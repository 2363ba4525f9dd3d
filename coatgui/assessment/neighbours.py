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
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from coatgui.assessment.rules import rule
from coatgui.assessment.words import hours
from coatgui.records import Campaign, ComplexArray, Finding, FloatArray, Panel, Reading, Severity

_FREQUENCIES = 12
_DECADES = 2.0  # that all readings must share
_UNITS = {1e3: "kΩ", 1e6: "MΩ"}


@dataclass(frozen=True, slots=True)
class _Course:
    """The readings of one panel that have ln Z: times (m,), ascending, and ln Z (m, k)."""

    times: FloatArray
    logarithms: ComplexArray

    def expected(self, exposure_h: ArrayLike) -> tuple[ComplexArray, FloatArray]:
        """What the readings leave to expect at times (n,) between two of them, (n, k), and how far
        these two are apart, (n,); NaN at the ends of the series. Readings of the same inspection
        are left aside, so a reading does not enter its own expectation."""
        now = np.asarray(exposure_h, dtype=np.float64)
        same = 1 + rule("inspection.same_within")
        before = np.searchsorted(self.times * same, now) - 1
        after = np.searchsorted(self.times, now * same, side="right")
        outside = (before < 0) | (after == self.times.size)
        before, after = np.maximum(before, 0), np.minimum(after, self.times.size - 1)
        first, last = self.logarithms[before], self.logarithms[after]
        start, middle, end = (
            np.log(np.maximum(t, 1e-3)) for t in (self.times[before], now, self.times[after])
        )
        share = np.where(outside, np.nan, middle - start) / np.where(outside, 1.0, end - start)
        share = share[:, None]
        return (1 - share) * first + share * last, _apart(first, last)


class Courses:
    """ln Z (per area where there is one) of the readings of each panel, in order of time."""

    def __init__(self, campaign: Campaign, counting: set[str], limits: Mapping[str, float]) -> None:
        self.limits = limits
        self.panels = {panel.panel_id: panel for panel in campaign.panels}
        readings = [r for r in campaign.readings if r.reading_id in counting]
        logarithms = self._logarithms(readings)
        self.series: dict[str, list[Reading]] = {}
        for reading in sorted(readings, key=lambda r: r.exposure_h):
            if reading.reading_id in logarithms:
                self.series.setdefault(reading.panel_id, []).append(reading)
        self.courses = {
            panel_id: _Course(
                np.array([r.exposure_h for r in own], dtype=np.float64),
                np.array([logarithms[r.reading_id] for r in own]),
            )
            for panel_id, own in self.series.items()
        }

    def _logarithms(self, readings: Sequence[Reading]) -> dict[str, ComplexArray]:
        """ln Z·A of the readings at a few frequencies that all share, by their ids."""
        if not readings:
            return {}
        fast = min(float(r.spectrum.frequency_hz[0]) for r in readings)
        slow = max(float(r.spectrum.frequency_hz[-1]) for r in readings)
        if fast < slow * 10**_DECADES:
            return {}
        wanted = np.linspace(math.log(slow), math.log(fast), _FREQUENCIES)
        grids: dict[tuple[bytes, bytes], list[Reading]] = {}
        for reading in readings:
            left_out = [p for p, _ in reading.left_out]
            use = reading.spectrum.impedance_ohm != 0
            use[[p for p in left_out if 0 <= p < use.size]] = False
            if use.sum() >= 2:
                grid = reading.spectrum.frequency_hz.tobytes(), use.tobytes()
                grids.setdefault(grid, []).append(reading)
        found: dict[str, ComplexArray] = {}
        for (frequency, used), those in grids.items():
            use = np.frombuffer(used, dtype=np.bool_)
            x = np.log(np.frombuffer(frequency)[use])[::-1]
            right = np.clip(np.searchsorted(x, wanted, side="right"), 1, x.size - 1)
            share = np.clip((wanted - x[right - 1]) / (x[right] - x[right - 1]), 0.0, 1.0)
            z = np.array([r.spectrum.impedance_ohm for r in those])[:, use][:, ::-1]
            left, right_ = (_logarithm(z[:, place]) for place in (right - 1, right))
            area = np.array([self.panels[r.panel_id].area_cm2 or 1.0 for r in those])
            between = (1 - share) * left + share * right_ + np.log(area)[:, None]
            found.update(zip((r.reading_id for r in those), between, strict=True))
        return found

    def findings(self) -> Iterator[tuple[str, Finding]]:
        """Reading ids with what is odd about them."""
        for panel_id, own in self.series.items():
            course = self.courses[panel_id]
            expectation, gaps = course.expected(course.times)
            off = course.logarithms - expectation
            odd = _apart(course.logarithms, expectation)
            # Not a number at the ends of a series, where nothing can be expected.
            for i in np.flatnonzero(odd >= np.maximum(self.limits["odd_share"], 2 * gaps)):
                allowed = self.limits["fits_better_share"] * float(odd[i])
                # A course between two readings is known no better than these are apart.
                known = min(allowed, max(self.limits["odd_share"], float(gaps[i])))
                finding = self._unit(own[i], off[i], known) or self._panel(
                    own[i], course.logarithms[i], float(odd[i]), allowed
                )
                if finding is not None:
                    yield own[i].reading_id, finding

    def _unit(self, reading: Reading, off: ComplexArray, allowed: float) -> Finding | None:
        area = self.panels[reading.panel_id].area_cm2
        factors = {f: f"written in {unit} and read as Ω" for f, unit in _UNITS.items()}
        if area is not None and abs(math.log(area)) > self.limits["odd_share"]:
            factors[area] = "divided by the area already"
        for factor, words in factors.items():
            for sign, said in ((-1, words), (1, _other_way(words))):
                if float(_apart(off, np.array(sign * math.log(factor)))) < allowed:
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
            if panel_id not in self.courses:
                continue
            expectation, _ = self.courses[panel_id].expected([reading.exposure_h])
            apart = float(_apart(here, expectation)[0])
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


def _logarithm(impedance: ComplexArray) -> ComplexArray:
    return np.asarray(np.log(np.abs(impedance)) + 1j * np.angle(impedance), dtype=np.complex128)


def _apart(first: ComplexArray, second: ComplexArray) -> FloatArray:
    """Root mean square, along the last axis, of the difference of two courses of ln Z."""
    return np.asarray(np.sqrt((np.abs(first - second) ** 2).mean(axis=-1)), dtype=np.float64)


def course_findings(
    campaign: Campaign, counting: Sequence[str], limits: Mapping[str, float]
) -> Iterator[tuple[str, Finding]]:
    """Reading ids of `counting` with a finding where a reading fits another panel's course or
    another unit far better."""
    yield from Courses(campaign, set(counting), limits).findings()
