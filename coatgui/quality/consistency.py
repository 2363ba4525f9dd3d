"""What the measurement model says about one reading: wild points, mains, scatter, steps, drift."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from coatgui.quality.faults import Fault, Searched
from coatgui.quality.patterns import Kind
from coatgui.quality.words import hertz
from coatgui.records import BoolArray, ComplexArray, Finding, FloatArray, Severity

_WINDOW = 5  # points looked at together for scatter
_GAP = 3  # wild points no further apart than this belong together
_FAR = 4.0  # times the others: a point that stands out even among scattered ones
_LAST_HARMONIC = 7
_LARGEST = 100.0


def stretches(mask: BoolArray) -> list[tuple[int, int]]:
    """Start and end of every run of True."""
    if not mask.any():
        return []
    edges = np.diff(np.concatenate([[0], mask.astype(np.int8), [0]]))
    starts, stops = np.nonzero(edges == 1)[0], np.nonzero(edges == -1)[0]
    return list(zip(starts.tolist(), stops.tolist(), strict=True))


def _groups(places: list[int]) -> list[list[int]]:
    """Sorted places, parted where the next is further than a gap away."""
    groups: list[list[int]] = []
    for place in places:
        if groups and place - groups[-1][-1] <= _GAP:
            groups[-1].append(place)
        else:
            groups.append([place])
    return groups


def _change(size: complex) -> complex:
    """Relative change of Z that a change of ln Z is. Numbers that are no measurement can stand
    hundreds of decades apart: from there on the size is left at e^100, which can be printed."""
    return complex(np.expm1(complex(min(size.real, _LARGEST), size.imag)))


def _departure(size: complex) -> float:
    """Relative departure of Z, in percent, that a departure of ln Z is."""
    return 100 * abs(_change(size))


def _rms_percent(off: ComplexArray) -> float:
    """Of one part of relative departures, in percent."""
    return 100 * float(np.sqrt(np.vdot(off, off).real / off.size / 2))


class Consistency:
    """One spectrum's frequencies (N,), what the search found in it, and the suggestions to leave
    points out, which the checks fill in order. `explained` points have a finding of their own."""

    def __init__(
        self,
        frequency_hz: FloatArray,
        searched: Searched,
        limits: dict[str, float],
        mains_hz: float,
        blocked: BoolArray,
        explained: set[int],
    ) -> None:
        self.frequency, self.searched, self.limits = frequency_hz, searched, limits
        self.mains_hz, self.blocked = mains_hz, blocked
        every = [f for f in searched.faults if f.place not in explained]
        places = sorted({f.place for f in every if f.kind is not Kind.DRIFT})
        # Two neighbours are two faults; a crowd is a stretch of scatter.
        crowds = [group for group in _groups(places) if len(group) > 2]
        crowd = {place for group in crowds for place in group}
        self.steps = [f for f in every if f.kind is Kind.STEP and f.place not in crowd]
        near_step = {f.place + i for f in self.steps for i in (-1, 0, 1)}
        self.wild = {f.place: f for f in every if f.kind is Kind.WILD and f.place not in near_step}
        self.loud, self.departing = self._stretches(crowds)
        inside = {place for start, stop in self.loud for place in range(start, stop)}
        self.scattered = self._scattered(inside)

    def findings(self, suggested: dict[int, str]) -> Iterator[Finding]:
        yield from self._single(suggested)
        yield from self._scatter(suggested)
        yield from self._steps()
        yield from self._drift()
        yield from self._whole(suggested)

    def _stretches(
        self, crowds: list[list[int]]
    ) -> tuple[list[tuple[int, int]], list[tuple[int, int]]]:
        """Stretches where the points scatter, and stretches where they depart all together."""
        number = self.frequency.size
        left = self.searched.left
        squares = (left.real**2 + left.imag**2) / 2
        size = min(_WINDOW, number)
        sums = np.convolve(squares, np.ones(size), mode="valid")
        counts = np.convolve(squares > 0, np.ones(size), mode="valid")
        percent = 100 * self.searched.scatter
        least = max(self.limits["scatter_factor"], self.limits["scatter_percent"] / percent)
        high = (sums > least**2 * counts) & (counts > 2)
        if not crowds and not high.any():
            return [], []
        crowded = np.zeros(number, dtype=np.bool_)
        for group in crowds:
            crowded[group[0] : group[-1] + 1] = True
        spread = np.zeros(number, dtype=np.bool_)
        for start in np.nonzero(high)[0].tolist():
            spread[start : start + size] = True
        # A window is loud as a whole; its quiet ends are not.
        quiet = (squares < 2.0) & ~crowded
        loud: list[tuple[int, int]] = []
        departing: list[tuple[int, int]] = []
        for start, stop in stretches(spread | crowded):
            while quiet[start] and stop - start > 1:
                start += 1
            while quiet[stop - 1] and stop - start > 1:
                stop -= 1
            alike = not crowded[start:stop].any() and self._one_sided(start, stop)
            (departing if alike else loud).append((start, stop))
        return loud, departing

    def _one_sided(self, start: int, stop: int) -> bool:
        """Whether neighbours in a stretch stand off to the same side, as a departure does and
        scatter does not: their products are positive on the whole (von Neumann's ratio)."""
        left = self.searched.left[start:stop]
        if left.size < 3:
            return False
        products = (left[1:] * left[:-1].conj()).real.sum()
        return bool(products > 0.5 * (np.abs(left) ** 2).sum())

    def _scattered(self, inside: set[int]) -> dict[int, Fault]:
        """Wild points that are part of a stretch of scatter, less those that stand out even there:
        they are named one by one."""
        part = {place: fault for place, fault in self.wild.items() if place in inside}
        if not part:
            return part
        usual = float(np.median([abs(f.size) for f in part.values()]))
        for place, fault in list(part.items()):
            if abs(fault.size) > _FAR * usual:
                del part[place]
        return part

    def _is_mains(self, place: int) -> bool:
        harmonic = self.frequency[place] / self.mains_hz
        nearest = max(round(float(harmonic)), 1)
        width = self.limits["mains_width_percent"] / 100
        return nearest <= _LAST_HARMONIC and abs(harmonic / nearest - 1) <= width

    def _single(self, suggested: dict[int, str]) -> Iterator[Finding]:
        for place, fault in sorted(self.wild.items()):
            if place in self.scattered:
                continue
            mains = self._is_mains(place)
            at, off = float(self.frequency[place]), _departure(fault.size)
            words = "mains pick-up" if mains else "wild point"
            suggested[place] = words
            where = f"{round(at / self.mains_hz):d} × " if at > 1.5 * self.mains_hz else ""
            advice = (
                f"it lies at {where}{self.mains_hz:g} Hz; screen the cell and measure again"
                if mains
                else "measure it again or leave it out"
            )
            yield Finding(
                "mains_pick_up" if mains else "wild_point",
                Severity.DOUBT,
                f"The point at {hertz(at)} stands {off:.3g} % off what the other points allow "
                f"({words}): {advice}.",
                (place,),
                (("frequency_hz", at), ("percent_off", off)),
            )

    def _scatter(self, suggested: dict[int, str]) -> Iterator[Finding]:
        for place in self.scattered:
            suggested.setdefault(place, "stretch of scatter")
        for start, stop in self.loud:
            sizes = [
                abs(f.size) / np.sqrt(2) for p, f in self.scattered.items() if start <= p < stop
            ]
            left = self.searched.left[start:stop]
            sizes += (np.abs(left[left != 0]) * self.searched.scatter / np.sqrt(2)).tolist()
            rms = 100 * float(np.sqrt(np.mean(np.square(sizes))))
            slow, fast = (float(self.frequency[p]) for p in (stop - 1, start))
            mains = any(self._is_mains(p) for p in self.scattered if start <= p < stop)
            yield Finding(
                "scatter",
                Severity.DOUBT,
                f"Between {hertz(slow)} and {hertz(fast)} the points scatter by {rms:.2g} %, far "
                f"more than elsewhere{' (mains lie among them)' * mains}: look for a loose contact "
                "or a disturbance, and measure again.",
                tuple(range(start, stop)),
                (("percent", rms), ("low_hz", slow), ("high_hz", fast)),
            )

    def _steps(self) -> Iterator[Finding]:
        # A step that stays and one that dies away in the same gap are one step, seen in two parts.
        sizes: dict[int, float] = {}
        for fault in self.steps:
            sizes[fault.place] = sizes.get(fault.place, 0.0) + fault.size.real
        for place, size in sorted(sizes.items()):
            before, after = (float(self.frequency[place - i]) for i in (1, 0))
            percent = 100 * _change(size).real
            large = 100 * abs(size) >= self.limits["step_doubt_percent"]
            yield Finding(
                "step",
                Severity.DOUBT if large else Severity.NOTE,
                f"|Z| steps {'up' if percent > 0 else 'down'} by {abs(percent):.2g} % between "
                f"{hertz(before)} and {hertz(after)}, which no circuit does: the instrument "
                "changed its range there or the panel changed. Compare with a sweep on a fixed "
                "range.",
                (place - 1, place),
                (("percent", percent), ("frequency_hz", after)),
            )

    def _drift(self) -> Iterator[Finding]:
        # A step seldom dies away quite as its pattern does; what is left of it is no drift.
        steps = max((abs(f.size) for f in self.steps), default=0.0)
        drifts = [
            f for f in self.searched.faults if f.kind is Kind.DRIFT and abs(f.size) > 0.75 * steps
        ]
        number = self.frequency.size
        if drifts:
            start = max(drifts, key=lambda f: abs(f.size)).place
            percent = 100 * _change(sum(f.size.real for f in drifts)).real
            points = tuple(range(start, number))
            text = (
                f"Towards the slow end |Z| runs away, to {abs(percent):.2g} % "
                f"{'above' if percent > 0 else 'below'} what the phases allow, all to one side: "
                "the panel probably changed during the sweep. Let it settle and measure again, or "
                "start the sweep higher."
            )
            yield Finding("drift", Severity.DOUBT, text, points, (("percent", percent),))
        for start, stop in self.departing:
            rms = _rms_percent(self.searched.left[start:stop] * self.searched.scatter)
            slow, fast = (float(self.frequency[p]) for p in (stop - 1, start))
            at_end = stop >= number - 1
            if at_end and drifts:
                continue
            cause = (
                "the panel probably drifted during the sweep"
                if at_end
                else "something changed there, the panel or the set-up"
            )
            yield Finding(
                "drift" if at_end else "departure",
                Severity.DOUBT,
                f"Between {hertz(slow)} and {hertz(fast)} the points stand {rms:.2g} % off the "
                f"Kramers–Kronig relations, neighbours to the same side: {cause}. Measure again.",
                tuple(range(start, stop)),
                (("percent", rms), ("low_hz", slow), ("high_hz", fast)),
            )

    def _whole(self, suggested: dict[int, str]) -> Iterator[Finding]:
        kept = np.ones(self.frequency.size, dtype=np.bool_)
        kept[list(suggested)] = False
        kept &= ~self.blocked
        if not kept.any():
            return
        broken = _rms_percent(self.searched.residuals[kept])
        if broken > self.limits["kramers_kronig_reject_percent"]:
            yield Finding(
                "kramers_kronig",
                Severity.REJECT,
                f"The reading breaks the Kramers–Kronig relations by {broken:.2g} %: it is not the "
                "answer of a steady panel and cannot be fitted. Measure again.",
                (),
                (("percent", broken),),
            )
            return
        # What has a finding of its own is not counted again.
        unnamed = _rms_percent(self.searched.left[kept] * self.searched.scatter)
        scattered = unnamed < 2 * 100 * self.searched.scatter
        name = "overall_scatter_percent" if scattered else "kramers_kronig_doubt_percent"
        if unnamed > self.limits[name] and not (self.departing and not scattered):
            why = "all of it scatter" if scattered else "more than its scatter explains"
            yield Finding(
                "kramers_kronig",
                Severity.DOUBT,
                f"The reading departs from the Kramers–Kronig relations by {unnamed:.2g} %, {why}: "
                "take what is drawn from it with care.",
                (),
                (("percent", unnamed), ("scatter_percent", 100 * self.searched.scatter)),
            )
