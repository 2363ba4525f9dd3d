"""The inspection summary: one document, built from an assessment, for every way it is handed over.

It says what was found and no more: a bound is said as a bound, what cannot be told apart is not
ranked, and what is not known is named or left out.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass, fields

from coatgui import __version__
from coatgui.assessment.cautions import cautions
from coatgui.assessment.rules import table
from coatgui.assessment.words import counted, listed
from coatgui.output.document import (
    Block,
    Document,
    Figure,
    Heading,
    Listing,
    Paragraph,
    Style,
    Table,
)
from coatgui.output.figures import all_figures, course_figures
from coatgui.output.summary_facts import topics
from coatgui.output.summary_seen import pictures, rated_table
from coatgui.output.summary_tables import (
    criteria_table,
    findings_table,
    left_out_table,
    method_table,
    pairs_table,
    panels_table,
    parameters_table,
    provenance_table,
    ratings_table,
    readings_table,
    refused_table,
    settings_table,
    studies_table,
    water_table,
)
from coatgui.records import Assessment, Bound, Campaign


@dataclass(frozen=True, slots=True)
class Identification:
    """Who tested what for whom, as fields for people to fill in. An empty one is left out."""

    laboratory: str = ""
    customer: str = ""
    order: str = ""
    author: str = ""
    reviewer: str = ""
    date: str = ""
    standards: str = ""

    @classmethod
    def of(cls, campaign: Campaign, **fields: str) -> Identification:
        """What the campaign keeps; `fields` that are not empty take its place."""
        kept = campaign.identification
        known = {
            "laboratory": kept.laboratory,
            "customer": kept.customer,
            "order": kept.order,
            "author": kept.author,
            "reviewer": kept.reviewer,
            "standards": "; ".join(kept.standards),
        }
        return cls(**{**known, **{name: text for name, text in fields.items() if text}})

    def rows(self) -> tuple[tuple[str, str], ...]:
        filled = ((field.name.capitalize(), getattr(self, field.name)) for field in fields(self))
        return tuple((name, text) for name, text in filled if text.strip())


def sentence(name: str) -> str:
    """A fixed sentence of `resources/report.toml`."""
    return str(table("report")["sentences"][name])


def inspection_summary(
    assessment: Assessment,
    campaign: Campaign,
    identification: Identification | None = None,
    photographs: Mapping[str, bytes] | None = None,
) -> Document:
    """The summary of an assessment, by default under the names that the campaign keeps.
    `photographs` are the bytes of the campaign's photographs by their SHA-256. The same assessment
    gives the same document."""
    identification = identification or Identification.of(campaign)
    figures = {figure.name: figure for figure in all_figures(assessment, campaign)}
    sections: list[tuple[str, Iterator[Block]]] = [
        ("Identification", _identification(identification)),
        ("What was found", _found(assessment)),
        ("What was tested, and how", _tested(assessment, campaign)),
        ("Where the campaign stands", _map(assessment, figures)),
        ("Courses over exposure time", _courses(assessment, figures)),
        ("Water in the film", _water(assessment, figures)),
        ("Comparison of formulations", _comparison(assessment, figures)),
        ("Limits", _limits(assessment)),
        ("Visual ratings and photographs", _seen(assessment, campaign, photographs or {})),
        ("Deviations and doubts", _doubts(assessment)),
        ("Points left out", _left_out(assessment)),
        ("Readings, spectra and circuits", _spectra(assessment, figures)),
        ("Method and sources", _method(assessment, campaign)),
        ("Cautions", iter([Listing(assessment.cautions or cautions(), numbered=True)])),
        ("Provenance", _provenance(assessment, campaign)),
    ]
    blocks: list[Block] = []
    for title, content in sections:
        own = list(content)
        if own:
            blocks += [Heading(title), *own]
    title = f"Inspection summary: {assessment.title}" if assessment.title else "Inspection summary"
    running = " · ".join(
        t for t in (assessment.title, identification.order, identification.laboratory) if t
    )
    subject = assessment.headline or "Coated test panels followed with impedance spectra"
    return Document(title, running, identification.author, subject, tuple(blocks))


# ---------------------------------------------------------------------------------------------
# Sections; one without blocks is left out


def _identification(identification: Identification) -> Iterator[Block]:
    rows = identification.rows()
    if rows:
        yield Table("What this summary belongs to.", ("field", "entry"), rows, (1, 3))
    if identification.standards:
        yield Paragraph(sentence("no_standard"), Style.SMALL)


def _found(assessment: Assessment) -> Iterator[Block]:
    if assessment.headline:
        yield Paragraph(assessment.headline, Style.LEAD)
    if not assessment.readings:
        yield Paragraph(sentence("no_readings"))
        return
    yield Paragraph(_compared(assessment))
    said = [f"{f.formulation}: {f.text}" for f in assessment.formulations if f.text]
    said += [study.text for study in assessment.limit_studies]
    if said:
        yield Listing(tuple(said))
    panels = []
    for panel in assessment.panels:
        words = [event.text for event in panel.events]
        words += [c.text for c in panel.limit_crossings if c.by_h is not None]
        if words:
            panels.append(f"Panel {panel.panel}: {' '.join(words)}")
    yield Heading("Panel by panel", 2)
    yield Listing(tuple(panels)) if panels else Paragraph(sentence("no_events"))
    bounds = _bounds(assessment)
    if bounds:
        yield Paragraph(bounds, Style.SMALL)
    if assessment.next_inspection is not None and assessment.next_inspection.text:
        yield Heading("What to measure next", 2)
        yield Paragraph(assessment.next_inspection.text)


def _compared(assessment: Assessment) -> str:
    if len(assessment.formulations) == 1:
        return sentence("one_formulation")
    if not assessment.ranking:
        return f"{assessment.ranking_text} {sentence('too_few')}".strip()
    shared = [rank for rank in assessment.ranking if rank.rank_low != rank.rank_high]
    return f"{assessment.ranking_text} {sentence('no_separation') if shared else ''}".strip()


def _bounds(assessment: Assessment) -> str:
    kinds = {
        quantity.bound
        for reading in assessment.readings
        for quantity in (
            reading.pore_resistance,
            reading.coating_capacitance,
            *(m.quantity for m in reading.modulus),
            *(p.quantity for p in reading.parameters),
        )
        if quantity is not None
    }
    said = []
    if kinds & {Bound.AT_LEAST, Bound.AT_MOST}:
        said.append(sentence("censored"))
    if Bound.UNDETERMINED in kinds:
        said.append(sentence("undetermined"))
    return " ".join(said)


def _tested(assessment: Assessment, campaign: Campaign) -> Iterator[Block]:
    if assessment.panels:
        yield panels_table(assessment, campaign)
    for formulation in assessment.formulations:
        if formulation.panels < 3:
            yield Paragraph(f"{formulation.formulation} {sentence('few_panels')}")
    without = [panel.panel for panel in assessment.panels if panel.area_cm2 is None]
    if without:
        noun = "Panel" if len(without) == 1 else "Each of the panels"
        yield Paragraph(f"{noun} {listed(without)} {sentence('no_area')}")
    yield topics(assessment, campaign)
    yield Paragraph(sentence("no_standard"), Style.SMALL)


def _map(assessment: Assessment, figures: dict[str, Figure]) -> Iterator[Block]:
    yield from (figure for name, figure in figures.items() if name.startswith("map_"))
    bounds = _bounds(assessment)
    if bounds:
        yield Paragraph(bounds, Style.SMALL)


def _courses(assessment: Assessment, figures: dict[str, Figure]) -> Iterator[Block]:
    codes = [figure.name for figure in course_figures(assessment)]
    yield from (figures[code] for code in codes if code != "water_uptake")
    trends = tuple(t.text for t in assessment.trends)
    if trends:
        yield Heading("Trends", 2)
        yield Listing(trends)
    projections = tuple(p.text for p in assessment.projections)
    if projections:
        yield Heading("Projections that were asked for", 2)
        yield Listing(projections)


def _water(assessment: Assessment, figures: dict[str, Figure]) -> Iterator[Block]:
    if not assessment.readings:
        return
    if "water_uptake" not in figures:
        yield Paragraph(sentence("no_uptake"))
        return
    yield Paragraph(sentence("uptake"))
    yield figures["water_uptake"]
    yield water_table(assessment)


def _comparison(assessment: Assessment, figures: dict[str, Figure]) -> Iterator[Block]:
    if not assessment.readings:
        return
    yield Paragraph(_compared(assessment))
    if "comparison" in figures:
        yield figures["comparison"]
    everything = [assessment.comparison, *assessment.further_comparisons]
    for comparison in everything:
        if comparison is None:
            continue
        if comparison is not assessment.comparison:
            yield Heading(comparison.what, 2)
            yield Paragraph(comparison.text)
        if comparison.pairs:
            yield pairs_table(comparison)
        if comparison.effort:
            yield Listing(comparison.effort)


def _limits(assessment: Assessment) -> Iterator[Block]:
    crossings = [c for panel in assessment.panels for c in panel.limit_crossings]
    if not crossings:
        if assessment.readings:
            yield Paragraph(sentence("no_limits"))
        return
    yield criteria_table(assessment)
    if assessment.limit_studies:
        yield studies_table(assessment)


def _seen(
    assessment: Assessment, campaign: Campaign, photographs: Mapping[str, bytes]
) -> Iterator[Block]:
    if assessment.ratings:
        yield Paragraph(sentence("ratings"))
        yield ratings_table(assessment)
        if campaign.ratings:
            yield rated_table(campaign)
        if assessment.rating_correlations:
            yield Listing(tuple(c.text for c in assessment.rating_correlations))
    if not campaign.photographs:
        return
    yield Heading("Photographs", 2)
    shown, missing = pictures(campaign, photographs)
    yield from shown
    if missing:
        is_one = missing == 1
        yield Paragraph(
            f"{counted(missing, 'photograph')} {'is' if is_one else 'are'} not shown here; the "
            f"campaign file keeps {'it' if is_one else 'them'}.",
            Style.SMALL,
        )


def _doubts(assessment: Assessment) -> Iterator[Block]:
    shown = findings_table(assessment)
    if shown.rows:
        yield Paragraph(sentence("weighing"))
        yield shown
    elif assessment.readings:
        yield Paragraph(sentence("no_doubts"))
    if assessment.refused:
        yield refused_table(assessment)


def _left_out(assessment: Assessment) -> Iterator[Block]:
    if not assessment.readings:
        return
    shown = left_out_table(assessment)
    yield shown if shown.rows else Paragraph(sentence("no_left_out"))


def _spectra(assessment: Assessment, figures: dict[str, Figure]) -> Iterator[Block]:
    if assessment.readings:
        yield readings_table(assessment)
    own = [figure for name, figure in figures.items() if name.startswith("spectra_")]
    yield from own
    if own and len(own) < len(assessment.panels):
        yield Paragraph(
            f"Spectra are drawn for the first {counted(len(own), 'panel')} only; the workbook "
            "and the campaign hold all of them.",
            Style.SMALL,
        )
    shown = parameters_table(assessment)
    if shown.rows:
        yield shown


def _method(assessment: Assessment, campaign: Campaign) -> Iterator[Block]:
    yield method_table()
    yield settings_table(assessment, campaign)


def _provenance(assessment: Assessment, campaign: Campaign) -> Iterator[Block]:
    yield Paragraph(f"Computed by coatgui {__version__}.")
    if assessment.readings or campaign.open_lead_source is not None:
        yield provenance_table(assessment, campaign)
