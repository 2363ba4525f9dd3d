"""Method notes and the glossary, as data: what each number, model, check and test means."""

from __future__ import annotations

import tomllib
from dataclasses import dataclass
from functools import cache

from coatgui.shipped import resource

KINDS = {
    "quantity": "Numbers",
    "model": "Circuits",
    "check": "Checks of a reading",
    "course": "Over time",
    "test": "Between formulations",
}


@dataclass(frozen=True, slots=True)
class Note:
    """How one thing is obtained and when it is not to be used. `covers` are the codes in the
    program and its outputs that the note is about; `kind` is a key of KINDS."""

    title: str
    kind: str
    covers: tuple[str, ...]
    meaning: str
    formula: str
    assumes: str
    avoid: str
    source: str


@dataclass(frozen=True, slots=True)
class Term:
    """A word of the trade; `also` are its other names and symbols."""

    name: str
    also: tuple[str, ...]
    meaning: str


@cache
def method_notes() -> tuple[Note, ...]:
    """All method notes, in the order in which they are best read."""
    entries = tomllib.loads(resource("notes.toml").read_text(encoding="utf-8"))["note"]
    return tuple(Note(**{**entry, "covers": tuple(entry["covers"])}) for entry in entries)


@cache
def glossary() -> tuple[Term, ...]:
    """The terms of the trade, by name."""
    entries = tomllib.loads(resource("glossary.toml").read_text(encoding="utf-8"))["term"]
    terms = (Term(e["name"], tuple(e["also"]), e["meaning"]) for e in entries)
    return tuple(sorted(terms, key=lambda term: term.name.casefold()))


def note_about(code: str) -> Note | None:
    """The note that covers a code, or None."""
    return next((note for note in method_notes() if code in note.covers), None)
