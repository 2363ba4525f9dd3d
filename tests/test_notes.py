"""Every quantity, model, check and test of the program has a method note, and no note is idle."""

from __future__ import annotations

import ast
import re
import tomllib
from pathlib import Path

import pytest

from coatgui.circuits import catalogue
from coatgui.notes import KINDS, glossary, method_notes, note_about
from coatgui.records import Bound, Judge, Method
from coatgui.shipped import resource

ROOT = Path(__file__).resolve().parent.parent / "coatgui"
# Named by what they are, not by a code that the sources hold as one word.
TOPICS = {
    "Brasher–Kingsbury", "modulus", "breakpoint_frequency", "active_area", "relaxation_outline",
    "limit_study", "turnbull", "weibull", "trend", "projection", "rating_scales",
    "rating_correlation", "next_inspection", "dry_capacitance", "saturated_capacitance",
    "diffusion_coefficient",
}  # fmt: skip


def finding_codes() -> set[str]:
    """The codes of all findings, read from the calls that make them."""
    codes: set[str] = set()
    for path in ROOT.rglob("*.py"):
        for node in ast.walk(ast.parse(path.read_text(encoding="utf-8"))):
            if isinstance(node, ast.Call) and getattr(node.func, "id", "") == "Finding":
                codes |= {
                    part.value
                    for part in ast.walk(node.args[0])
                    if isinstance(part, ast.Constant) and isinstance(part.value, str)
                }
    return codes


def event_codes() -> set[str]:
    """All words joined by underscores in the file that dates events, and the one without any."""
    text = (ROOT / "assessment" / "events.py").read_text(encoding="utf-8")
    return {*re.findall(r'"([a-z]+(?:_[a-z]+)+)"', text), "rebound"}


def all_codes() -> set[str]:
    laws = tomllib.loads(resource("water.toml").read_text(encoding="utf-8"))["law"]
    return {
        *finding_codes(),
        *event_codes(),
        *catalogue(),
        *(law["id"] for law in laws),
        *Bound,
        *Method,
        *Judge,
        "coating_capacitance",
        "pore_resistance",
        "water_uptake",
        "relative_permittivity",
        "film_resistivity",
    }


def test_the_findings_are_found() -> None:
    assert {"wild_point", "mains_pick_up", "drift", "panel_suspected", "no_area"} <= finding_codes()


def test_everything_has_a_note() -> None:
    assert sorted(code for code in all_codes() if note_about(code) is None) == []


def test_no_note_is_about_something_that_is_not_there() -> None:
    text = "\n".join(path.read_text(encoding="utf-8") for path in ROOT.rglob("*.py"))
    known = all_codes() | TOPICS
    strays = {
        code
        for note in method_notes()
        for code in note.covers
        if code not in known and f'"{code}"' not in text
    }
    assert strays == set()


def test_a_code_has_one_note() -> None:
    codes = [code for note in method_notes() for code in note.covers]
    assert len(codes) == len(set(codes))


@pytest.mark.parametrize("note", method_notes(), ids=lambda note: note.title)
def test_a_note_says_all_it_should(note: object) -> None:
    values = {name: getattr(note, name) for name in type(note).__slots__}  # type: ignore[attr-defined]
    assert values["kind"] in KINDS
    for name in ("meaning", "formula", "assumes", "avoid", "source"):
        assert values[name].endswith("."), name


def test_terms_are_explained_once() -> None:
    names = [name.casefold() for term in glossary() for name in (term.name,)]
    assert len(names) == len(set(names))
    assert all(term.meaning.endswith(".") for term in glossary())
