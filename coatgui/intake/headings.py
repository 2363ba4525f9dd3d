"""What a heading says: the role of a column, its unit, whether it counts the other way round, and
whose spectrum it belongs to."""

from __future__ import annotations

import re
import unicodedata
from collections.abc import Iterator
from dataclasses import dataclass, replace
from functools import cache, lru_cache

from coatgui.intake.labels import time_in
from coatgui.intake.units import Unit, data, kind_of, unit_of

_PRIMES = str.maketrans({"′": "'", "’": "'", "‘": "'", "´": "'", "`": "'", "″": "''", "”": "''",
                         "“": "''", '"': "''", "ʹ": "'", "ʺ": "''", "–": "-", "−": "-",
                         "‐": "-", "—": "-"})  # fmt: skip
_MINUS = re.compile(r"^\(?\s*-\s*\)?\s*(?=\S)")
_LOGARITHM = re.compile(r"^(?:log10|log|lg)\s*[(\[]?\s*(.+?)\s*[)\]]?$", re.IGNORECASE)
_BRACKETS = re.compile(r"[(\[{]([^()\[\]{}]*)[)\]}]")
_ELISION = re.compile(r"\b(l|d|dell|all)'(?=[^\W\d_]{2})")
_ATOMS = re.compile(r"[^\W\d_]+|\d+|'+|\|")


@dataclass(frozen=True, slots=True)
class Meaning:
    """`unit` is None where the heading names none. `unknown_unit` is what stands where a unit
    should but is not one. `negative` says that the heading turns the sign, `logarithm` that the
    numbers are decimal logarithms. `hours` and `label` say of which exposure and panel."""

    role: str
    unit: Unit | None = None
    unknown_unit: str = ""
    negative: bool = False
    logarithm: bool = False
    hours: float | None = None
    label: str = ""


@cache
def _notions() -> dict[str, str]:
    return {word: notion for notion, words in data()["notion"].items() for word in words}


@cache
def _roles() -> dict[frozenset[str], str]:
    return {frozenset(way): role for role, ways in data()["role"].items() for way in ways}


@lru_cache(maxsize=5000)
def meaning(heading: str) -> Meaning | None:
    """The meaning of a heading, or None where it is not one of the known ones."""
    text = unicodedata.normalize("NFKC", heading.translate(_PRIMES)).translate(_PRIMES).strip()
    text = re.sub(r"\s+", " ", text.strip(" :=").removeprefix("''").strip())
    if not text or len(text) > 120:
        return None
    negative = bool(_MINUS.match(text)) and text[-1:] != "-"
    if negative:
        text = _MINUS.sub("", text)
        if text.endswith(")") and text.count(")") > text.count("("):
            text = text[:-1]
    found = _LOGARITHM.match(text)
    if found:
        inner = _with_unit(found[1])
        return replace(inner, logarithm=True) if inner and kind_of(inner.role) else None
    what = _with_unit(text)
    if what is None or not negative:
        return what
    turnable = what.role in ("phase", "admittance_phase") or what.role.endswith("imaginary")
    return replace(what, negative=not what.negative) if turnable else None


def _with_unit(text: str) -> Meaning | None:
    unknown: Meaning | None = None
    ways = list(partings(text))
    for name, unit_text, _ in ways:
        what = _named(name)
        if what is not None:
            with_unit = take_unit(what, unit_text)
            if with_unit is not None:
                return with_unit
    whole = _named(text)
    if whole is not None:
        return whole
    for name, unit_text, sure_of_unit in ways:
        what = _named(name)
        if what is None:
            continue
        if sure_of_unit and unknown is None:
            hours, rest = time_in(unit_text)
            if hours is not None and not rest and what.hours is None:
                return replace(what, hours=hours)
            if re.search(r"\d", unit_text) and not what.label:
                unknown = replace(what, label=unit_text.strip())
            else:
                unknown = replace(what, unknown_unit=unit_text)
    return unknown


def take_unit(what: Meaning, text: str) -> Meaning | None:
    """The meaning with a unit, None where the text is no unit that fits."""
    unit = unit_of(text, kind_of(what.role))
    if unit is None and what.role == "frequency":
        unit = unit_of(text, "angular_frequency")
        if unit is not None:
            return replace(what, role="angular_frequency", unit=unit)
    if unit is None and what.role == "modulus":
        # "Z' (S)" names no role; "|Z|" in siemens would be a contradiction.
        return None
    if unit is None and what.role == "capacitance":
        return None
    return None if unit is None else replace(what, unit=unit)


def partings(text: str) -> Iterator[tuple[str, str, bool]]:
    """Ways to part a heading into name and unit; the last member says whether the second part can
    be nothing else than a unit or a label."""
    for found in _BRACKETS.finditer(text):
        name = f"{text[: found.start()].rstrip(' /,')} {text[found.end() :]}".strip()
        yield name, found[1], True
    for sign in ("/", ",", " in ", " en "):
        for found in re.finditer(re.escape(sign), text):
            yield text[: found.start()].strip(), text[found.end() :].strip(), sign == "/"
    pieces = [piece for piece in re.split(r"([\s_]+)", text) if piece]
    for back in (1, 3):
        if len(pieces) > back + 1:
            name = "".join(pieces[: -back - 1])
            yield name, "".join(pieces[-back:]).replace("_", " "), False


@lru_cache(maxsize=5000)
def _named(name: str) -> Meaning | None:
    """The role that a name without a unit has, with the time and the label in it."""
    notions = _notions_in(name)
    if notions is not None:
        return _meaning_of(notions)
    hours, rest = time_in(name)
    if hours is not None and rest:
        what = _named(rest.strip(" _-,;"))
        if what is not None and what.hours is None and what.role not in ("time", "date"):
            return replace(what, hours=hours)
        return None
    # "A1 Z'", "Zre 2": one further word with a digit in it is a label.
    words = re.split(r"[\s_,;:]+", name.strip())
    for place in (0, -1):
        label = words[place]
        others = words[1:] if place == 0 else words[:-1]
        if others and re.search(r"\d", label):
            what = _named(" ".join(others))
            if what is not None and not what.label and what.role not in ("time", "date", "panel"):
                return replace(what, label=label.strip("()[]#"))
    return None


def _meaning_of(notions: list[str]) -> Meaning | None:
    telling = frozenset(notions) - {"filler", "negative", "logarithm"}
    role = _roles().get(telling)
    if role is None:
        return None
    return Meaning(role, negative="negative" in notions, logarithm="logarithm" in notions)


def _notions_in(name: str) -> list[str] | None:
    """The notions of all words and signs of a name; None where one is unknown."""
    name = name.casefold().strip()
    known = _notions()
    if name in known:
        return [known[name]]
    result: list[str] = []
    rest = _ELISION.sub(r"\1 ", re.sub(r"[\s_.:()\[\]/*-]+", " ", name))
    if _ATOMS.sub("", rest).strip():
        return None
    for atom in _ATOMS.findall(rest):
        if atom in known:
            result.append(known[atom])
        elif atom == "'":
            result.append("real")
        elif atom == "''":
            result.append("imaginary")
        elif atom == "|":
            result.append("modulus")
        else:
            glued = _glued(atom)
            if glued is None:
                return None
            result += glued
    return result or None


def _glued(word: str) -> list[str] | None:
    """ "zreal", "rez", "zr", "ymod": an impedance's letter with a word at its side."""
    known = _notions()
    for letter, rest in ((word[0], word[1:]), (word[-1], word[:-1])):
        if letter not in "zyc" or not rest:
            continue
        if letter == word[0] and rest in ("r", "i"):
            return [known[letter], "real" if rest == "r" else "imaginary"]
        if known.get(rest) in ("real", "imaginary", "modulus", "phase"):
            return [known[letter], known[rest]]
    return None
