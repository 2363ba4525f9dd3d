"""The campaign in memory, kept in step with the file row by row.

Only the records of touched rows are made anew; everything else in the next `Campaign` is the same
object as before.
"""

from __future__ import annotations

import sqlite3
from bisect import bisect_left
from collections.abc import Iterable, Mapping
from dataclasses import dataclass, replace
from operator import itemgetter
from typing import Any

from coatgui.campaign import cells, rows, rows_seen, seal
from coatgui.campaign.errors import CampaignDamaged
from coatgui.campaign.schema import KEYS, ORDERED
from coatgui.records import Campaign, Spectrum

_IN_USE = "SELECT spectrum_id FROM readings UNION SELECT spectrum_id FROM open_lead"


@dataclass(frozen=True)
class Touched:
    """Rows read again after a change: `place` and record by table and key, None where the row is
    gone; and the facts of the campaign itself."""

    held: dict[tuple[str, str], tuple[int, Any] | None]
    facts: dict[str, Any]
    total: int
    """The sum of the parts these rows have in the state, see `seal`."""


class Snapshot:
    """`campaign` is the file's content as of the last `adopt`; `total` the sum of the parts of its
    rows as they were first read, see `seal`.

    The connection must give rows as `sqlite3.Row`. Raises CampaignDamaged where something
    cannot be read.
    """

    def __init__(
        self, connection: sqlite3.Connection, spectra: Mapping[str, Spectrum] | None = None
    ) -> None:
        """`spectra` are those of the file, where they were read already."""
        self._connection = connection
        spectra = read_spectra(connection) if spectra is None else spectra
        self._held: dict[str, dict[str, tuple[int, Any]]] = {table: {} for table in ORDERED}
        # The records of each table in their order, and their places.
        self._records: dict[str, list[Any]] = {}
        self._places: dict[str, list[int]] = {}
        self.total = seal.rows_total(connection, KEYS.keys() - set(ORDERED))
        for table, held in self._held.items():
            for row in connection.execute(f"SELECT * FROM {table} ORDER BY place, rowid"):
                held[row[KEYS[table]]] = (row["place"], record_of(table, row, spectra))
                self.total += seal.row_digest(table, dict(row))
        content = self._facts(spectra)
        content.update((table, self._in_order(table)) for table in ORDERED)
        self.campaign = Campaign(**content)

    def read_again(
        self, touched: Iterable[tuple[str, str]], spectra: Iterable[Spectrum] = ()
    ) -> Touched:
        """Read the named rows (table, key) from the file, without changing the snapshot. `spectra`
        are those just written, which need not be parsed."""
        at_hand = {spectrum.content_key(): spectrum for spectrum in spectra}
        lead = self.campaign.open_lead
        if lead is not None:
            at_hand[lead.content_key()] = lead
        held: dict[tuple[str, str], tuple[int, Any] | None] = {}
        facts: dict[str, Any] = {}
        total = 0
        for table, key in dict.fromkeys(touched):
            row = self._connection.execute(
                f"SELECT * FROM {table} WHERE {KEYS[table]} = ?", (key,)
            ).fetchone()
            if row is not None:
                total += seal.row_digest(table, dict(row))
            if table not in ORDERED:
                facts.update(self._facts(at_hand))
                continue
            if row is None:
                held[table, key] = None
                continue
            if table == "readings" and row["spectrum_id"] not in at_hand:
                at_hand.update(self._spectrum(row["spectrum_id"], key))
            held[table, key] = (row["place"], record_of(table, row, at_hand))
        return Touched(held, facts, total)

    def adopt(self, touched: Touched) -> None:
        """Make the rows read again part of the snapshot."""
        before = self.campaign
        touched_in: dict[str, dict[str, tuple[int, Any] | None]] = {}
        for (table, key), held in touched.held.items():
            touched_in.setdefault(table, {})[key] = held
        content = dict(touched.facts)
        stay = {table: self._take_their_places(table, new) for table, new in touched_in.items()}
        content.update((table, found or self._in_order(table)) for table, found in stay.items())
        self.campaign = replace(before, **content)
        if "readings" not in stay or stay["readings"]:
            new = touched_in.get("readings", {}).values()
            self.campaign.take_index(before, [held[1] for held in new if held is not None])

    def _take_their_places(
        self, table: str, touched: Mapping[str, tuple[int, Any] | None]
    ) -> tuple[Any, ...] | None:
        """Adopt touched rows. Returns the records of the table where rows were only altered, which
        then need not be put in order; None where some went, came or moved."""
        held, records, places = self._held[table], self._records[table], self._places[table]
        only_altered = True
        for key, new in touched.items():
            was = held.get(key)
            if new is None:
                held.pop(key, None)
            else:
                held[key] = new
            only_altered &= was is not None and new is not None and was[0] == new[0]
            if only_altered and new is not None:
                records[bisect_left(places, new[0])] = new[1]
        return tuple(records) if only_altered else None

    def _in_order(self, table: str) -> tuple[Any, ...]:
        held = sorted(self._held[table].values(), key=itemgetter(0))
        self._places[table] = [place for place, _ in held]
        self._records[table] = [record for _, record in held]
        return tuple(self._records[table])

    def _spectrum(self, spectrum_id: str, reading_id: str) -> Mapping[str, Spectrum]:
        """A spectrum by its id; that of the reading as it was, where it is the same."""
        _, was = self._held["readings"].get(reading_id, (0, None))
        if was is not None and was.spectrum.content_key() == spectrum_id:
            return {spectrum_id: was.spectrum}
        return read_spectra(self._connection, spectrum_id)

    def _facts(self, spectra: Mapping[str, Spectrum]) -> dict[str, Any]:
        """The fields of `Campaign` that come from the tables of one row each."""
        campaign, settings, lead = map(self._only, ("campaign", "settings", "open_lead"))
        if campaign is None or settings is None:
            raise CampaignDamaged(
                "This campaign file is damaged: the campaign's title or settings are missing."
            )
        open_lead = source = None
        try:
            if lead is not None:
                wanted = lead["spectrum_id"]
                found = spectra if wanted in spectra else read_spectra(self._connection, wanted)
                open_lead = found[wanted]
                source = rows.source_of(lead)
            return {
                "campaign_id": campaign["campaign_id"],
                "title": campaign["title"],
                "remark": campaign["remark"],
                "identification": rows_seen.identification_of(campaign),
                "settings": rows.settings_of(settings),
                "open_lead": open_lead,
                "open_lead_source": source,
            }
        except cells.UNREADABLE as problem:
            raise CampaignDamaged(
                "This campaign file is damaged: its settings or open-lead run cannot be read."
            ) from problem

    def _only(self, table: str) -> Any:
        found = self._connection.execute(f"SELECT * FROM {table} LIMIT 2").fetchall()
        if len(found) > 1:
            raise CampaignDamaged(
                f"This campaign file is damaged: the table '{table}' holds more than one row."
            )
        return found[0] if found else None


def record_of(table: str, row: Any, spectra: Mapping[str, Spectrum]) -> Any:
    """The record of a row of one of the ordered tables. Raises CampaignDamaged."""
    try:
        if not isinstance(row["place"], int):
            raise TypeError("A place must be a whole number.")
        if table == "formulations":
            return rows.formulation_of(row)
        if table == "panels":
            return rows.panel_of(row)
        if table == "readings":
            return rows.reading_of(row, spectra)
        if table == "ratings":
            return rows_seen.rating_of(row)
        if table == "photographs":
            return rows_seen.photograph_of(row)
        return rows.refusal_of(row)
    except cells.UNREADABLE as problem:
        raise CampaignDamaged(
            f"This campaign file is damaged: row {row[KEYS[table]]} of {table} cannot be read."
        ) from problem


def read_spectra(
    connection: sqlite3.Connection, spectrum_id: str | None = None
) -> dict[str, Spectrum]:
    """The named spectrum, or all that readings and the open-lead run refer to, by id. Raises
    CampaignDamaged where one cannot be read or is not what its id says."""
    columns = "SELECT spectrum_id, frequency_hz, real_ohm, imaginary_ohm FROM spectra"
    if spectrum_id is not None:
        found = connection.execute(f"{columns} WHERE spectrum_id = ?", (spectrum_id,))
    else:
        found = connection.execute(f"{columns} WHERE spectrum_id IN ({_IN_USE})")
    try:
        spectra = rows.spectra_of(found)
        if not all(spectrum.content_key() == key for key, spectrum in spectra.items()):
            raise ValueError("The numbers are not those that were kept.")
        return spectra
    except cells.UNREADABLE as problem:
        which = "one of its spectra" if spectrum_id is None else f"spectrum {spectrum_id}"
        raise CampaignDamaged(
            f"This campaign file is damaged: {which} cannot be read, or was altered."
        ) from problem
