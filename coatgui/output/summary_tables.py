"""The tables of the summary."""

from __future__ import annotations

import tomllib

from coatgui.assessment.rules import default_criteria
from coatgui.output.document import Table
from coatgui.output.figure_parts import modulus_taken, uptake_taken, watched_frequency
from coatgui.output.shown import MARKS, NOTHING, amount, hours, number, state
from coatgui.records import (
    Assessment,
    Campaign,
    Comparison,
    Finding,
    ReadingAssessment,
    Severity,
)
from coatgui.shipped import resource

_HEAVIEST_FIRST = (Severity.REJECT, Severity.DOUBT, Severity.NOTE)


def panels_table(assessment: Assessment, campaign: Campaign) -> Table:
    kept = {panel.panel_id: panel for panel in campaign.panels}
    rows = []
    for panel in assessment.panels:
        own = kept.get(panel.panel_id)
        temperature = own.temperature_c if own else None
        rows.append(
            (
                panel.formulation,
                panel.panel,
                NOTHING if panel.area_cm2 is None else f"{panel.area_cm2:g}",
                NOTHING if panel.thickness_um is None else f"{panel.thickness_um:g}",
                (own.substrate if own else "") or NOTHING,
                (own.electrolyte if own else "") or NOTHING,
                NOTHING if temperature is None else f"{temperature:g}",
                (own.regime if own else "") or NOTHING,
            )
        )
    return Table(
        "Panels.",
        (
            "formulation",
            "panel",
            "area (cm²)",
            "film (µm)",
            "substrate",
            "electrolyte",
            "T (°C)",
            "regime",
        ),
        tuple(rows),
        (2, 1.2, 0.9, 0.9, 1.6, 1.8, 0.8, 1.6),
        frozenset({2, 3, 6}),
    )


def readings_table(assessment: Assessment) -> Table:
    frequency_hz = watched_frequency(assessment)
    take = None if frequency_hz is None else modulus_taken(frequency_hz)
    rows = tuple(
        (
            r.panel,
            hours(r.exposure_h),
            amount(take(r)) if take else NOTHING,
            r.fit.model_name if r.fit else "not fitted",
            amount(r.coating_capacitance, limits=False),
            amount(r.pore_resistance, limits=False),
            amount(uptake_taken(r)),
            state(r.findings),
        )
        for r in assessment.readings
    )
    return Table(
        "Readings. |Z|·A and pore resistance in Ω cm², film capacitance in F/cm² (Ω and F where "
        "a panel has no area); apparent water uptake in vol-%; 95 % limits in brackets.",
        (
            "panel",
            "hours",
            f"|Z|·A at {frequency_hz:g} Hz" if frequency_hz is not None else "|Z|·A",
            "circuit",
            "film C",
            "pore R",
            "water",
            "state",
        ),
        rows,
        (0.9, 0.75, 2.6, 1.9, 1.05, 1.15, 1.9, 1.05),
        frozenset({1}),
    )


def water_table(assessment: Assessment) -> Table:
    """The last uptake of each panel with the bracket of the mixing laws, and at saturation."""
    last: dict[str, ReadingAssessment] = {}
    for reading in assessment.readings:
        if reading.water_uptake is not None:
            last[reading.panel_id] = reading
    rows = []
    for panel in assessment.panels:
        final = last.get(panel.panel_id)
        water = final.water_uptake if final else None
        saturation = panel.saturation_uptake
        bracket = NOTHING
        if water is not None and water.law_low is not None:
            bracket = f"{number(water.law_low)} to {number(water.law_high)}"
        rows.append(
            (
                panel.panel,
                hours(final.exposure_h) if final else NOTHING,
                amount(water.quantity if water else None),
                bracket,
                amount(saturation.quantity if saturation else None),
                amount(panel.dry_capacitance, limits=False),
                amount(panel.diffusion_coefficient),
            )
        )
    return Table(
        "Apparent water uptake (vol-%) at the last reading that has one and at saturation, by "
        "Brasher–Kingsbury, with the bracket of the mixing laws; dry capacitance (F/cm²) and "
        "diffusion coefficient of water (cm²/s).",
        ("panel", "hours", "uptake", "other laws", "at saturation", "dry C", "diffusion"),
        tuple(rows),
        (0.9, 0.75, 1.8, 1.3, 1.8, 1.1, 2.3),
        frozenset({1}),
    )


def pairs_table(comparison: Comparison) -> Table:
    rows = tuple(
        (
            pair.first,
            pair.second,
            amount(pair.difference),
            f"{pair.probability:.2g}",
            f"{pair.adjusted:.2g}",
            "differ" if pair.differ else "cannot be told apart",
        )
        for pair in comparison.pairs
    )
    unit = next((p.difference.unit for p in comparison.pairs if p.difference is not None), "")
    return Table(
        f"Pairs of formulations, {comparison.what}: first less second"
        f"{f' ({unit})' if unit else ''}, and the probability of a difference as large by chance, "
        "alone and corrected for many pairs.",
        ("first", "second", "difference", "alone", "corrected", "result"),
        rows,
        (2, 2, 1.9, 0.9, 1, 1.5),
        frozenset({3, 4}),
    )


def criteria_table(assessment: Assessment) -> Table:
    rows = tuple(
        (panel.panel, crossing.criterion.name, crossing.text)
        for panel in assessment.panels
        for crossing in panel.limit_crossings
    )
    sources = dict.fromkeys(
        f"{c.criterion.name}: {c.criterion.source}"
        for panel in assessment.panels
        for c in panel.limit_crossings
    )
    caption = "Panels against the limits. A limit is crossed between two readings. "
    return Table(caption + " ".join(sources), ("panel", "limit", "standing"), rows, (1, 1.4, 5))


def studies_table(assessment: Assessment) -> Table:
    """Share of panels that still hold, step by step."""
    rows = []
    for study in assessment.limit_studies:
        for step in study.curve:
            share = f"{100 * step.share_low:.0f}"
            if step.share_low != step.share_high:
                share += f" to {100 * step.share_high:.0f}"
            rows.append(
                (
                    study.formulation,
                    study.limit.name,
                    hours(step.exposure_h),
                    share,
                    f"{100 * step.low:.0f} to {100 * step.high:.0f}",
                )
            )
    return Table(
        "Share of panels that still hold, by Turnbull's estimate, with 95 % limits.",
        ("formulation", "limit", "hours", "hold (%)", "limits (%)"),
        tuple(rows),
        (3, 2, 1, 1, 1.3),
        frozenset({2, 3, 4}),
    )


def ratings_table(assessment: Assessment) -> Table:
    rows = tuple(
        (
            course.formulation,
            course.scale,
            hours(course.exposure_h),
            course.best,
            course.worst,
            "; ".join(f"{panel} {value}" for panel, value in course.ratings),
            course.edition,
        )
        for course in assessment.ratings
    )
    return Table(
        "Visual ratings, panel by panel.",
        ("formulation", "scale", "hours", "best", "worst", "panels", "edition"),
        rows,
        (2, 1.5, 0.8, 0.8, 0.8, 3, 2),
        frozenset({2}),
    )


def findings_table(assessment: Assessment) -> Table:
    """Findings on the campaign, on panels, on readings; the heaviest first."""
    everything: list[tuple[str, str, Finding]] = [
        ("campaign", "", finding) for finding in assessment.findings
    ]
    everything += [(p.panel, "", f) for p in assessment.panels for f in p.findings]
    everything += [
        (r.panel, hours(r.exposure_h), f) for r in assessment.readings for f in r.findings
    ]
    everything.sort(key=lambda row: _HEAVIEST_FIRST.index(row[2].severity))
    rows = tuple((MARKS[f.severity], who, when, f.text) for who, when, f in everything)
    return Table(
        "Deviations, doubts and notes, the heaviest first.",
        ("weight", "panel", "hours", "what was found"),
        rows,
        (1, 1, 0.8, 6),
        frozenset({2}),
    )


def refused_table(assessment: Assessment) -> Table:
    rows = tuple((refusal.file, refusal.reason) for refusal in assessment.refused)
    return Table("Files that could not be used.", ("file", "reason"), rows, (1.5, 4))


def left_out_table(assessment: Assessment) -> Table:
    rows = tuple(
        (r.panel, hours(r.exposure_h), number(point.frequency_hz), point.reason)
        for r in assessment.readings
        for point in r.left_out
    )
    return Table(
        "Points left out of the evaluation, with the reasons. They stay in the campaign.",
        ("panel", "hours", "Hz", "reason"),
        rows,
        (1, 0.8, 0.9, 5),
        frozenset({1, 2}),
    )


def parameters_table(assessment: Assessment) -> Table:
    """The fitted parameters of the last reading of each panel that was fitted."""
    last = {r.panel_id: r for r in assessment.readings if r.fit is not None}
    rows = tuple(
        (
            r.panel,
            hours(r.exposure_h),
            r.fit.model_name if r.fit else "",
            p.symbol,
            amount(p.quantity),
            p.quantity.unit or NOTHING,
            p.meaning,
        )
        for r in last.values()
        for p in r.parameters
    )
    return Table(
        "Fitted parameters of the last fitted reading of each panel, with 95 % limits; those of "
        "all readings stand in the workbook and the data files.",
        ("panel", "hours", "circuit", "symbol", "value", "unit", "meaning"),
        rows,
        (0.9, 0.8, 1.7, 0.8, 2.3, 1.1, 2.2),
        frozenset({1}),
    )


def method_table() -> Table:
    data = tomllib.loads(resource("method.toml").read_text(encoding="utf-8"))
    rows = tuple((str(e["quantity"]), str(e["how"]), str(e["source"])) for e in data["entry"])
    return Table("How each number was obtained.", ("quantity", "how", "source"), rows, (1, 3, 2))


def settings_table(assessment: Assessment, campaign: Campaign) -> Table:
    settings = campaign.settings
    rows = [
        ("Temperature where neither reading nor panel has one", f"{settings.temperature_c:g} °C"),
        (
            "|Z|·A is given at",
            " and ".join(f"{f:g} Hz" for f in settings.modulus_frequencies_hz) or NOTHING,
        ),
        ("High frequency for the capacitance", f"{settings.capacitance_frequency_hz:g} Hz"),
        ("Mains frequency", f"{settings.mains_hz:g} Hz"),
        ("Leads taken away", "yes" if settings.take_leads_away else "no"),
    ]
    rows += [(f"Threshold {name}", f"{value:g}") for name, value in settings.thresholds]
    for limit in settings.criteria or default_criteria():
        words = f"|Z|·A below {number(limit.ohm_cm2)} Ω cm² at {limit.frequency_hz:g} Hz"
        own = "" if settings.criteria else " (the usual one; the campaign names none)"
        rows.append((f"Limit: {limit.name}", words + own))
    return Table("Settings of the campaign.", ("setting", "value"), tuple(rows), (2, 3))


def provenance_table(assessment: Assessment, campaign: Campaign) -> Table:
    rows = [
        (
            r.panel,
            hours(r.exposure_h),
            r.file,
            r.sha256,
            r.fit.model_name if r.fit else NOTHING,
            f"{r.points_used} of {r.points_read}",
        )
        for r in assessment.readings
    ]
    if campaign.open_lead_source is not None:
        source = campaign.open_lead_source
        rows.append(("open leads", NOTHING, source.file, source.sha256, NOTHING, NOTHING))
    return Table(
        "Where each reading came from: file, its SHA-256, the circuit, points used.",
        ("panel", "hours", "file", "SHA-256", "circuit", "points"),
        tuple(rows),
        (0.9, 0.8, 1.8, 3.4, 1.5, 1),
        frozenset({1}),
    )
