"""Columns without headings, and phases without a unit: told by what the numbers do, or asked."""

from __future__ import annotations

import numpy as np

from coatgui.intake.errors import NoSpectrum, Unclear
from coatgui.intake.impedance import expected_phase
from coatgui.records import Column, FloatArray

DEGREE = np.pi / 180.0
# How far a spectrum may be, in the median, from the gain-phase relation in its local form (rad),
# and how much better one account must be than the next. Own choice: smooth spectra of films and of
# active metal stay within 0.1 rad, wrong accounts are off by 0.3 rad and more.
_WITHIN = 0.2
_BETTER = 2.0
_ASK = "say which columns they are, or add a line of headings."


def columns_by_behaviour(numbers: FloatArray, is_word: list[bool]) -> tuple[Column, ...]:
    """Roles of the columns of one block (rows, columns). Raises NoSpectrum or Unclear."""
    usable = [i for i in range(numbers.shape[1]) if not is_word[i] and _filled(numbers[:, i])]
    counting = [i for i in usable if np.allclose(np.diff(numbers[:, i]), 1.0)]
    running = [i for i in usable if i not in counting and _runs(numbers[:, i])]
    if not running:
        raise NoSpectrum(
            "No headings say what the columns are, and no column runs like a frequency: add a "
            "line of headings."
        )
    frequency = running[0]
    rest = [i for i in usable if i not in counting and i > frequency]
    roles = {frequency: "frequency"}
    if len(rest) == 4:
        rest = _without_the_same_again(numbers, rest)
    if len(rest) != 2:
        raise Unclear(
            "No headings say what the columns are, and beside the frequency stand "
            f"{len(rest)} columns where two are wanted: {_ASK}"
        )
    first, second, factor = _two_columns(
        numbers[:, frequency], numbers[:, rest[0]], numbers[:, rest[1]]
    )
    roles[rest[0]], roles[rest[1]] = first, second
    unit = {"phase": "degrees" if factor != 1.0 else "radians"}
    return tuple(
        Column(
            i,
            "",
            roles.get(i, "other"),
            unit.get(roles.get(i, ""), ""),
            factor if roles.get(i) == "phase" else 1.0,
        )
        for i in range(numbers.shape[1])
    )


def _filled(values: FloatArray) -> bool:
    return bool(np.isfinite(values).all())


def _runs(values: FloatArray) -> bool:
    """Like a frequency: above zero, over two decades or more, mostly one way in even steps (with
    leaps back where sweep follows sweep)."""
    if values.size < 5 or not (values > 0).all():
        return False
    steps = np.diff(np.log(values))
    usual = float(np.median(steps))
    one_way = np.mean(np.sign(steps) == np.sign(usual)) >= 0.8
    own = steps[np.sign(steps) == np.sign(usual)]
    even = own.size > 0 and np.std(own) < 0.5 * abs(usual)
    return bool(one_way and even and np.log10(values.max() / values.min()) >= 2)


def _without_the_same_again(numbers: FloatArray, rest: list[int]) -> list[int]:
    """Of real, imaginary, modulus and phase, in either order, the parts: the modulus repeats."""
    for parts, others in ((rest[:2], rest[2:]), (rest[2:], rest[:2])):
        size = np.hypot(numbers[:, parts[0]], numbers[:, parts[1]])
        if np.allclose(size, numbers[:, others[0]], rtol=1e-2):
            return parts
    return rest


def _two_columns(
    frequency: FloatArray, first: FloatArray, second: FloatArray
) -> tuple[str, str, float]:
    """Roles of the two columns beside the frequency, and the factor of a phase to rad."""
    errors: list[tuple[float, str, str, float]] = []
    both = np.hypot(first, second)
    if (both > 0).all():
        angle = np.arctan2(-np.abs(second), first)
        errors.append((_distance(frequency, both, angle), "real", "imaginary", 1.0))
    if (first > 0).all() and np.abs(second).max() <= 400.0:
        for factor in (DEGREE, 1.0):
            if np.abs(second).max() * factor <= 2.2 * np.pi:
                distance = _distance(frequency, first, -np.abs(second) * factor)
                errors.append((distance, "modulus", "phase", factor))
    errors.sort()
    if not errors or errors[0][0] > _WITHIN:
        raise Unclear(
            "No headings say what the columns are, and those beside the frequency behave neither "
            f"like real and imaginary part nor like modulus and phase: {_ASK}"
        )
    if len(errors) > 1 and errors[1][0] < _BETTER * max(errors[0][0], 0.02):
        raise Unclear(
            "No headings say what the columns are, and they could be "
            f"{errors[0][1]} and {errors[0][2]} or {errors[1][1]} and {errors[1][2]}: {_ASK}"
        )
    return errors[0][1], errors[0][2], errors[0][3]


def _distance(frequency: FloatArray, modulus: FloatArray, phase: FloatArray) -> float:
    """Median distance in rad of the phase from what the slope of the modulus wants."""
    order = np.argsort(frequency, kind="stable")
    f, size, angle = frequency[order], modulus[order], phase[order]
    once = np.concatenate([[True], np.diff(f) > 0])
    if once.sum() < 5 or not (np.isfinite(f) & np.isfinite(size)).all():
        return float("inf")
    wanted = expected_phase(f[once], size[once])
    return float(np.median(np.abs(wanted - angle[once])))


def phase_factor(frequency: FloatArray, modulus: FloatArray, phase: FloatArray) -> float:
    """Factor to rad of a phase whose heading names no unit. Raises Unclear."""
    largest = np.abs(phase).max()
    if largest > 2.2 * np.pi:
        return DEGREE
    good = (modulus > 0) & (frequency > 0)
    errors = sorted(
        (_distance(frequency[good], modulus[good], -np.abs(phase[good]) * factor), factor)
        for factor in (1.0, DEGREE)
    )
    if errors[0][0] > _WITHIN or errors[1][0] < _BETTER * max(errors[0][0], 0.02):
        raise Unclear("The phase names no unit: say whether it is in degrees or radians.")
    return errors[0][1]
