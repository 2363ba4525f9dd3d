"""What the sweep covers: its range, its density, and points measured twice."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from coatgui.quality.words import hertz
from coatgui.records import BoolArray, ComplexArray, Finding, FloatArray, Severity

_SAME = 1e-3  # relative difference of frequencies that are one
_FAST_END = 0.5  # decades
_FLAT_DEGREES = (20.0, 80.0)  # nearly resistive below, nearly capacitive above
_TURNING_DEGREES = 5.0


def coverage(
    frequency_hz: FloatArray,
    impedance: ComplexArray,
    used: BoolArray,
    wanted_hz: tuple[float, ...],
    limits: dict[str, float],
) -> Iterator[Finding]:
    """Too few points a decade, a sweep that ends too early, a fast end that shows no plateau."""
    slowest = float(frequency_hz[-1])
    decades = float(np.log10(frequency_hz[0] / slowest))
    density = (frequency_hz.size - 1) / max(decades, 1e-9)
    if density < limits["points_per_decade"] - 1e-6:
        yield Finding(
            "few_points",
            Severity.NOTE,
            f"There are {density:.1f} points a decade; {limits['points_per_decade']:g} or more "
            "hold a circuit better.",
            evidence=(("points_per_decade", density),),
        )
    missed = [f for f in wanted_hz if f < 0.995 * slowest]
    if missed:
        yield Finding(
            "range",
            Severity.NOTE,
            f"The sweep ends at {hertz(slowest)}: |Z| at {hertz(max(missed))} was not reached and "
            "is not guessed.",
            evidence=(("slowest_hz", slowest), ("wanted_hz", max(missed))),
        )
    end = np.nonzero(used & (frequency_hz > frequency_hz[0] / 10**_FAST_END))[0]
    if end.size >= 3:
        phase = np.abs(np.degrees(np.angle(impedance[end])))
        middle = float(phase[end.size // 2])
        turning = abs(float(phase[0] + phase[1] - phase[-1] - phase[-2])) / 2
        if _FLAT_DEGREES[0] < middle < _FLAT_DEGREES[1] and turning > _TURNING_DEGREES:
            yield Finding(
                "no_plateau",
                Severity.NOTE,
                f"At the fast end the phase is -{middle:.0f}° and still turning: neither the "
                "solution's resistance nor the film's capacitance shows by itself there. Start the "
                "sweep higher.",
                tuple(end.tolist()),
                (("phase_degrees", -middle), ("turning_degrees", turning)),
            )


def repeats(
    frequency_hz: FloatArray, impedance: ComplexArray, limits: dict[str, float]
) -> Iterator[Finding]:
    """A frequency measured twice whose two answers differ: the panel changed meanwhile."""
    same = np.nonzero(np.diff(frequency_hz) > -_SAME * frequency_hz[1:])[0]
    for place in same.tolist():
        first, second = impedance[place], impedance[place + 1]
        percent = 100 * abs(first - second) / max(abs(first), abs(second), 1e-300)
        if first and second and percent > limits["repeat_percent"]:
            yield Finding(
                "repeat_differs",
                Severity.DOUBT,
                f"The point at {hertz(float(frequency_hz[place]))} was measured twice and its "
                f"answers differ by {percent:.2g} %: the panel changed during the sweep. Let it "
                "settle and measure again.",
                (place, place + 1),
                (("percent", percent),),
            )
