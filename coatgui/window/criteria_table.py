"""What a campaign is judged by, as tables whose cells are typed in: criteria on the modulus, and
limits on the other quantities."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from typing import Any

from coatgui.assessment.rules import default_criteria
from coatgui.records import QUANTITIES, Criterion, Limit, Side
from coatgui.window.palette import Colours
from coatgui.window.typed import typed, written
from coatgui.window.typed_table import TypedTable

_WORDS = {
    "coating_capacitance": "film capacitance",
    "pore_resistance": "pore resistance",
    "water_uptake": "water uptake",
    "relative_permittivity": "film permittivity",
    "film_resistivity": "film resistivity",
}
_FIRST = {"coating_capacitance": 1e-8, "pore_resistance": 1e7, "water_uptake": 15.0,
          "relative_permittivity": 20.0, "film_resistivity": 1e9}  # fmt: skip


class CriteriaTable(TypedTable):
    def __init__(self, take: Callable[[tuple[Criterion, ...]], None]) -> None:
        columns = ("name", "at frequency", "|Z|·A falls below", "source")
        super().__init__(take, columns, "Criteria", "criterion")

    def show_criteria(self, own: tuple[Criterion, ...], tone: Colours) -> None:
        self.note.setText(
            "Panels are held against each of these."
            if own
            else "Usual limits, in force until the campaign has its own: change one to make it so."
        )
        self.show_records(own or default_criteria(), tone.ink if own else tone.second)

    def texts(self, record: Criterion) -> Sequence[str]:
        return (
            record.name,
            written(record.frequency_hz, "Hz"),
            written(record.ohm_cm2, "Ω cm²"),
            record.source,
        )

    def change(self, record: Criterion, column: int, text: str) -> dict[str, Any]:
        if column == 1:
            return {"frequency_hz": typed(text, "Hz")}
        if column == 2:
            return {"ohm_cm2": typed(text, "Ω cm²")}
        return {"name" if column == 0 else "source": text}

    def new(self, name: str) -> Criterion:
        like = self.records[-1] if self.records else default_criteria()[0]
        return Criterion(name, like.frequency_hz, like.ohm_cm2, "own")


class LimitsTable(TypedTable):
    """Limits on the modulus are criteria and stand in their own table; the others stand here."""

    def __init__(self, take: Callable[[tuple[Limit, ...]], None]) -> None:
        columns = ("name", "quantity", "broken", "value", "source")
        super().__init__(self._with_the_rest, columns, "Limits on other quantities", "limit")
        self._take_all = take
        self._rest: tuple[Limit, ...] = ()
        self.note.setText(f"Of {', '.join(_WORDS.values())}; broken above or below the value.")

    def show_limits(self, limits: tuple[Limit, ...], tone: Colours) -> None:
        self._rest = tuple(limit for limit in limits if limit.quantity not in _WORDS)
        self.show_records(tuple(x for x in limits if x.quantity in _WORDS), tone.ink)

    def _with_the_rest(self, limits: tuple[Limit, ...]) -> None:
        self._take_all((*self._rest, *limits))

    def texts(self, record: Limit) -> Sequence[str]:
        # As it can be typed again: only Ω cm² takes prefixes there.
        value = (
            written(record.value, record.unit)
            if record.unit == "Ω cm²"
            else f"{record.value:g} {record.unit}".strip()
        )
        return record.name, _WORDS[record.quantity], str(record.side), value, record.source

    def change(self, record: Limit, column: int, text: str) -> dict[str, Any]:
        if column == 1:
            code = next((code for code, words in _WORDS.items() if words == text.casefold()), "")
            if not code:
                raise ValueError(f"“{text}” is none of these: {', '.join(_WORDS.values())}.")
            # A value of one quantity says nothing of another.
            return {"quantity": code, "unit": QUANTITIES[code], "value": _FIRST[code]}
        if column == 2:
            if text.casefold() not in tuple(Side):
                raise ValueError("A limit is broken “above” or “below” its value.")
            return {"side": Side(text.casefold())}
        if column == 3:
            return {"value": typed(text, record.unit)}
        return {"name" if column == 0 else "source": text}

    def new(self, name: str) -> Limit:
        code = "water_uptake"
        return Limit(name, code, _FIRST[code], QUANTITIES[code], "own", Side.ABOVE)
