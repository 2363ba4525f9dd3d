"""Records that take the place of others, at a cost that does not grow with the campaign."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import replace
from typing import Any

from coatgui.campaign import rules
from coatgui.campaign.changes import Operation, RowChange
from coatgui.records import Campaign, Formulation, Panel, Photograph, Rating, Reading, Spectrum

# The table of a record, the key it goes by there, and what other records have to do with.
_KINDS: dict[type, tuple[str, Callable[[Any], str], Callable[[Any], tuple[str, ...]]]] = {
    Formulation: ("formulations", lambda f: f.formulation_id, lambda f: (f.name,)),
    Panel: ("panels", lambda p: p.panel_id, lambda p: (p.name, p.formulation_id)),
    Reading: ("readings", lambda r: r.reading_id, lambda r: (r.panel_id,)),
    Rating: ("ratings", lambda r: r.rating_id, lambda r: (r.seen.panel_id,)),
    Photograph: ("photographs", lambda p: p.photograph_id, lambda p: (p.panel_id,)),
}


def replacing(name: str, campaign: Campaign, pairs: Sequence[tuple[Any, Any]]) -> Operation:
    """The operation that puts the second record of each pair in the place of the first, which is
    in the campaign and of the same kind and id. Raises OperationRefused as `rules.operation`."""
    table, key_of, ties_of = _KINDS[type(pairs[0][0])]
    if any(ties_of(was) != ties_of(record) for was, record in pairs):
        after: dict[str, Any] = {table: swap(getattr(campaign, table), pairs)}
        return rules.operation(name, campaign, replace(campaign, **after))
    # What ties a record to others is as it was, so only its own rules can be broken.
    changes: list[RowChange] = []
    spectra: dict[str, Spectrum] = {}
    for was, record in pairs:
        rules.refuse_unsound(table, record)
        changes += rules.change_of(table, key_of(record), was, record)
        for spectrum in rules.new_spectra(was, record):
            spectra[spectrum.content_key()] = spectrum
    return Operation(name, tuple(changes), tuple(spectra.values()))


def swap(records: tuple[Any, ...], pairs: Sequence[tuple[Any, Any]]) -> tuple[Any, ...]:
    """The records, each that is the first of a pair replaced by the second."""
    new = {id(old): record for old, record in pairs}
    return tuple(new.get(id(record), record) for record in records)
