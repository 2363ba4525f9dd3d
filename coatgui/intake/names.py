"""Panel and exposure time from a file's name: `<panel>_<time><h|d>.<ext>` without being told, any
other form by pointing at its parts in one example."""

from __future__ import annotations

import re
from collections.abc import Iterable
from dataclasses import dataclass
from datetime import datetime
from pathlib import PurePosixPath

from coatgui.intake.labels import moment_in
from coatgui.intake.units import data

_NAME = re.compile(r"^(?P<panel>.+)_(?P<time>\d+(?:[.,]\d+)?)(?P<unit>[hd])$", re.IGNORECASE)
_WORD = re.compile(r"[^\W_]+(?:[.,]\d+[^\W_]*)*")
_MARKED = re.compile(r"\{(panel|time|date):([^{}]+)\}")
_TIME = re.compile(r"^[^\W\d]*?(?P<number>\d+(?:[.,]\d+)?)(?P<unit>[^\W\d]*)$")


@dataclass(frozen=True, slots=True)
class NameSays:
    """What a name says; None and "" where it does not."""

    panel: str = ""
    exposure_h: float | None = None
    moment: datetime | None = None


def panel_and_hours(file: str) -> NameSays:
    """What a name of the form that is known without asking says."""
    found = _NAME.match(PurePosixPath(file).stem)
    if not found:
        return NameSays()
    time = float(found["time"].replace(",", "."))
    return NameSays(found["panel"], time * (24.0 if found["unit"].lower() == "d" else 1.0))


@dataclass(frozen=True, slots=True)
class Part:
    """A word of a path. `level` is 0 for the file's name, 1 for its folder, and so on; `place` is
    the word's number in there; `start` and `stop` are characters of the whole path."""

    text: str
    level: int
    place: int
    start: int
    stop: int


def parts_of(file: str) -> tuple[Part, ...]:
    """The words of a path, without the file's ending, to be pointed at."""
    path = PurePosixPath(file)
    ending = len(path.suffix)
    pieces = file.split("/")
    found = []
    begin = 0
    for number, piece in enumerate(pieces):
        level = len(pieces) - 1 - number
        text = piece[: len(piece) - ending] if level == 0 and ending else piece
        for place, word in enumerate(_WORD.finditer(text)):
            found.append(Part(word[0], level, place, begin + word.start(), begin + word.end()))
        begin += len(piece) + 1
    return tuple(found)


@dataclass(frozen=True, slots=True)
class NamePattern:
    """Which words of a path are what, by (level, place). `panel` are one or more neighbouring
    words; `unit` is the unit of the time where the name itself has none. A `date` needs a start of
    exposure to become a time."""

    panel: tuple[tuple[int, int], ...] = ()
    time: tuple[int, int] | None = None
    unit: str = "h"
    date: tuple[tuple[int, int], ...] = ()

    @classmethod
    def pointed_at(
        cls,
        example: str,
        panel: tuple[int, int] | None = None,
        time: tuple[int, int] | None = None,
        unit: str = "h",
        date: tuple[int, int] | None = None,
    ) -> NamePattern:
        """The pattern that a person means by marking stretches of characters (start, stop) in one
        path. Raises ValueError where a mark holds no word or the unit is not known."""
        if unit.casefold() not in data()["unit"]["time"]:
            raise ValueError(f"'{unit}' is no unit of time that the program knows.")
        times = _marked(example, time)
        if len(times) > 1:
            raise ValueError("Mark one word only for the exposure time.")
        return cls(
            _marked(example, panel), times[0] if times else None, unit, _marked(example, date)
        )

    @classmethod
    def marked(cls, example: str, unit: str = "h") -> NamePattern:
        """The pattern of an example with its parts in braces, such as
        "week 3/{panel:B-07} t{time:168}h.txt" or "{panel:P07} {date:20260308}.csv". Raises
        ValueError."""
        plain, marks = "", {}
        at = 0
        for found in _MARKED.finditer(example):
            plain += example[at : found.start()]
            if found[1] in marks:
                raise ValueError(f"Mark the {found[1]} once only.")
            marks[found[1]] = (len(plain), len(plain) + len(found[2]))
            plain += found[2]
            at = found.end()
        if not marks:
            raise ValueError("Mark parts of an example, like '{panel:B-07} t{time:168}h.txt'.")
        return cls.pointed_at(plain + example[at:], unit=unit, **marks)

    def says(self, file: str) -> NameSays:
        """What a path says under this pattern; what it lacks stays empty."""
        by_place = {(part.level, part.place): part for part in parts_of(file)}
        return NameSays(
            _stretch(file, by_place, self.panel),
            self._hours(by_place),
            moment_in(_iso(_stretch(file, by_place, self.date)))[0] if self.date else None,
        )

    def _hours(self, by_place: dict[tuple[int, int], Part]) -> float | None:
        part = by_place.get(self.time) if self.time is not None else None
        found = _TIME.match(part.text) if part is not None else None
        if found is None:
            return None
        units = data()["unit"]["time"]
        factor = units.get((found["unit"] or self.unit).casefold())
        return None if factor is None else float(found["number"].replace(",", ".")) * float(factor)

    def table(self, files: Iterable[str]) -> list[tuple[str, NameSays]]:
        """What each of these files would become."""
        return [(file, self.says(file)) for file in files]


def _marked(example: str, mark: tuple[int, int] | None) -> tuple[tuple[int, int], ...]:
    if mark is None:
        return ()
    inside = [p for p in parts_of(example) if p.start < mark[1] and p.stop > mark[0]]
    if not inside or len({p.level for p in inside}) > 1:
        raise ValueError("Mark a word, or neighbouring words, of the name or of one folder.")
    return tuple((p.level, p.place) for p in inside)


def _stretch(
    file: str, by_place: dict[tuple[int, int], Part], places: tuple[tuple[int, int], ...]
) -> str:
    """The characters from the first of these words to the last, "" where one is missing."""
    found = [by_place.get(place) for place in places]
    present = [part for part in found if part is not None]
    if not present or len(present) < len(found):
        return ""
    return file[present[0].start : present[-1].stop]


def _iso(text: str) -> str:
    """A date such as 20260301 or 2026_03_01 with hyphens."""
    found = re.fullmatch(r"(\d{4})[\s_.-]?(\d{2})[\s_.-]?(\d{2})", text)
    return "-".join(found.groups()) if found else text
