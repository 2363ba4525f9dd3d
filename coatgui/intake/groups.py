"""Columns that belong together: which columns of a table are one spectrum, and whose."""

from __future__ import annotations

from dataclasses import dataclass, replace
from datetime import datetime
from itertools import pairwise

from coatgui.intake.headings import Meaning

FREQUENCIES = ("frequency", "angular_frequency")
SHARED = ("time", "panel", "date")


@dataclass(frozen=True)
class Said:
    """What rows above a block say about its spectra."""

    panel: str = ""
    hours: float | None = None
    moment: datetime | None = None
    moment_unsure: bool = False


def groups_of(
    meanings: list[Meaning | None], labels: dict[int, tuple[str, float]]
) -> list[tuple[list[int], Said]]:
    roles = ["" if m is None else m.role for m in meanings]
    frequencies = [i for i, role in enumerate(roles) if role in FREQUENCIES]
    several = len(frequencies) > len({roles[i] for i in frequencies})
    if several:
        own = _by_frequency(roles, frequencies)
        common: list[int] = [
            i for i, role in enumerate(roles) if role in SHARED and not any(i in g for g in own)
        ]
    else:
        common = [i for i, role in enumerate(roles) if role in (*FREQUENCIES, *SHARED)]
        values = [i for i, role in enumerate(roles) if role and i not in common]
        own = _by_repetition(meanings, values)
    found = []
    for group in own:
        said = _said_of_group(meanings, group)
        if len(own) > 1 and said == Said():
            over = [labels[i] for i in range(group[0], group[-1] + 1) if i in labels]
            over = over or [labels[i] for i in sorted(labels) if i <= group[0]][-1:]
            if over:
                said = Said(over[0][0], None if over[0][1] < 0 else over[0][1])
        found.append((sorted({*common, *group}), said))
    return found


def _by_frequency(roles: list[str], frequencies: list[int]) -> list[list[int]]:
    """Groups that each have their own frequency column."""
    named = [i for i, role in enumerate(roles) if role]
    start, stop = named[0], named[-1] + 1
    period = frequencies[1] - frequencies[0]
    periodic = (stop - start) <= period * len(frequencies) and all(
        roles[i] == roles[i - period] for i in range(start + period, stop)
    )
    if periodic:
        starts = list(range(start, stop, period))
    elif frequencies[0] == next(i for i in named if roles[i] not in SHARED):
        starts = frequencies
    else:
        starts = [start, *(i + 1 for i in frequencies[:-1])]
    return [[i for i in range(a, b) if roles[i]] for a, b in pairwise([*starts, len(roles)])]


def _by_repetition(meanings: list[Meaning | None], values: list[int]) -> list[list[int]]:
    """Groups that share a frequency column: by their labels, else anew where a role comes again."""
    kinds = [meanings[i] for i in values]
    known = [m for m in kinds if m is not None]
    if len({(m.role, m.logarithm) for m in known}) == len(known):
        return [values]
    keys = [(m.hours, m.label) for m in known]
    if all(key != (None, "") for key in keys):
        by_key: dict[tuple[float | None, str], list[int]] = {}
        for i, key in zip(values, keys, strict=True):
            by_key.setdefault(key, []).append(i)
        return list(by_key.values())
    groups: list[list[int]] = [[]]
    taken: set[str] = set()
    for i, what in zip(values, known, strict=True):
        if what.role in taken:
            groups.append([])
            taken = set()
        groups[-1].append(i)
        taken.add(what.role)
    return groups


def _said_of_group(meanings: list[Meaning | None], group: list[int]) -> Said:
    said = Said()
    for i in group:
        what = meanings[i]
        if what is not None and what.hours is not None and said.hours is None:
            said = replace(said, hours=what.hours)
        if what is not None and what.label and not said.panel:
            said = replace(said, panel=what.label)
    return said
