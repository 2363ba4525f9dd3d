"""Where a number comes from: from the bytes of the file to the quantity, step by step, each with
the numbers that went through it."""

from __future__ import annotations

import math
import tomllib
from dataclasses import dataclass
from functools import cache

from coatgui.circuits import catalogue
from coatgui.intake.reading import WORKBOOK
from coatgui.records import (
    Dialect,
    ModulusStatus,
    Panel,
    PanelAssessment,
    Quantity,
    Reading,
    ReadingAssessment,
)
from coatgui.shipped import resource
from coatgui.window.numbers import prefixed, said

_SHOWN_POINTS = 12
_SEPARATORS = {"\t": "tab", ";": "semicolon", ",": "comma", " ": "blanks", "": "blanks"}


@dataclass(frozen=True)
class Step:
    """A step of the trace: what happens in it, and to which numbers."""

    title: str
    text: str


@dataclass(frozen=True)
class Number:
    """A number whose origin can be asked for: `entry` is its entry in resources/method.toml,
    `symbols` are the parameters that it rests on."""

    code: str
    name: str
    quantity: Quantity
    entry: str
    symbols: tuple[str, ...] = ()


@cache
def method(entry: str) -> tuple[str, str]:
    """How a quantity is obtained, and the source, as the method sheet says it."""
    entries = tomllib.loads(resource("method.toml").read_text(encoding="utf-8"))["entry"]
    found = next(e for e in entries if e["quantity"].startswith(entry))
    return found["how"], found["source"]


def numbers_of(known: ReadingAssessment) -> list[Number]:
    """All numbers of a reading that have a trace."""
    fit = "Circuit and parameters"
    film = ("C_c", "Q_c", "n_c")
    found = [
        Number(
            f"modulus_{m.frequency_hz:g}", f"|Z|·A at {m.frequency_hz:g} Hz", m.quantity, "|Z|·A"
        )
        for m in known.modulus
        if m.quantity is not None
    ]
    for code, name, quantity, entry, symbols in (
        ("coating_capacitance", "Film capacitance", known.coating_capacitance,
         "Film capacitance", film),
        ("water_uptake", "Apparent water uptake",
         known.water_uptake.quantity if known.water_uptake else None,
         "Apparent water uptake", film),
        ("pore_resistance", "Pore resistance", known.pore_resistance,
         "Pore resistance", ("R_po",)),
        ("relative_permittivity", "Film permittivity", known.relative_permittivity,
         "Film permittivity", film),
        ("film_resistivity", "Film resistivity", known.film_resistivity,
         "Film permittivity", ("R_po",)),
    ):  # fmt: skip
        if quantity is not None:
            found.append(Number(code, name, quantity, entry, symbols))
    found += [
        Number(f"parameter_{p.symbol}", f"{p.symbol}, {p.meaning}", p.quantity, fit, (p.symbol,))
        for p in known.parameters
    ]
    return found


def trace(
    number: Number,
    reading: Reading,
    known: ReadingAssessment,
    panel: Panel | None,
    of_panel: PanelAssessment | None,
    leads_taken_away: bool,
) -> list[Step]:
    """The way of a number, from the file to what is shown."""
    steps = [_file(reading), _table(reading), _points(reading, known)]
    if leads_taken_away:
        steps.append(
            Step("Leads", "The open leads, or the instrument's input, were taken away first.")
        )
    if number.code.startswith("modulus_"):
        steps.append(_measured(number, reading, known))
    elif known.fit is not None:
        steps += [_model(known), _parameters(number, known)]
    steps.append(_area(panel))
    steps += _derived(number, known, panel, of_panel)
    how, source = method(number.entry)
    steps.append(Step("Method", how))
    steps.append(Step("Source", source))
    steps.append(
        Step("Result", f"{number.name}: {said(number.quantity)}. {number.quantity.method}")
    )
    return steps


def _file(reading: Reading) -> Step:
    source = reading.source
    part = f", part {source.part}" if source.part else ""
    # In pieces, so that it can be broken into lines.
    digest = " ".join(source.sha256[i : i + 16] for i in range(0, len(source.sha256), 16))
    return Step("File", f"{source.file}{part}\nSHA-256 {digest}")


def _table(reading: Reading) -> Step:
    dialect = reading.source.dialect
    if dialect is None:
        return Step("Table", "How the file was read is not recorded.")
    lines = [_cut(dialect)]
    for column in dialect.columns:
        if column.role == "other":
            continue
        unit = f" in {column.unit}" if column.unit else ""
        factor = "" if column.factor == 1.0 else f", times {column.factor:g}"
        heading = f" “{column.heading}”" if column.heading else ""
        lines.append(
            f"column {column.position + 1}{heading}: {column.role.replace('_', ' ')}{unit}{factor}"
        )
    lines += dialect.remarks
    return Step("Lines, columns and units", "\n".join(lines))


def _cut(dialect: Dialect) -> str:
    first = f"first point in line {dialect.first_data_line}"
    if dialect.encoding == WORKBOOK:
        return f"Sheet {dialect.delimiter}, {first}"
    between = _SEPARATORS.get(dialect.delimiter, f"“{dialect.delimiter}”")
    sign = "comma" if dialect.decimal_sign == "," else "point"
    return f"{dialect.encoding}, columns parted by {between}, decimal {sign}, {first}"


def _points(reading: Reading, known: ReadingAssessment) -> Step:
    lines = [f"{known.points_used} of {known.points_read} points used."]
    lines += [
        f"left out: {prefixed(p.frequency_hz, 'Hz', 3)}, {p.reason}"
        for p in known.left_out[:_SHOWN_POINTS]
    ]
    if len(known.left_out) > _SHOWN_POINTS:
        lines.append(f"and {len(known.left_out) - _SHOWN_POINTS} more")
    if reading.kept_in:
        lines.append(f"{len(reading.kept_in)} kept by hand in spite of a doubt")
    if reading.overruled_because:
        lines.append(f"used in spite of its rejection: {reading.overruled_because}")
    return Step("Points left out", "\n".join(lines))


def _measured(number: Number, reading: Reading, known: ReadingAssessment) -> Step:
    wanted = float(number.code.removeprefix("modulus_"))
    modulus = known.modulus_at(wanted)
    frequency, z = reading.spectrum.frequency_hz, abs(reading.spectrum.impedance_ohm)
    places = sorted(range(frequency.size), key=lambda i: abs(math.log(frequency[i] / wanted)))
    measured = modulus is not None and modulus.status is ModulusStatus.MEASURED
    near = places[:1] if measured else places[:2]
    words = "measured at" if measured else "interpolated log–log between the points around it, near"
    lines = [f"|Z| {words} {prefixed(wanted, 'Hz')}:"]
    lines += [
        f"|Z| = {prefixed(float(z[i]), 'Ω', 4)} at {prefixed(float(frequency[i]), 'Hz', 4)}"
        for i in near
    ]
    return Step("Points", "\n".join(lines))


def _model(known: ReadingAssessment) -> Step:
    fit = known.fit
    assert fit is not None
    lines = [
        f"{fit.model_name} ({fit.model}), residual {fit.residual_rms_percent:.2f} %; {fit.message}."
    ]
    for trial in fit.trials:
        rest = (
            ""
            if trial.residual_rms_percent is None
            else f", residual {trial.residual_rms_percent:.2f} %"
        )
        weight = "" if trial.aicc is None else f", AICc {trial.aicc:.1f}"
        model = catalogue().get(trial.model)
        name = trial.model if model is None else model.name
        lines.append(f"tried: {name}{rest}{weight}. {trial.remark}".strip())
    return Step("Model", "\n".join(lines))


def _parameters(number: Number, known: ReadingAssessment) -> Step:
    assert known.fit is not None
    own = [p for p in known.fit.parameters if p.symbol in number.symbols]
    lines = [
        f"{p.symbol} = {said(p.quantity, 4)} per specimen. {p.quantity.method}".strip()
        for p in own or known.fit.parameters
    ]
    return Step("Parameters", "\n".join(lines))


def _area(panel: Panel | None) -> Step:
    if panel is None or panel.area_cm2 is None:
        return Step("Area", "No area is known: the values stand per specimen.")
    return Step(
        "Area",
        f"{panel.area_cm2:g} cm²: resistances times it, capacitances divided by it.",
    )


def _derived(
    number: Number,
    known: ReadingAssessment,
    panel: Panel | None,
    of_panel: PanelAssessment | None,
) -> list[Step]:
    """The formula with its numbers."""
    value = number.quantity.value
    area = panel.area_cm2 if panel is not None else None
    thickness = panel.thickness_um if panel is not None else None
    if value is None:
        return []
    if number.code == "water_uptake":
        film, water = known.coating_capacitance, known.water_uptake
        dry = of_panel.dry_capacitance if of_panel is not None else None
        if film is None or film.value is None or dry is None or dry.value is None or water is None:
            return []
        text = (
            "φ = ln(C_t/C_0)/ln ε_w\n"
            f"C_t = {prefixed(film.value, film.unit, 4)}\n"
            f"C_0 = {prefixed(dry.value, dry.unit, 4)}, {dry.method}\n"
            f"φ = {value:.3g} vol-% with the reference at {water.reference_h:g} h"
        )
        laws = [f"{name}: {percent:.2g} vol-%" for name, percent in water.by_law if percent]
        return [Step("Formula", text), Step("Other mixing laws", "\n".join(laws))]
    if number.code == "relative_permittivity" and known.coating_capacitance and thickness:
        film = known.coating_capacitance
        if film.value is not None:
            return [
                Step(
                    "Formula",
                    f"ε_r = C L/ε_0 = {prefixed(film.value, film.unit, 4)} × {thickness:g} µm "
                    f"/ ε_0 = {value:.3g}",
                )
            ]
    if number.code == "film_resistivity" and known.pore_resistance and thickness:
        pores = known.pore_resistance
        if pores.value is not None:
            return [
                Step(
                    "Formula",
                    f"ρ = R_po/L = {prefixed(pores.value, pores.unit, 4)} / {thickness:g} µm "
                    f"= {prefixed(value, number.quantity.unit, 3)}",
                )
            ]
    if number.code == "coating_capacitance":
        return [Step("Formula", "C = Q sin(nπ/2) ω^(n−1); for n = 1, C = Q")]
    return [_times_area(number, known, value, area)] if area else []


def _times_area(number: Number, known: ReadingAssessment, value: float, area: float) -> Step:
    unit = number.quantity.unit
    resistance = "Ω" in unit
    before = value / area if resistance else value * area
    bare = unit.replace(" cm²", "").replace("/cm²", "")
    if unit == bare:
        return Step("Formula", "Has no area in it.")
    sign = "×" if resistance else "/"
    return Step(
        "Formula",
        f"{prefixed(before, bare, 4)} {sign} {area:g} cm² = {prefixed(value, unit, 4)}",
    )
