"""What can be saved from a damaged campaign file, in a new file, with a list of what is lost."""

from __future__ import annotations

import hashlib
import math
import sqlite3
from collections.abc import Callable, Mapping, Sequence
from contextlib import suppress
from dataclasses import dataclass, field, replace
from pathlib import Path
from typing import Any

from coatgui.campaign import cells, photographs, rows, rows_seen, rules, schema, writing
from coatgui.campaign import connection as database
from coatgui.campaign.build import UNASSIGNED, new_id
from coatgui.campaign.errors import CampaignFileError
from coatgui.campaign.pages import Pages, Value
from coatgui.records import (
    Campaign,
    Formulation,
    Identification,
    Panel,
    Photograph,
    Rating,
    Reading,
    Refusal,
    Settings,
    Source,
    Spectrum,
)

_NAMED_AT_MOST = 20


@dataclass(frozen=True)
class Recovered:
    """`lost` says what is missing, a sentence each; empty where all is there. `to_read_again` are
    imported files, by name, whose readings lost their numbers: give them to intake."""

    readings: int
    lost: tuple[str, ...]
    to_read_again: Mapping[str, bytes]


def recover(path: Path, target: Path, *, replace_target: bool = False) -> Recovered:
    """Read every row that can be read from a damaged file, whatever else is wrong with it, and
    write what makes sense to a new file `target`. The damaged file stays as it is. Raises
    CampaignFileError where there is nothing to be saved, or `target` cannot be written."""
    if database.is_open_here(path):
        raise CampaignFileError(f"{path.name} is open in this program: close it first.")
    with database.plain_words(path):
        # A change that was cut off is taken back first, where SQLite still can.
        with suppress(CampaignFileError, sqlite3.Error):
            connection = database.connect(path)
            try:
                connection.execute("SELECT name FROM sqlite_schema").fetchall()
            finally:
                database.disconnect(connection, path)
        content = path.read_bytes()
    salvage = _Salvage(Pages(memoryview(content)))
    campaign, raw = salvage.campaign(path.stem)
    if not (campaign.readings or campaign.panels or raw):
        raise CampaignFileError(f"Nothing that belongs to a campaign can be read from {path.name}.")
    name = f"Recover what could be read from {path.name}"
    database.write_whole_file(
        target, lambda beside: writing.fill(beside, campaign, raw, name), replace=replace_target
    )
    return Recovered(len(campaign.readings), tuple(salvage.lost), salvage.to_read_again)


@dataclass
class _Salvage:
    pages: Pages
    lost: list[str] = field(default_factory=list)
    to_read_again: dict[str, bytes] = field(default_factory=dict)

    def __post_init__(self) -> None:
        self._rows: dict[str, dict[str, dict[str, Any]]] = {table: {} for table in _SHAPES}
        self._lines = 0
        for _, values in self.pages.rows():
            if len(values) >= 7 and values[1] in ("create", "edit", "undo", "redo"):
                self._lines += 1
            for table, fits in _SHAPES.items():
                if fits(values):
                    row = dict(zip(_columns(table), values, strict=False))
                    self._rows[table][str(values[0])] = {**_DEFAULTS.get(table, {}), **row}
                    break

    def campaign(self, title: str) -> tuple[Campaign, dict[str, bytes]]:
        raw = {
            sha256: row["bytes"]
            for sha256, row in self._rows["raw_files"].items()
            if hashlib.sha256(row["bytes"]).hexdigest() == sha256
        }
        spectra = self._spectra()
        formulations = {f.formulation_id: f for f in self._records("formulations")}
        panels: dict[str, Panel] = {p.panel_id: p for p in self._records("panels")}
        readings = self._readings(spectra, panels, raw)
        ratings: Sequence[Rating] = self._records("ratings")
        pictures: Sequence[Photograph] = self._records("photographs")
        kept = [p for p in pictures if p.sha256 in raw]
        self._say(f"photograph {p.file or p.caption}" for p in pictures if p not in kept)
        for panel_id in {
            *(r.panel_id for r in readings),
            *(r.seen.panel_id for r in ratings),
            *(p.panel_id for p in kept),
        } - panels.keys():
            name = f"Recovered panel {panel_id[:8]}"
            panels[panel_id] = Panel(panel_id, name, "")
            self.lost.append(f"The facts of a panel are lost; it is called “{name}” now.")
        panels = self._with_formulations(panels, formulations)
        campaign_row = next(iter(self._rows["campaign"].values()), None)
        settings = self._one("settings", rows.settings_of) or Settings()
        lead, source = self._open_lead(spectra)
        campaign = Campaign(
            campaign_id=new_id() if campaign_row is None else campaign_row["campaign_id"],
            title=(campaign_row or {}).get("title") or title,
            remark=(campaign_row or {}).get("remark") or "",
            settings=settings,
            formulations=tuple(formulations.values()),
            panels=tuple(panels.values()),
            readings=tuple(readings),
            open_lead=lead,
            open_lead_source=source,
            refused=tuple(self._records("refused")),
            ratings=tuple(ratings),
            photographs=tuple(kept),
            identification=self._one("campaign", rows_seen.identification_of) or Identification(),
        )
        without = [r.source.file for r in readings if r.source.sha256 not in raw]
        self._say(f"the bytes of the imported file {file}" for file in dict.fromkeys(without))
        if campaign_row is None:
            self.lost.append("The title of the campaign and what its summary names are lost.")
        if self.pages.unreadable:
            self.lost.append(
                f"{self.pages.unreadable} places in the file cannot be read; what stood only there "
                "is lost."
            )
        self.lost.append(
            f"The history ({self._lines} lines can be read) stays in the damaged file: the new one "
            "begins with its recovery."
        )
        return _sound(campaign), raw

    def _spectra(self) -> dict[str, Spectrum]:
        found: dict[str, Spectrum] = {}
        for key, row in self._rows["spectra"].items():
            with suppress(*cells.UNREADABLE):
                made = rows.spectra_of([tuple(row.values())])
                if made[key].content_key() == key:
                    found.update(made)
        return found

    def _readings(
        self,
        spectra: Mapping[str, Spectrum],
        panels: Mapping[str, Panel],
        raw: Mapping[str, bytes],
    ) -> list[Reading]:
        found, gone = [], []
        for row in _in_place(self._rows["readings"]):
            with suppress(*cells.UNREADABLE):
                found.append(rows.reading_of(row, spectra))
                continue
            panel = panels.get(row["panel_id"])
            gone.append(
                f"the reading of {panel.name if panel else 'a panel'} at {row['exposure_h']:g} h "
                f"from {row['file']}"
            )
            if row["sha256"] in raw:
                self.to_read_again[row["file"]] = raw[row["sha256"]]
        self._say(gone)
        return found

    def _with_formulations(
        self, panels: Mapping[str, Panel], formulations: dict[str, Formulation]
    ) -> dict[str, Panel]:
        """Panels whose formulation is lost belong to "Unassigned"."""
        lost = {p.formulation_id for p in panels.values()} - formulations.keys()
        if not lost:
            return dict(panels)
        there = next((f for f in formulations.values() if f.name == UNASSIGNED), None)
        home = there or Formulation(new_id(), UNASSIGNED)
        formulations[home.formulation_id] = home
        self.lost.append(
            f"The formulations of some panels are lost; these belong to “{UNASSIGNED}” now."
        )
        return {
            key: replace(panel, formulation_id=home.formulation_id)
            if panel.formulation_id in lost
            else panel
            for key, panel in panels.items()
        }

    def _open_lead(self, spectra: Mapping[str, Spectrum]) -> tuple[Spectrum | None, Source | None]:
        row = next(iter(self._rows["open_lead"].values()), None)
        if row is None:
            return None, None
        if row["spectrum_id"] not in spectra:
            self.lost.append("The open-lead run is lost.")
            return None, None
        source = None
        with suppress(*cells.UNREADABLE):
            source = rows.source_of(row)
        return spectra[row["spectrum_id"]], source

    def _records(self, table: str) -> list[Any]:
        make = _MAKE[table]
        found = []
        for row in _in_place(self._rows[table]):
            try:
                found.append(make(row))
            except cells.UNREADABLE:
                self.lost.append(f"A row of the {table} cannot be read.")
        return found

    def _one(self, table: str, make: Callable[[Any], Any]) -> Any:
        for row in self._rows[table].values():
            with suppress(*cells.UNREADABLE):
                return make(row)
        self.lost.append(f"The {table} could not be read and is as in a new campaign.")
        return None

    def _say(self, things: Any) -> None:
        named = list(things)
        self.lost += [f"Lost: {thing}." for thing in named[:_NAMED_AT_MOST]]
        if len(named) > _NAMED_AT_MOST:
            self.lost.append(f"Lost: {len(named) - _NAMED_AT_MOST} more of these.")


def _sound(campaign: Campaign) -> Campaign:
    """The campaign without what breaks its rules: names that are there twice get a number."""
    return replace(
        campaign,
        formulations=_named_once(campaign.formulations),
        panels=_named_once(campaign.panels),
        readings=tuple(r for r in campaign.readings if _is_sound("readings", r)),
        ratings=tuple(r for r in campaign.ratings if _is_sound("ratings", r)),
        photographs=tuple(p for p in campaign.photographs if _is_sound("photographs", p)),
        settings=campaign.settings if _is_sound("settings", campaign.settings) else Settings(),
    )


def _named_once(records: Sequence[Any]) -> tuple[Any, ...]:
    taken: set[str] = set()
    made = []
    for record in records:
        name, number = record.name.strip() or "Recovered", 2
        while name in taken:
            name, number = f"{record.name} ({number})", number + 1
        taken.add(name)
        made.append(replace(record, name=name))
    return tuple(made)


def _is_sound(table: str, record: Any) -> bool:
    try:
        rules.refuse_unsound(table, record)
    except CampaignFileError:
        return False
    return True


def _in_place(found: Mapping[str, dict[str, Any]]) -> list[dict[str, Any]]:
    return sorted(found.values(), key=lambda row: row["place"])


# ---------------------------------------------------------------------------------------------
# To which table a row belongs, by what it looks like


def _columns(table: str) -> tuple[str, ...]:
    return schema.columns_in_order(table)


def _is_hash(value: Value) -> bool:
    return isinstance(value, str) and len(value) == 64


def _is_text(*values: Value) -> bool:
    return all(isinstance(value, str) for value in values)


def _is_number(*values: Value) -> bool:
    return all(isinstance(v, int | float) and math.isfinite(v) for v in values)


def _is_list(*values: Value) -> bool:
    return all(isinstance(value, str) and value.startswith("[") for value in values)


_SHAPES: dict[str, Callable[[tuple[Value, ...]], bool]] = {
    "raw_files": lambda v: len(v) == 2 and _is_hash(v[0]) and isinstance(v[1], bytes),
    "spectra": lambda v: len(v) == 4 and _is_hash(v[0]) and _is_list(*v[1:]),
    "readings": lambda v: (
        17 <= len(v) <= 21
        and _is_text(v[0], v[2], v[4], v[5], v[6])
        and _is_number(v[1], v[3])
        and _is_hash(v[4])
    ),
    "panels": lambda v: (
        len(v) == 12 and _is_text(v[0], v[2], v[3]) and _is_number(v[1]) and _is_list(v[11])
    ),
    "refused": lambda v: (
        len(v) == 4
        and _is_text(v[0], v[2], v[3])
        and _is_number(v[1])
        and v[0] == rows.refusal_key(Refusal(str(v[2]), str(v[3])))
    ),
    "formulations": lambda v: len(v) == 4 and _is_text(v[0], v[2], v[3]) and _is_number(v[1]),
    "settings": lambda v: (
        7 <= len(v) <= 17 and _is_text(v[0]) and _is_number(v[1], v[3], v[4]) and _is_list(v[2])
    ),
    "campaign": lambda v: (
        len(v) in (3, 9) and _is_text(*v) and (len(v) == 3 or _is_list(v[8])) and v[1] != ""
    ),
    "open_lead": lambda v: len(v) == 6 and _is_text(v[0]) and _is_hash(v[1]),
    "ratings": lambda v: (
        len(v) == 9 and _is_text(v[0], v[2], v[4], v[5]) and _is_number(v[1], v[3])
    ),
    "photographs": lambda v: (
        len(v) == 8 and _is_hash(v[4]) and _is_number(v[1]) and v[5] in photographs.MEDIA_TYPES
    ),
}
# Of columns that rows from before a migration do not have.
_DEFAULTS: dict[str, dict[str, Any]] = {
    "settings": {
        "input_resistance_ohm": None,
        "input_capacitance_f": None,
        "take_leads_away": 0,
        "uptake_from_high_frequency": 0,
        **dict.fromkeys(
            ("own_models", "limits", "comparisons", "projections", "electrolytes", "regimes"), "[]"
        ),
    },
    "readings": dict.fromkeys(
        ("temperature_low_c", "temperature_high_c", "potential_low_mv", "potential_high_mv")
    ),
    "campaign": {
        **dict.fromkeys(("laboratory", "customer", "order_number", "author", "reviewer"), ""),
        "standards": "[]",
    },
}
_MAKE: dict[str, Callable[[Any], Any]] = {
    "formulations": rows.formulation_of,
    "panels": rows.panel_of,
    "refused": rows.refusal_of,
    "ratings": rows_seen.rating_of,
    "photographs": rows_seen.photograph_of,
}
