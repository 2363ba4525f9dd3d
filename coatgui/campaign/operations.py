"""What a person can do to a campaign, one function for each.

Each takes the campaign as it is first and gives back the operation, for `CampaignFile.apply`; the
campaign itself is not touched. Each raises OperationRefused, with one sentence, where the campaign
cannot take it: an id it does not have, an empty or taken name, a number that makes no sense.
"""

from __future__ import annotations

from collections.abc import Collection, Iterable, Mapping
from dataclasses import fields as fields_of
from dataclasses import replace
from typing import Any, TypeVar

import numpy as np

from coatgui.campaign.build import gather, new_id, panel_by_name
from coatgui.campaign.changes import Operation
from coatgui.campaign.errors import OperationRefused
from coatgui.campaign.inspections import add_photograph as add_photograph
from coatgui.campaign.inspections import add_ratings as add_ratings
from coatgui.campaign.inspections import edit_photograph as edit_photograph
from coatgui.campaign.inspections import edit_rating as edit_rating
from coatgui.campaign.inspections import identify as identify
from coatgui.campaign.inspections import photograph_reading as photograph_reading
from coatgui.campaign.inspections import rate_reading as rate_reading
from coatgui.campaign.inspections import remove_photograph as remove_photograph
from coatgui.campaign.inspections import remove_ratings as remove_ratings
from coatgui.campaign.inspections import without_panel
from coatgui.campaign.lookup import formulation_of, panel_of, reading_of
from coatgui.campaign.replacing import replacing, swap
from coatgui.campaign.rules import operation
from coatgui.records import (
    Campaign,
    Formulation,
    Found,
    FoundReading,
    Panel,
    Reading,
    Refusal,
    Settings,
    Source,
    Spectrum,
)

Record = TypeVar("Record", Formulation, Panel, Reading, Settings)

# How a field is called in the name of an operation.
_WORDS = {
    "name": "name",
    "formulation_id": "formulation",
    "panel_id": "panel",
    "area_cm2": "area",
    "thickness_um": "film thickness",
    "substrate": "substrate",
    "electrolyte": "electrolyte",
    "temperature_c": "temperature",
    "regime": "exposure regime",
    "remark": "remark",
    "notes": "notes",
    "exposure_h": "exposure time",
    "amplitude_mv": "amplitude",
    "potential_mv": "potential",
    "temperature_span_c": "temperature within the sweep",
    "potential_span_mv": "potential within the sweep",
    "modulus_frequencies_hz": "frequencies for the modulus",
    "capacitance_frequency_hz": "frequency for the capacitance",
    "mains_hz": "mains frequency",
    "criteria": "criteria",
    "thresholds": "thresholds",
    "input_resistance_ohm": "resistance of the instrument's input",
    "input_capacitance_f": "capacitance of the instrument's input",
    "take_leads_away": "correction for the leads",
    "own_models": "coating models",
    "limits": "limits",
    "comparisons": "comparisons",
    "projections": "projections",
    "electrolytes": "electrolytes",
    "regimes": "exposure regimes",
    "uptake_from_high_frequency": "capacitance for the water uptake",
}

# ---------------------------------------------------------------------------------------------
# The campaign


def import_found(campaign: Campaign, found: Found) -> Operation:
    """Add what intake found. Readings that are present already are counted in the name, corrected
    exports take the place of what they correct, and panel facts that contradict what is known are
    noted under `refused`."""
    gathered = gather(campaign, found)
    after = gathered.campaign
    settled = sum(r not in after.refused for r in campaign.refused)
    counts = (
        (gathered.count("new"), "reading"),
        (gathered.count("replaces"), "corrected reading"),
        (len(after.panels) - len(campaign.panels), "panel"),
        (len(after.ratings) - len(campaign.ratings), "rating"),
        (int(after.open_lead is not campaign.open_lead), "open-lead run"),
        (len(after.refused) + settled - len(campaign.refused), "refusal"),
    )
    added = [_count(number, what) for number, what in counts if number]
    name = f"Import {_listed(added)}" if added else "Import panel facts"
    present = gathered.count("present")
    if present:
        name += f"; {_count(present, 'reading')} there already"
    made = operation(name, campaign, after, found.raw)
    if not made.changes:
        there = f"; {_count(present, 'reading')} there already" if present else ""
        return replace(made, name=f"Nothing new{there}")
    return made


def rename_campaign(campaign: Campaign, title: str) -> Operation:
    return operation(
        f"Rename the campaign to {title.strip()}", campaign, replace(campaign, title=title.strip())
    )


def edit_campaign_remark(campaign: Campaign, remark: str) -> Operation:
    return operation("Change the campaign's remark", campaign, replace(campaign, remark=remark))


def edit_settings(campaign: Campaign, **fields: Any) -> Operation:
    """Change fields of `Settings`, by name."""
    settings, words = _with(campaign.settings, fields, ())
    return operation(f"Set {words}", campaign, replace(campaign, settings=settings))


def set_open_lead(
    campaign: Campaign, spectrum: Spectrum | None, source: Source | None, raw: bytes | None = None
) -> Operation:
    """Put another open-lead run in place of the present one, or none; `raw` is its file."""
    after = replace(
        campaign, open_lead=spectrum, open_lead_source=None if spectrum is None else source
    )
    files = {} if raw is None or source is None else {source.sha256: raw}
    name = "Remove the open-lead run" if spectrum is None else "Set the open-lead run"
    return operation(name, campaign, after, files)


def dismiss_refusals(campaign: Campaign, refusals: Collection[Refusal]) -> Operation:
    """Take refusals off the list once they have been dealt with; the history keeps them."""
    left = tuple(r for r in campaign.refused if r not in refusals)
    number = len(campaign.refused) - len(left)
    return operation(
        f"Dismiss {_count(number, 'refusal')}", campaign, replace(campaign, refused=left)
    )


# ---------------------------------------------------------------------------------------------
# Formulations


def add_formulation(campaign: Campaign, name: str, remark: str = "") -> Operation:
    made = Formulation(new_id(), name.strip(), remark)
    after = replace(campaign, formulations=(*campaign.formulations, made))
    return operation(f"Add formulation {made.name}", campaign, after)


def rename_formulation(campaign: Campaign, formulation_id: str, name: str) -> Operation:
    """A comparison that takes it as its reference goes with the new name."""
    formulation = formulation_of(campaign, formulation_id)
    changed = replace(formulation, name=name.strip())
    after = replace(campaign, formulations=swap(campaign.formulations, [(formulation, changed)]))
    asked = campaign.settings.comparisons
    if any(question.reference == formulation.name for question in asked):
        renamed = tuple(
            replace(q, reference=changed.name) if q.reference == formulation.name else q
            for q in asked
        )
        after = replace(after, settings=replace(campaign.settings, comparisons=renamed))
    return operation(f"Rename formulation {formulation.name} to {changed.name}", campaign, after)


def edit_formulation_remark(campaign: Campaign, formulation_id: str, remark: str) -> Operation:
    formulation = formulation_of(campaign, formulation_id)
    changed = replace(formulation, remark=remark)
    name = f"Change the remark of formulation {formulation.name}"
    return replacing(name, campaign, [(formulation, changed)])


def remove_formulation(campaign: Campaign, formulation_id: str) -> Operation:
    """Only one without panels can go."""
    formulation = formulation_of(campaign, formulation_id)
    if any(panel.formulation_id == formulation_id for panel in campaign.panels):
        raise OperationRefused(
            f"Formulation {formulation.name} still has panels: move or remove them first."
        )
    left = tuple(f for f in campaign.formulations if f is not formulation)
    return operation(
        f"Remove formulation {formulation.name}", campaign, replace(campaign, formulations=left)
    )


# ---------------------------------------------------------------------------------------------
# Panels


def add_panel(campaign: Campaign, name: str, formulation_id: str, **fields: Any) -> Operation:
    """A new panel without readings; `fields` are further fields of `Panel`."""
    panel, _ = _with(Panel(new_id(), name.strip(), formulation_id), fields, ("panel_id",))
    return operation(
        f"Add panel {panel.name}", campaign, replace(campaign, panels=(*campaign.panels, panel))
    )


def edit_panel(campaign: Campaign, panel_id: str, **fields: Any) -> Operation:
    """Change fields of `Panel`, by name; None or an empty text says that a fact is not known."""
    panel = panel_of(campaign, panel_id)
    changed, words = _with(panel, fields, ("panel_id",))
    return replacing(f"Change {words} of panel {panel.name}", campaign, [(panel, changed)])


def edit_panels(campaign: Campaign, panel_ids: Iterable[str], **fields: Any) -> Operation:
    """Change the same fields of several panels, such as those an exposure regime fills in."""
    chosen = [panel_of(campaign, panel_id) for panel_id in dict.fromkeys(panel_ids)]
    if not chosen:
        raise OperationRefused("Choose at least one panel to change.")
    changed = [(panel, _with(panel, fields, ("panel_id", "name"))[0]) for panel in chosen]
    words = _listed([_WORDS.get(name, name) for name in fields])
    return replacing(f"Change {words} of {_count(len(chosen), 'panel')}", campaign, changed)


def move_panel(campaign: Campaign, panel_id: str, formulation_id: str) -> Operation:
    panel, formulation = panel_of(campaign, panel_id), formulation_of(campaign, formulation_id)
    changed = replace(panel, formulation_id=formulation_id)
    name = f"Move panel {panel.name} to {formulation.name}"
    return replacing(name, campaign, [(panel, changed)])


def remove_panel(campaign: Campaign, panel_id: str) -> Operation:
    """The panel goes with its readings, ratings and photographs."""
    panel = panel_of(campaign, panel_id)
    panels = tuple(p for p in campaign.panels if p is not panel)
    readings = tuple(r for r in campaign.readings if r.panel_id != panel_id)
    number = len(campaign.readings) - len(readings)
    return operation(
        f"Remove panel {panel.name} with {_count(number, 'reading')}",
        campaign,
        replace(without_panel(campaign, panel_id), panels=panels, readings=readings),
    )


# ---------------------------------------------------------------------------------------------
# Readings


def edit_reading(campaign: Campaign, reading_id: str, **fields: Any) -> Operation:
    """Change a reading's panel, exposure time, temperature, amplitude, potential or remark."""
    reading = reading_of(campaign, reading_id)
    others = ("reading_id", "spectrum", "source", *_DECISIONS)
    changed, words = _with(reading, fields, others)
    return _on_readings(campaign, [(reading, changed)], f"Change {words} of")


# What a person decides about a reading has operations of its own.
_DECISIONS = ("left_out", "kept_in", "pinned_model", "overruled_because")


def read_again(campaign: Campaign, corrected: Mapping[str, FoundReading]) -> Operation:
    """Put another reading of the same stored bytes in place of readings, by their ids: columns,
    units or sign were corrected, or panel and time. `coatgui.intake.read_again` makes them. What
    was decided about points stays where the frequencies are the same."""
    after = campaign
    for reading_id, found in corrected.items():
        reading = reading_of(campaign, reading_id)
        if found.source.sha256 != reading.source.sha256:
            raise OperationRefused(
                f"The reading {_where(campaign, reading)} can only be read again from its own "
                "stored file: import another file instead."
            )
        after, panel_id = panel_by_name(after, found.panel)
        same_points = np.array_equal(found.spectrum.frequency_hz, reading.spectrum.frequency_hz)
        changed = replace(
            reading,
            panel_id=panel_id,
            exposure_h=float(found.exposure_h),
            spectrum=found.spectrum,
            source=found.source,
            left_out=reading.left_out if same_points else (),
            kept_in=reading.kept_in if same_points else (),
            temperature_span_c=found.temperature_span_c,
            potential_span_mv=found.potential_span_mv,
        )
        after = replace(after, readings=swap(after.readings, [(reading, changed)]))
    if not corrected:
        raise OperationRefused("Choose at least one reading to read again.")
    one = next(iter(corrected))
    what = (
        f"the reading {_where(campaign, reading_of(campaign, one))}"
        if len(corrected) == 1
        else f"{len(corrected)} readings"
    )
    return operation(f"Read {what} again, corrected", campaign, after)


def remove_reading(campaign: Campaign, reading_id: str) -> Operation:
    reading = reading_of(campaign, reading_id)
    left = tuple(r for r in campaign.readings if r is not reading)
    return operation(
        f"Remove the reading {_where(campaign, reading)}",
        campaign,
        replace(campaign, readings=left),
    )


def leave_out_points(
    campaign: Campaign, reading_id: str, points: Iterable[int], reason: str
) -> Operation:
    """Leave points out of everything that is computed, for a reason that is kept with them. A
    point that is left out already gets the new reason."""
    reading = reading_of(campaign, reading_id)
    chosen = _chosen(points)
    left_out = {**dict(reading.left_out), **dict.fromkeys(chosen, reason.strip())}
    changed = replace(
        reading,
        left_out=tuple(sorted(left_out.items())),
        kept_in=tuple(point for point in reading.kept_in if point not in chosen),
    )
    made = _on_readings(
        campaign, [(reading, changed)], f"Leave out {_count(len(chosen), 'point')} of"
    )
    return replace(made, reason=reason.strip())


def take_back_points(campaign: Campaign, reading_id: str, points: Iterable[int]) -> Operation:
    """Use points again, whoever left them out: what a person left out is taken back, and the
    points are kept in although the checks may suggest otherwise."""
    reading = reading_of(campaign, reading_id)
    chosen = _chosen(points)
    changed = replace(
        reading,
        left_out=tuple(pair for pair in reading.left_out if pair[0] not in chosen),
        kept_in=tuple(sorted({*reading.kept_in, *chosen})),
    )
    return _on_readings(
        campaign, [(reading, changed)], f"Take back {_count(len(chosen), 'point')} of"
    )


def pin_model(campaign: Campaign, reading_ids: Iterable[str], model_id: str) -> Operation:
    """Insist on a coating model for these readings; "" leaves the choice to the program again."""
    readings = [reading_of(campaign, reading_id) for reading_id in dict.fromkeys(reading_ids)]
    if not readings:
        raise OperationRefused("Choose at least one reading to set the model of.")
    changed = [(reading, replace(reading, pinned_model=model_id)) for reading in readings]
    return _on_readings(
        campaign, changed, "Set the model of" if model_id else "Let the program choose the model of"
    )


def overrule(campaign: Campaign, reading_id: str, reason: str) -> Operation:
    """Use a rejected reading all the same, for a reason; "" lets the rejection stand again."""
    reading = reading_of(campaign, reading_id)
    changed = replace(reading, overruled_because=reason.strip())
    words = "Overrule the rejection of" if changed.overruled_because else "Accept the rejection of"
    made = _on_readings(campaign, [(reading, changed)], words)
    return replace(made, reason=changed.overruled_because)


def _on_readings(
    campaign: Campaign, changed: list[tuple[Reading, Reading]], words: str
) -> Operation:
    if len(changed) == 1:
        name = f"{words} the reading {_where(campaign, changed[0][0])}"
    else:
        name = f"{words} {len(changed)} readings"
    return replacing(name, campaign, changed)


# ---------------------------------------------------------------------------------------------
# Changing records


def _with(record: Record, fields: dict[str, Any], fixed: tuple[str, ...]) -> tuple[Record, str]:
    """The record with fields changed, and those that really differ in words."""
    known = {field.name for field in fields_of(record)} - set(fixed)
    for name in fields:
        if name not in known:
            raise OperationRefused(f"'{name}' cannot be changed here.")
    changed = replace(record, **{name: _tidy(name, value) for name, value in fields.items()})
    differing = [name for name in fields if getattr(changed, name) != getattr(record, name)]
    return changed, _listed([_WORDS.get(name, name.replace("_", " ")) for name in differing])


def _tidy(name: str, value: Any) -> Any:
    """A value as the records hold it: whole numbers as floats, lists as tuples, texts trimmed."""
    if isinstance(value, str):
        return value if name == "remark" else value.strip()
    if isinstance(value, int) and not isinstance(value, bool):
        return float(value)
    if isinstance(value, list | tuple):
        return tuple(_tidy("", item) for item in value)
    return value


def _chosen(points: Iterable[int]) -> dict[int, None]:
    chosen = dict.fromkeys(sorted(int(point) for point in points))
    if not chosen:
        raise OperationRefused("Choose at least one point.")
    return chosen


def _where(campaign: Campaign, reading: Reading) -> str:
    return f"of {panel_of(campaign, reading.panel_id).name} at {reading.exposure_h:g} h"


def _count(number: int, what: str) -> str:
    return f"{number} {what}" if number == 1 else f"{number} {what}s"


def _listed(parts: list[str]) -> str:
    return " and ".join([", ".join(parts[:-1]), parts[-1]] if len(parts) > 1 else parts)
