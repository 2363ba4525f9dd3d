"""From what intake found to records of a campaign, whether it is new or has run for weeks.

Facts that a panel list gives fill what is not known yet. Where they contradict what is known,
what is known stays, and the contradiction is put on the list of refusals for a person to settle.

A reading is recognised by the SHA-256 of its file and its part of it: brought in once more it is
counted and otherwise passed over. A file with other bytes for the panel and time of a reading that
is there is a corrected export: it takes that reading's place. The reading's remark says so, the
bytes and the spectrum from before stay in the campaign file, and undo brings them back.
"""

from __future__ import annotations

import math
import secrets
from collections.abc import Collection, Iterable
from dataclasses import dataclass, replace
from typing import Any

from coatgui.records import (
    Campaign,
    Formulation,
    Found,
    FoundPanel,
    FoundRating,
    FoundReading,
    Panel,
    Rating,
    Reading,
    Refusal,
    Settings,
    Source,
    Spectrum,
    VisualRating,
)

UNASSIGNED = "Unassigned"
"""The formulation of panels of which no formulation is known."""

PANEL_LIST = "panels.csv"
# The facts of a panel that a list may give, and how they are called.
_FACTS = {
    "area_cm2": "area in cm²",
    "thickness_um": "film thickness in µm",
    "substrate": "substrate",
    "electrolyte": "electrolyte",
    "temperature_c": "temperature in °C",
    "regime": "exposure regime",
    "remark": "remark",
}
_POSITIVE = ("area_cm2", "thickness_um")


def new_id() -> str:
    """A random id, for a record to be known by for good."""
    return secrets.token_hex(8)


def campaign_from_found(found: Found, title: str, settings: Settings | None = None) -> Campaign:
    """A new campaign of all that was found.

    A reading whose panel is not listed gets a panel of which nothing is known; a panel without a
    formulation belongs to "Unassigned".
    """
    empty = Campaign(new_id(), title.strip() or "Untitled campaign", settings or Settings())
    return gather(empty, found).campaign


@dataclass(frozen=True, slots=True)
class Gathered:
    """A campaign with a find added. `standing` says of each reading of the find, in its order,
    what became of it: new, present, replaces or refused."""

    campaign: Campaign
    standing: tuple[str, ...]

    def count(self, standing: str) -> int:
        return self.standing.count(standing)


def gather(campaign: Campaign, found: Found) -> Gathered:
    """The campaign with what was found added at the ends; see the rules above. Records that do
    not change stay the same objects."""
    gathering = _Gathering(campaign, {r.source.sha256 for r in found.readings})
    for listed in found.panels:
        gathering.add_listed(listed)
    standing = tuple(gathering.add_reading(reading) for reading in found.readings)
    for rating in found.ratings:
        gathering.add_rating(rating)
    if found.open_lead is not None:
        gathering.add_open_lead(*found.open_lead)
    for refusal in found.refused:
        gathering.refuse(refusal.file, refusal.reason)
    return Gathered(gathering.campaign(), standing)


def panel_by_name(campaign: Campaign, name: str) -> tuple[Campaign, str]:
    """The id of the panel of this name, and the campaign, to which it was added if it is new."""
    name = name.strip()
    for panel in campaign.panels:
        if panel.name == name:
            return campaign, panel.panel_id
    gathering = _Gathering(campaign, ())
    panel_id = gathering.panel(name).panel_id
    return gathering.campaign(), panel_id


class _Gathering:
    """A campaign while things are added to it, each kind by what it is recognised by."""

    def __init__(self, campaign: Campaign, arriving: Collection[str]) -> None:
        """`arriving` are the SHA-256 of the files that readings are about to come from."""
        self._before = campaign
        self._arriving = arriving
        self._formulations = {f.name: f for f in campaign.formulations}
        self._formulation_names = {f.formulation_id: f.name for f in campaign.formulations}
        self._panels = {p.name: p for p in campaign.panels}
        self._panel_names = {p.panel_id: p.name for p in campaign.panels}
        self._readings = list(campaign.readings)
        self._present = {(r.source.sha256, r.source.part): r for r in campaign.readings}
        self._at: dict[tuple[str, float], list[Reading]] = {}
        for reading in campaign.readings:
            self._at.setdefault((reading.panel_id, reading.exposure_h), []).append(reading)
        self._said_before = {r.file for r in campaign.refused}
        self._refused = dict.fromkeys(campaign.refused)
        self._lead = (campaign.open_lead, campaign.open_lead_source)
        self._ratings = list(campaign.ratings)
        self._rated = {_seen(r.seen) for r in campaign.ratings}

    def campaign(self) -> Campaign:
        return replace(
            self._before,
            formulations=tuple(self._formulations.values()),
            panels=tuple(self._panels.values()),
            readings=tuple(self._readings),
            open_lead=self._lead[0],
            open_lead_source=self._lead[1],
            refused=tuple(self._refused),
            ratings=tuple(self._ratings),
        )

    def refuse(self, file: str, reason: str) -> None:
        """Put on the list what is not on it yet."""
        self._refused.setdefault(Refusal(_storable(file), _storable(reason)))

    # A row of a panel list

    def add_listed(self, listed: FoundPanel) -> None:
        name = _storable(listed.panel).strip()
        if not name:
            self.refuse(PANEL_LIST, "A row names no panel: fill in the column 'panel'.")
            return
        panel = self._panels.get(name)
        if panel is None:
            panel = self._new_panel(name, _storable(listed.formulation).strip())
        panel = self._with_formulation(panel, _storable(listed.formulation).strip())
        for fact, words in _FACTS.items():
            value = self._usable(name, fact, getattr(listed, fact))
            known = getattr(panel, fact)
            if value is None or value == "" or value == known:
                continue
            if known is None or known == "":
                panel = replace(panel, **{fact: value})
            else:
                self._refuse_fact(name, words, value, known)
        self._panels[name] = self._with_notes(panel, listed.notes)

    def _usable(self, name: str, fact: str, value: Any) -> Any:
        """The value as a panel may have it, or None, said so, where it makes no sense."""
        if value is None:
            return None
        if isinstance(value, str):
            return _storable(value).strip()
        if not math.isfinite(value) or (fact in _POSITIVE and value <= 0):
            self.refuse(
                PANEL_LIST,
                f"Panel {name}: {value:g} is no possible {_FACTS[fact]}, so it was left empty: "
                "correct the list or edit the panel.",
            )
            return None
        return float(value)

    def _with_formulation(self, panel: Panel, name: str) -> Panel:
        known = self._formulation_names[panel.formulation_id]
        if not name or name == known:
            return panel
        if known == UNASSIGNED:
            return replace(panel, formulation_id=self._formulation_id(name))
        self._refuse_fact(panel.name, "formulation", name, known)
        return panel

    def _with_notes(self, panel: Panel, notes: Iterable[tuple[str, str]]) -> Panel:
        known = dict(panel.notes)
        new = {}
        for heading, text in notes:
            heading, text = _storable(heading), _storable(text)
            if text and heading not in known:
                new[heading] = known[heading] = text
            elif text and text != known[heading]:
                self._refuse_fact(panel.name, heading, text, known[heading])
        return replace(panel, notes=(*panel.notes, *new.items())) if new else panel

    def _refuse_fact(self, panel: str, what: str, listed: object, known: object) -> None:
        self.refuse(
            PANEL_LIST,
            f"Panel {panel}: the list says {what} {listed}, but {known} was known before and was "
            "kept: edit the panel if the list is right.",
        )

    # A reading, and the run without a specimen

    def add_reading(self, found: FoundReading) -> str:
        """Says what became of it, in the words of `Gathered`."""
        source = _storable_source(found.source)
        name = _storable(found.panel).strip()
        where = f"{source.file} ({source.part})" if source.part else source.file
        if not name:
            self.refuse(source.file, f"{where} names no panel: say in readings.csv whose it is.")
            return "refused"
        if not (math.isfinite(found.exposure_h) and found.exposure_h >= 0):
            self.refuse(
                source.file,
                f"{where} has no possible exposure time ({found.exposure_h:g} h): say in "
                "readings.csv when it was taken.",
            )
            return "refused"
        same = self._present.get((source.sha256, source.part))
        if same is not None:
            return self._recognise(same, source.file, where, name, found.exposure_h)
        panel = self.panel(name)
        reading = Reading(
            reading_id=new_id(),
            panel_id=panel.panel_id,
            exposure_h=float(found.exposure_h),
            spectrum=found.spectrum,
            source=source,
            temperature_c=_finite(found.temperature_c),
            amplitude_mv=_finite(found.amplitude_mv),
            potential_mv=_finite(found.potential_mv),
            remark=_storable(found.remark),
            temperature_span_c=_finite_span(found.temperature_span_c),
            potential_span_mv=_finite_span(found.potential_span_mv),
        )
        self._settle(source.file)
        earlier = self._earlier(reading)
        if earlier is None:
            self._readings.append(reading)
            self._present[source.sha256, source.part] = reading
            return "new"
        if earlier.spectrum == reading.spectrum:
            return "present"  # the same numbers, saved once more
        after = _replaced(earlier, reading)
        self._readings[next(i for i, r in enumerate(self._readings) if r is earlier)] = after
        self._at[after.panel_id, after.exposure_h].remove(earlier)
        self._present[source.sha256, source.part] = after
        return "replaces"

    def _recognise(
        self, same: Reading, file: str, where: str, panel: str, exposure_h: float
    ) -> str:
        """The bytes are there already. Under their own name, or for the same panel and time, that
        is all; under another name and for another reading, one of the two must be wrong."""
        its_panel = self._panel_names[same.panel_id]
        if file == same.source.file or (its_panel, same.exposure_h) == (panel, exposure_h):
            return "present"
        self.refuse(
            file,
            f"{where} holds the same bytes as {same.source.file}, which is in the campaign "
            f"already as panel {its_panel} at {same.exposure_h:g} h: it was not added again.",
        )
        return "refused"

    def _earlier(self, reading: Reading) -> Reading | None:
        """The reading from before whose place a new one takes. One whose own file has come along
        again was measured besides, not exported again; so were two of one panel and time, unless
        the name of the file tells which is meant."""
        there = [
            earlier
            for earlier in self._at.get((reading.panel_id, reading.exposure_h), ())
            if earlier.source.sha256 not in self._arriving
        ]
        named = [
            earlier
            for earlier in there
            if (earlier.source.file, earlier.source.part)
            == (reading.source.file, reading.source.part)
        ]
        chosen = named or there
        return chosen[0] if len(chosen) == 1 else None

    def _settle(self, file: str) -> None:
        """A file that was refused before and can be used now is off the list."""
        if file in self._said_before:
            self._said_before.discard(file)
            for refusal in [r for r in self._before.refused if r.file == file]:
                self._refused.pop(refusal, None)

    def add_open_lead(self, spectrum: Spectrum, source: Source) -> None:
        present, present_source = self._lead
        if present is None:
            self._lead = (spectrum, _storable_source(source))
        elif present != spectrum:
            held = present_source.file if present_source else "the present one"
            self.refuse(
                _storable(source.file),
                f"{_storable(source.file)} is another open-lead run than {held}, which was kept: "
                "remove that one first if the new one is to count.",
            )

    # A row of a ratings list

    def add_rating(self, found: FoundRating) -> None:
        """One that says what another says of the same panel at the same time adds nothing."""
        panel = self._panels.get(_storable(found.panel).strip())
        if panel is None:
            self.refuse(
                found.file,
                f"A rating at {found.exposure_h:g} h names panel {_storable(found.panel)}, which "
                "the campaign does not have: correct the name, or add the panel.",
            )
            return
        seen = VisualRating(
            panel.panel_id,
            float(found.exposure_h),
            found.scale,
            _storable(found.value),
            _storable(found.edition),
            _storable(found.rater),
            _storable(found.remark),
        )
        if _seen(seen) not in self._rated:
            self._rated.add(_seen(seen))
            self._ratings.append(Rating(new_id(), seen))

    # Records that something else needs

    def panel(self, name: str) -> Panel:
        if name not in self._panels:
            self._panels[name] = self._new_panel(name, "")
        return self._panels[name]

    def _new_panel(self, name: str, formulation: str) -> Panel:
        panel = Panel(new_id(), name, self._formulation_id(formulation or UNASSIGNED))
        self._panel_names[panel.panel_id] = name
        return panel

    def _formulation_id(self, name: str) -> str:
        if name not in self._formulations:
            made = Formulation(new_id(), name)
            self._formulations[name] = made
            self._formulation_names[made.formulation_id] = name
        return self._formulations[name].formulation_id


def _seen(seen: VisualRating) -> tuple[str, float, str, str, str]:
    return seen.panel_id, seen.exposure_h, seen.scale, seen.value, seen.rater


def _replaced(before: Reading, after: Reading) -> Reading:
    """The reading with the corrected export in place of what it held. What a person decided about
    single points, or in spite of a rejection, was about other numbers and does not stay."""
    old = before.source
    note = f"Corrected export; before: {old.file}, SHA-256 {old.sha256[:12]}."
    decided = bool(before.left_out or before.kept_in or before.overruled_because)
    if decided:
        note += " Points left out or kept in, and an overruled rejection, were reset."
    return replace(
        after,
        reading_id=before.reading_id,
        temperature_c=_first(after.temperature_c, before.temperature_c),
        amplitude_mv=_first(after.amplitude_mv, before.amplitude_mv),
        potential_mv=_first(after.potential_mv, before.potential_mv),
        remark="\n".join(dict.fromkeys(t for t in (before.remark, after.remark, note) if t)),
        pinned_model=before.pinned_model,
    )


def _first(value: float | None, otherwise: float | None) -> float | None:
    return otherwise if value is None else value


def _finite_span(span: tuple[float, float] | None) -> tuple[float, float] | None:
    return span if span is not None and all(map(math.isfinite, span)) else None


def _finite(value: float | None) -> float | None:
    return None if value is None or not math.isfinite(value) else float(value)


def _storable_source(source: Source) -> Source:
    return replace(source, file=_storable(source.file), part=_storable(source.part))


def _storable(text: str) -> str:
    """The text with what is no character replaced by "?": some systems hand over file names so."""
    return text.encode("utf-8", "replace").decode("utf-8")
