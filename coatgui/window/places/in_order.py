"""The places in their order, each built when it is first wanted: the window is there sooner."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from importlib import import_module
from typing import overload

from PySide6.QtWidgets import QVBoxLayout, QWidget

from coatgui.window.places.place import Place

# Noun and question as the place has them, and the class in the module of its name.
ORDER = (
    ("Map", "Where does the campaign stand?", "MapPlace"),
    ("Reading", "What does this spectrum say?", "ReadingPlace"),
    ("Course", "How is it going?", "CoursePlace"),
    ("Water", "How much water does the film take up, and how fast?", "WaterPlace"),
    ("Comparison", "Which is better, and are we sure?", "ComparisonPlace"),
    ("Doubts", "What needs a person's eye?", "DoubtsPlace"),
    ("Summary", "What do we hand over?", "SummaryPlace"),
    ("Settings", "By what is this campaign judged?", "SettingsPlace"),
)
NOUNS = tuple(noun for noun, _, _ in ORDER)


class Places(Sequence[Place]):
    """`make` builds a place of a class. Every place has a widget in `holders` from the beginning,
    which it fills when it is built."""

    def __init__(self, make: Callable[[type[Place]], Place]) -> None:
        self._make = make
        self.holders = [QWidget() for _ in ORDER]
        self._built: dict[int, Place] = {}

    @property
    def built(self) -> list[Place]:
        return list(self._built.values())

    def is_built(self, number: int) -> bool:
        return number in self._built

    def __len__(self) -> int:
        return len(ORDER)

    @overload
    def __getitem__(self, number: int) -> Place: ...
    @overload
    def __getitem__(self, number: slice) -> Sequence[Place]: ...
    def __getitem__(self, number: int | slice) -> Place | Sequence[Place]:
        if isinstance(number, slice):
            return [self[each] for each in range(len(self))[number]]
        number = range(len(self))[number]
        if number not in self._built:
            name = ORDER[number][2]
            module = f"{name.removesuffix('Place').lower()}_place"
            kind = getattr(import_module(f"coatgui.window.places.{module}"), name)
            place = self._make(kind)
            column = QVBoxLayout(self.holders[number])
            column.setContentsMargins(0, 0, 0, 0)
            column.addWidget(place)
            self._built[number] = place
        return self._built[number]
