"""What a campaign must be like, and the difference between two states of one.

An operation is made by comparing the campaign as it is with the campaign as it should become.
Records that are the same object in both are passed over, so that a small edit of a large campaign
stays cheap.
"""

from __future__ import annotations

import json
from collections import Counter
from collections.abc import Callable, Iterable, Iterator, Mapping
from dataclasses import is_dataclass
from typing import Any

from coatgui.campaign import photographs, rows, rows_seen, schema
from coatgui.campaign.changes import Operation, Row, RowChange
from coatgui.campaign.demands import (
    finite,
    named,
    no_long_texts,
    not_negative,
    positive,
    right_types,
)
from coatgui.campaign.errors import OperationRefused
from coatgui.campaign.rules_asked import refuse_unsound_presets, refuse_unsound_questions
from coatgui.records import (
    Campaign,
    Formulation,
    Identification,
    Panel,
    Photograph,
    Rating,
    Reading,
    Settings,
    Spectrum,
)


def operation(
    name: str, before: Campaign, after: Campaign, raw: Mapping[str, bytes] | None = None
) -> Operation:
    """The operation that makes `after` of `before`; `raw` holds files that new rows refer to.

    Both must be the same campaign, with the records that stay in their order and new ones at the
    end. Raises OperationRefused where `after` is not a sound campaign.
    """
    changes: list[RowChange] = []
    spectra: dict[str, Spectrum] = {}
    tables_before, tables_after = _tables(before), _tables(after)
    for table, taken in tables_after.items():
        if _is_untouched(table, before, after):
            continue
        records, were = taken(), tables_before[table]()
        changes += [
            RowChange(table, key, _ROW[table](key, record), None)
            for key, record in were.items()
            if key not in records
        ]
        for key, record in records.items():
            was = were.get(key)
            if record is was:
                continue
            refuse_unsound(table, record)
            changes += change_of(table, key, was, record)
            for spectrum in new_spectra(was, record):
                spectra[spectrum.content_key()] = spectrum
    touched = {change.table for change in changes}
    if not any(change.table == "panels" and change.after is None for change in changes):
        # Only a panel that goes away could leave something behind without a panel.
        touched.add(_PANELS_STAY)
    _refuse_clashes(after, touched)
    return Operation(name, tuple(changes), tuple(spectra.values()), dict(raw or {}))


def change_of(table: str, key: str, was: Any, record: Any) -> list[RowChange]:
    """The change of a row, new where `was` is None, in the columns that differ; none where nothing
    does."""
    after = _ROW[table](key, record)
    if was is None:
        return [RowChange(table, key, None, after)]
    before = _ROW[table](key, was)
    differing = [column for column in after if after[column] != before[column]]
    if not differing:
        return []
    return [
        RowChange(table, key, {c: before[c] for c in differing}, {c: after[c] for c in differing})
    ]


def all_rows(campaign: Campaign) -> Iterator[tuple[str, Row]]:
    """Every row of a campaign, with its table. Raises OperationRefused where the campaign is not
    sound."""
    tables = _tables(campaign)
    _refuse_clashes(campaign, set(tables))
    for table, taken in tables.items():
        for key, record in taken().items():
            refuse_unsound(table, record)
            yield table, _ROW[table](key, record)


def all_spectra(campaign: Campaign) -> Iterator[Spectrum]:
    """Every spectrum of a campaign once."""
    spectra = [reading.spectrum for reading in campaign.readings]
    if campaign.open_lead is not None:
        spectra.append(campaign.open_lead)
    yield from {spectrum.content_key(): spectrum for spectrum in spectra}.values()


# ---------------------------------------------------------------------------------------------
# A campaign as tables of records, each under the key it has in the file


# Said beside the touched tables where no panel goes away.
_PANELS_STAY = "panels stay"


def _is_untouched(table: str, before: Campaign, after: Campaign) -> bool:
    """Whether both hold the very same tuple of a table's records: a small edit of a large campaign
    then need not look at them."""
    return table in schema.ORDERED and getattr(before, table) is getattr(after, table)


def _tables(campaign: Campaign) -> dict[str, Callable[[], dict[str, Any]]]:
    key = campaign.campaign_id
    open_lead = (campaign.open_lead, campaign.open_lead_source)
    return {
        "campaign": lambda: {key: (campaign.title, campaign.remark, campaign.identification)},
        "settings": lambda: {key: campaign.settings},
        "formulations": lambda: {f.formulation_id: f for f in campaign.formulations},
        "panels": lambda: {p.panel_id: p for p in campaign.panels},
        "readings": lambda: {r.reading_id: r for r in campaign.readings},
        "open_lead": lambda: {} if campaign.open_lead is None else {key: open_lead},
        "refused": lambda: {rows.refusal_key(r): r for r in campaign.refused},
        "ratings": lambda: {r.rating_id: r for r in campaign.ratings},
        "photographs": lambda: {p.photograph_id: p for p in campaign.photographs},
    }


_ROW: dict[str, Callable[[str, Any], Row]] = {
    "campaign": lambda key, facts: rows.campaign_row(key, *facts),
    "settings": rows.settings_row,
    "formulations": lambda _, formulation: rows.formulation_row(formulation),
    "panels": lambda _, panel: rows.panel_row(panel),
    "readings": lambda _, reading: rows.reading_row(reading),
    "open_lead": lambda key, run: rows.open_lead_row(key, *run),
    "refused": lambda _, refusal: rows.refusal_row(refusal),
    "ratings": lambda _, rating: rows_seen.rating_row(rating),
    "photographs": lambda _, photograph: rows_seen.photograph_row(photograph),
}


def new_spectra(was: Any, record: Any) -> tuple[Spectrum, ...]:
    """The spectra of a record that it did not have before."""
    there = _spectra_in(was)
    return tuple(spectrum for spectrum in _spectra_in(record) if spectrum not in there)


def _spectra_in(record: Any) -> tuple[Spectrum, ...]:
    if isinstance(record, Reading):
        return (record.spectrum,)
    if isinstance(record, tuple) and isinstance(record[0], Spectrum):
        return (record[0],)
    return ()


# ---------------------------------------------------------------------------------------------
# Rules for one record


def refuse_unsound(table: str, record: Any) -> None:
    """Raises OperationRefused where a record breaks a rule of its own."""
    if is_dataclass(record):
        right_types(record)
    if table == "campaign":
        named(record[0], "A campaign", "title")
        no_long_texts(record)
        _refuse_wrong_identification(record[2])
    elif isinstance(record, Settings):
        _refuse_unsound_settings(record)
    elif isinstance(record, Formulation):
        named(record.name, "A formulation")
    elif isinstance(record, Panel):
        _refuse_unsound_panel(record)
    elif isinstance(record, Reading):
        _refuse_unsound_reading(record)
    elif isinstance(record, Rating):
        _refuse_unsound_rating(record)
    elif isinstance(record, Photograph):
        _refuse_unsound_photograph(record)


def _refuse_wrong_identification(identification: Identification) -> None:
    right_types(identification)
    no_long_texts(identification.standards)
    if not all(isinstance(name, str) and name.strip() for name in identification.standards):
        raise OperationRefused("A standard needs a name that is not empty.")


def _refuse_unsound_rating(rating: Rating) -> None:
    seen = rating.seen
    right_types(seen)
    named(seen.scale, "A rating", "scale")
    named(seen.value, "A rating", "grade")
    not_negative(seen.exposure_h, "The exposure time of a rating in h")


def _refuse_unsound_photograph(photograph: Photograph) -> None:
    if photograph.exposure_h is not None:
        not_negative(photograph.exposure_h, "The exposure time of a photograph in h")
    if photograph.media_type not in photographs.MEDIA_TYPES:
        raise OperationRefused(f"A photograph cannot be of the type {photograph.media_type!r}.")
    if photograph.file != photographs.plain_name(photograph.file):
        raise OperationRefused("The file name of a photograph cannot name a folder.")


def _refuse_unsound_panel(panel: Panel) -> None:
    named(panel.name, "A panel")
    positive(panel.area_cm2, f"The area of panel {panel.name} in cm²")
    positive(panel.thickness_um, f"The film thickness of panel {panel.name} in µm")


def _refuse_unsound_reading(reading: Reading) -> None:
    what = f"the reading from {reading.source.file}"
    if reading.exposure_h < 0:
        raise OperationRefused(
            f"The exposure time of {what} must be 0 h or more, not {reading.exposure_h:g} h."
        )
    points = [point for point, _ in reading.left_out]
    if not all(0 <= point < len(reading.spectrum) for point in (*points, *reading.kept_in)):
        raise OperationRefused(f"The spectrum of {what} does not have all of these points.")
    if not all(reason.strip() for _, reason in reading.left_out):
        raise OperationRefused("Points can only be left out with a reason: please give one.")


def _refuse_unsound_settings(settings: Settings) -> None:
    positive(settings.capacitance_frequency_hz, "The frequency for the capacitance in Hz")
    positive(settings.mains_hz, "The mains frequency in Hz")
    for frequency in settings.modulus_frequencies_hz:
        positive(frequency, "A frequency for the modulus in Hz")
    for criterion in settings.criteria:
        right_types(criterion)
        named(criterion.name, "A criterion")
        positive(criterion.frequency_hz, f"The frequency of criterion {criterion.name} in Hz")
        positive(criterion.ohm_cm2, f"The limit of criterion {criterion.name} in Ω cm²")
    for name, value in settings.thresholds:
        finite(value, f"The threshold {name}")
    positive(settings.input_resistance_ohm, "The resistance of the instrument's input in Ω")
    positive(settings.input_capacitance_f, "The capacitance of the instrument's input in F")
    refuse_unsound_questions(settings)
    refuse_unsound_presets(settings)
    names = [_model_id(text) for text in settings.own_models]
    _once(names, "coating model", "the id")


def _model_id(text: str) -> str:
    """The id of a coating model of a person's own. What it describes is `circuits`' to judge."""
    try:
        model = json.loads(text)
        name = model["id"]
    except (ValueError, TypeError, KeyError, RecursionError):
        raise OperationRefused(
            "A coating model must be a JSON object with an id, a name and its layers."
        ) from None
    if not isinstance(model, dict) or not isinstance(name, str) or not name.strip():
        raise OperationRefused("A coating model needs an id that is not empty.")
    return name


# ---------------------------------------------------------------------------------------------
# Rules between records


def _refuse_clashes(campaign: Campaign, touched: set[str]) -> None:
    """Names and ids that may occur once only, and ids that must exist."""
    formulations = {f.formulation_id for f in campaign.formulations}
    panels = {p.panel_id for p in campaign.panels}
    if "formulations" in touched:
        _once((f.name for f in campaign.formulations), "formulation", "the name")
        _once((f.formulation_id for f in campaign.formulations), "formulation", "the id")
    if "panels" in touched:
        _once((p.name for p in campaign.panels), "panel", "the name")
        _once((p.panel_id for p in campaign.panels), "panel", "the id")
    if touched & {"panels", "formulations"}:
        for panel in campaign.panels:
            if panel.formulation_id not in formulations:
                raise OperationRefused(f"Panel {panel.name} needs a formulation that exists.")
    leaving = set() if _PANELS_STAY in touched else {"panels"}
    if touched & {"readings", *leaving}:
        for reading in campaign.readings:
            if reading.panel_id not in panels:
                raise OperationRefused(
                    f"The reading from {reading.source.file} needs a panel that exists."
                )
    if touched & {"ratings", *leaving}:
        for rating in campaign.ratings:
            if rating.seen.panel_id not in panels:
                raise OperationRefused("A rating needs a panel that exists.")
    if touched & {"photographs", *leaving}:
        for photograph in campaign.photographs:
            if photograph.panel_id not in panels:
                raise OperationRefused("A photograph needs a panel that exists.")
    if "ratings" in touched:
        _once((r.rating_id for r in campaign.ratings), "rating", "the id")
    if "photographs" in touched:
        _once((p.photograph_id for p in campaign.photographs), "photograph", "the id")
    if "readings" in touched:
        _once((r.reading_id for r in campaign.readings), "reading", "the id")


def _once(values: Iterable[str], what: str, fact: str) -> None:
    for value, times in Counter(values).items():
        if times > 1:
            raise OperationRefused(
                f"There is already a {what} with {fact} '{value}': please choose another."
            )
