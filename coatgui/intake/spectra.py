"""From extracts to spectra: sign and unit where the headings leave them open, sweeps one after
another, exposure times and panels."""

from __future__ import annotations

from collections import Counter
from collections.abc import Sequence
from dataclasses import dataclass, replace
from datetime import datetime

import numpy as np

from coatgui.intake.behaviour import phase_factor
from coatgui.intake.conditions import CONDITIONS
from coatgui.intake.cut import NOTHING
from coatgui.intake.errors import NoSpectrum, Unclear, Unreadable
from coatgui.intake.extract import Extract, extract, extracts_of
from coatgui.intake.impedance import (
    ANGLES,
    CAPACITIVE_SIGN,
    frequency_of,
    impedance_of,
    refuse_contradiction,
)
from coatgui.intake.layout import Section, meaning_is_exposure
from coatgui.intake.segments import TextRow
from coatgui.records import ComplexArray, Dialect, FloatArray, Spectrum

_FEWEST_POINTS = 5
_SAME = 1e-3  # relative difference of frequencies that are one
_WORDS = {"imaginary": "imaginary part", "phase": "phase"}


@dataclass(frozen=True)
class Piece:
    """One spectrum of a file; `exposure_h`, `panel` and `moment` where the file itself names them.
    `named_by_column` is False where the panel stands in a line above the table only. `doubts` are
    sentences a person should look at. Where `per_area`, the impedance is in Ω cm² still."""

    spectrum: Spectrum
    part: str
    exposure_h: float | None
    panel: str
    dialect: Dialect
    named_by_column: bool = True
    moment: datetime | None = None
    moment_unsure: bool = False
    per_area: bool = False
    doubts: tuple[str, ...] = ()
    temperature_span_c: tuple[float, float] | None = None
    potential_span_mv: tuple[float, float] | None = None


@dataclass(frozen=True)
class Origin:
    """How the cells of a file or sheet were come by."""

    encoding: str
    delimiter: str
    decimal_sign: str


def pieces(sections: Sequence[Section], after: Sequence[TextRow], origin: Origin) -> list[Piece]:
    """All spectra of a file or sheet. Raises Unreadable or Unclear."""
    extracts: list[Extract] = []
    remarks: list[str] = []
    nothing: NoSpectrum | None = None
    for section in sections:
        try:
            found = extracts_of(section)
        except NoSpectrum as problem:
            nothing = nothing or problem
            lines = section.block.lines
            remarks.append(
                f"Lines {lines[0]} to {lines[-1]} hold numbers that are no spectrum and were "
                "passed over."
            )
            continue
        if extracts and not section.own_headings:
            _refuse_interruption(extracts[-1], found[0], section)
        extracts += found
    if not extracts:
        raise nothing or NoSpectrum(NOTHING)
    passed_over = tuple(remarks)
    if after:
        _refuse_broken_end(after, extracts)
        remarks.append(f"Lines from {after[0].line} on hold no table and were taken as a footer.")
    _settle_units(extracts)
    doubts = (*passed_over, *_settle_signs(extracts))
    result: list[Piece] = []
    for made in extracts:
        own = (*made.doubts, *doubts)
        result += _cut(made, origin, [*remarks, *made.remarks, *own], own)
    return with_parts(result)


def pieces_as_told(sections: Sequence[Section], dialect: Dialect) -> list[Piece]:
    """The spectra that begin in the dialect's first line, or all where that is 0, with columns and
    factors exactly as they stand there. Raises Unreadable."""
    roles = Counter(c.role for c in dialect.columns if c.role != "other")
    double = next((role for role, times in roles.items() if times > 1), None)
    if double is not None:
        raise Unreadable(f"Two columns are said to be the {double}: choose one.")
    origin = Origin(dialect.encoding, dialect.delimiter, dialect.decimal_sign)
    first = dialect.first_data_line
    found: list[Piece] = []
    for section in sections:
        if first and first not in section.block.lines:
            continue
        if any(not 0 <= c.position < section.block.width for c in dialect.columns):
            if first:
                raise Unreadable(f"The table has only {section.block.width} columns.")
            continue
        made = extract(section, dialect.columns, section.said, alone=False)
        made.told = True
        found += _cut(made, origin, [], ())
    return [p for p in found if not first or p.dialect.first_data_line == first]


# ---------------------------------------------------------------------------------------------
# What must not be passed over


def _refuse_interruption(before: Extract, after: Extract, section: Section) -> None:
    """A line of words within one sweep is a point that cannot be read, not a new table."""
    words = [row for row in section.between if not row.comment and any(row.cells)]
    if not words or not before.lines.size or not after.lines.size:
        return
    earlier, later = frequency_of(before.scaled()), frequency_of(after.scaled())
    if earlier.size < 2 or not all(0 < f < np.inf for f in (*earlier[-2:], later[0])):
        return
    if (later[0] - earlier[-1]) * (earlier[-1] - earlier[-2]) >= 0:
        raise Unreadable(
            f"Line {words[0].line} stands between the points of a spectrum and holds no numbers: "
            "correct or remove the line."
        )


def _refuse_broken_end(after: Sequence[TextRow], extracts: Sequence[Extract]) -> None:
    first = after[0]
    try:
        float(str(first.cells[0]).replace(",", ".")) if first.cells else None
    except ValueError:
        return
    lines = extracts[-1].lines
    if first.cells and lines.size and first.line == int(lines[-1]) + 1:
        raise Unreadable(
            f"Line {first.line} has {len(first.cells)} cells where the table has more: the file "
            "may be cut short; export it again."
        )


# ---------------------------------------------------------------------------------------------
# What headings leave open


def _settle_units(extracts: Sequence[Extract]) -> None:
    """Phases without a unit, all of a file alike."""
    for role in ANGLES:
        open_ones = [m for m in extracts if m.way[1] == role and not m.column(role).unit]
        if not open_ones:
            continue
        factors: Counter[float] = Counter()
        for made in open_ones:
            values = made.scaled()
            size = values[made.way[0]]
            with np.errstate(all="ignore"):
                size = size if role == "phase" else 1.0 / size
            factors[phase_factor(frequency_of(values), size, made.values[role])] += 1
        factor = factors.most_common(1)[0][0]
        name = "radians" if factor == 1.0 else "degrees"
        for made in open_ones:
            sign = np.sign(made.column(role).factor)
            made.set_factor(role, factor * sign, name)
            made.remarks.append(f"The heading of the phase names no unit; its course says {name}.")


def _settle_signs(extracts: Sequence[Extract]) -> list[str]:
    """A coated panel's points are capacitive, nearly all of them: where most of a file are not, it
    counts the other way round. Points of the other sign in between stay as measured. Returns what
    there is to doubt."""
    doubts: dict[str, None] = {}
    for role, wanted in CAPACITIVE_SIGN.items():
        for told in (False, True):
            alike = [
                m for m in extracts if m.way[1] == role and (m.column(role).factor < 0) == told
            ]
            if not alike:
                continue
            signs = np.concatenate([np.sign(made.values[role]) for made in alike])
            as_told = -1.0 if told else 1.0
            if np.median(signs) * as_told * wanted >= 0:
                continue
            name = _WORDS.get(role, role.replace("_", " ") + " part")
            for made in alike:
                made.set_factor(role, -made.column(role).factor)
                made.remarks.append(
                    f"The {name} is counted {'against its heading ' if told else ''}with the "
                    "opposite sign and was turned."
                )
            if told:
                doubts[f"The heading says that the {name} is turned, and its numbers say not."] = (
                    None
                )
    return list(doubts)


# ---------------------------------------------------------------------------------------------
# Sweeps, times, panels


def _cut(
    made: Extract, origin: Origin, remarks: Sequence[str], doubts: tuple[str, ...]
) -> list[Piece]:
    """The spectra of one extract."""
    values = made.scaled()
    frequency = frequency_of(values)
    if not frequency.size:
        raise Unreadable("A table has headings but no points: nothing to read.")
    impedance = impedance_of(values, made.way, frequency)
    _refuse_not_measured(frequency, impedance, made)
    refuse_contradiction(values, impedance)
    del values  # of a large file, as much as its spectra
    told = tuple(dict.fromkeys(remarks))
    result = []
    for hours, panel, rows in _parts(made, frequency):
        own = frequency[rows]
        dialect = Dialect(
            origin.encoding,
            origin.delimiter,
            origin.decimal_sign,
            int(made.lines[rows[0]]),
            made.columns,
            bool(own[0] < own[-1]),
            told,
        )
        said = made.said
        result.append(
            Piece(
                Spectrum(own, impedance[rows]),
                "",
                said.hours if hours is None else hours,
                panel or said.panel,
                dialect,
                bool(panel),
                said.moment,
                said.moment_unsure,
                made.per_area,
                doubts,
                *(made.span(role, rows) for role in CONDITIONS),
            )
        )
    return result


def _refuse_not_measured(frequency: FloatArray, impedance: ComplexArray, made: Extract) -> None:
    usable = np.isfinite(frequency) & (frequency > 0)
    if not usable.all():
        line = made.lines[int(np.argmin(usable))]
        raise Unreadable(
            f"Line {line}: the frequency is not a positive number; correct or remove the line."
        )
    # Zero is what an instrument writes for a point that it did not measure.
    usable = np.isfinite(impedance) & (impedance != 0)
    if not usable.all():
        line = made.lines[int(np.argmin(usable))]
        raise Unreadable(
            f"Line {line}: the impedance is zero or not a finite number, so this point was not "
            "measured; correct or remove the line."
        )


def _parts(made: Extract, frequency: FloatArray) -> list[tuple[float | None, str, np.ndarray]]:
    """Rows of each exposure time and panel, in the order they come, and of each sweep where
    several follow each other."""
    size = frequency.size
    hours = _exposures(made, size)
    if hours is None and made.panels is None:
        return [(None, "", sweep) for sweep in _sweeps(frequency, np.arange(size), made)]
    times: list[float | None] = [None]
    time_codes = np.zeros(size, dtype=np.int64)
    if hours is not None:
        distinct, time_codes = np.unique(hours, return_inverse=True)
        times = list(distinct.tolist())
    panels: dict[str, int] = {}
    panel_codes = np.fromiter(
        (panels.setdefault(panel, len(panels)) for panel in made.panels or [""] * size),
        dtype=np.int64,
        count=size,
    )
    names = list(panels)
    # One number for each pair, in the order in which the pairs first come.
    pairs, first, codes = np.unique(
        time_codes * len(names) + panel_codes, return_index=True, return_inverse=True
    )
    rank = np.empty(pairs.size, dtype=np.int64)
    rank[np.argsort(first)] = np.arange(pairs.size)
    codes = rank[codes]
    keys = [(times[p // len(names)], names[p % len(names)]) for p in pairs[np.argsort(first)]]
    order = np.argsort(codes, kind="stable")
    cuts = np.flatnonzero(np.diff(codes[order])) + 1
    result = []
    sizes = np.diff(np.concatenate([[0], cuts, [size]]))
    _refuse_short(sizes, order[np.concatenate([[0], cuts])], made)
    for key, rows in zip(keys, np.split(order, cuts), strict=True):
        result += [(*key, sweep) for sweep in _sweeps(frequency, rows, made)]
    return result


def _exposures(made: Extract, size: int) -> FloatArray | None:
    hours = made.hours
    if hours is None:
        return None
    if np.unique(hours).size > max(1, size // _FEWEST_POINTS):
        return None  # a clock that runs through the sweep, not an exposure time
    column = made.column("time")
    if column.factor < 1.0 and not (made.told or meaning_is_exposure(column.heading)):
        return None  # seconds or minutes are how long something took
    if not (column.unit or made.hours_in_words or made.told):
        raise Unclear(
            f"The column '{column.heading[:40]}' names no unit: say whether the exposure is in "
            "hours or days."
        )
    return hours


def _sweeps(frequency: FloatArray, rows: np.ndarray, made: Extract) -> list[np.ndarray]:
    """Rows parted where the frequency leaps back to the start. Raises Unclear where it turns
    round and comes back."""
    _refuse_short(np.array([rows.size]), rows[:1], made)
    if rows.size < 2 * _FEWEST_POINTS:
        return [rows]
    with np.errstate(all="ignore"):
        steps = np.diff(np.log10(frequency[rows]))
    if not np.isfinite(steps).all() or (steps > 0).all() or (steps < 0).all():
        return [rows]
    # Most sweeps run one way throughout; one that turns round has no median to go by.
    way = np.sign(np.median(steps)) or np.sign(steps[np.flatnonzero(steps)[:1]].sum())
    span = float(np.ptp(np.log10(frequency[rows])))
    back = np.flatnonzero((steps * way < 0) & (np.abs(steps) > max(0.5, 0.5 * span)))
    if back.size == 0:
        # A step against the way may be a point measured twice; a row of them is a way back.
        usual = 0.5 * float(np.median(np.abs(steps)))
        if np.count_nonzero(steps * way < -usual) >= _FEWEST_POINTS:
            raise Unclear(
                "The frequency runs one way and back again: say which half is to be used, or "
                "remove the other."
            )
        return [rows]
    sweeps = _with_repeats(frequency, np.split(rows, back + 1))
    sizes, starts = zip(*((sweep.size, sweep[0]) for sweep in sweeps), strict=True)
    _refuse_short(np.array(sizes), np.array(starts), made)
    return sweeps


def _with_repeats(frequency: FloatArray, sweeps: list[np.ndarray]) -> list[np.ndarray]:
    """Before or after a sweep, one or a few of its points may be measured once more, to see whether
    the panel changed meanwhile: they belong to it."""

    def repeats(few: np.ndarray, many: np.ndarray) -> bool:
        if few.size >= _FEWEST_POINTS:
            return False
        ratio = frequency[few][:, None] / frequency[many]
        return bool((np.abs(ratio - 1) < _SAME).any(axis=1).all())

    groups: list[list[np.ndarray]] = []
    body = sweeps[0]
    for sweep in sweeps:
        # More than a few pieces are no repeats, and looking each up in a long sweep takes long.
        joins = bool(groups) and len(groups[-1]) < _FEWEST_POINTS
        if joins and (repeats(sweep, body) or repeats(body, sweep)):
            groups[-1].append(sweep)
            body = max(body, sweep, key=len)
        else:
            groups.append([sweep])
            body = sweep
    return [np.concatenate(group) for group in groups]


def _refuse_short(sizes: np.ndarray, starts: np.ndarray, made: Extract) -> None:
    """Raises Unreadable for the first part of too few points; `starts` are its first rows."""
    short = np.flatnonzero(sizes < _FEWEST_POINTS)
    if short.size:
        points = int(sizes[short[0]])
        raise Unreadable(
            f"The spectrum in line {made.lines[starts[short[0]]]} has only "
            f"{'1 point' if points == 1 else f'{points} points'}: at least {_FEWEST_POINTS} are "
            "needed."
        )


def with_parts(found: list[Piece]) -> list[Piece]:
    """Each piece with a name within its file: what tells it from the others."""
    if len(found) == 1:
        return found
    panels = {piece.panel for piece in found}
    result = []
    taken: Counter[str] = Counter()
    for number, piece in enumerate(found, start=1):
        words = [piece.panel] if piece.panel and len(panels) > 1 else []
        if piece.exposure_h is not None:
            words.append(f"{piece.exposure_h:g} h")
        name = ", ".join(words) or f"spectrum {number}"
        taken[name] += 1
        if taken[name] > 1:
            name = f"{name}, {taken[name]}"
        result.append(replace(piece, part=name))
    return result
