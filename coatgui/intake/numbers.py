"""Numbers as people and machines write them: decimal sign, thousands, exponents."""

from __future__ import annotations

import re
from collections.abc import Callable, Iterable
from dataclasses import dataclass
from functools import cache

from coatgui.intake.errors import Unclear

# What may stand between groups of three digits, besides the comma or point that is not the
# decimal sign: apostrophes and blanks.
_GAPS = "'’ \u00a0\u2009\u202f"
_EXPONENT = r"(?:[eEdD][+\-−]?\d{1,4})?"
_NUMERIC = re.compile(rf"[+\-−]?[\d.,](?:[\d.,{_GAPS}]*[\d.,])?{_EXPONENT}")
_ODD_MINUS = str.maketrans({"−": "-", "D": "e", "d": "e"})


@dataclass(frozen=True, slots=True)
class Style:
    """`thousands` is what stands between groups of three digits, "" where nothing does."""

    decimal_sign: str = "."
    thousands: str = ""


@cache
def _pattern(style: Style) -> re.Pattern[str]:
    point = re.escape(style.decimal_sign)
    whole = r"\d+"
    if style.thousands:
        whole = rf"(?:\d{{1,3}}(?:{re.escape(style.thousands)}\d{{3}})+|\d+)"
    return re.compile(rf"[+\-−]?(?:{whole}(?:{point}\d*)?|{point}\d+){_EXPONENT}")


def number_reader(style: Style) -> Callable[[str], float | None]:
    """A function that gives the number in a cell, or None where it holds none. Numbers may overflow
    to infinity."""
    match = _pattern(style).fullmatch
    thousands, comma = style.thousands, style.decimal_sign == ","

    def read(cell: str) -> float | None:
        if not match(cell):
            return None
        if thousands:
            cell = cell.replace(thousands, "")
        if comma:
            cell = cell.replace(",", ".")
        try:
            return float(cell)
        except ValueError:
            return float(cell.translate(_ODD_MINUS))

    return read


@cache
def line_pattern(style: Style, delimiter: str) -> re.Pattern[str]:
    """Lines of nothing but numbers of a style, parted by a delimiter ("" for blanks)."""
    one = rf"\s*{_pattern(style).pattern}\s*"
    between = re.escape(delimiter) if delimiter else r"\s"
    return re.compile(rf"{one}(?:{between}{one})+")


def number(cell: str, style: Style) -> float | None:
    """The number in one cell; see `number_reader`."""
    return number_reader(style)(cell)


def looks_numeric(cell: str) -> bool:
    """Whether a cell is a number in some style."""
    return bool(_NUMERIC.fullmatch(cell))


def style_of(cells: Iterable[str], told: str = "") -> Style | None:
    """The style in which all of these numeric cells are written, None where there is none.

    A sign followed by other than three digits, or after more than three, is a decimal sign; one
    that comes twice parts thousands. `told` is a decimal sign that is known. Raises Unclear where
    "1,234" could be either.
    """
    decimal: set[str] = {told} if told else set()
    thousands: set[str] = set()
    unsure: set[str] = set()
    plain_thousands = False
    for cell in cells:
        body = re.split("[eEdD]", cell.lstrip("+-−"), maxsplit=1)
        digits = body[0]
        signs = [c for c in digits if c in ".,"]
        gaps = {c for c in digits if c in _GAPS}
        thousands |= gaps
        if not signs:
            plain_thousands |= len(digits) >= 4 and not gaps
            continue
        if len(set(signs)) == 2:
            decimal.add(signs[-1])
            thousands.add(signs[0])
        elif len(signs) > 1:
            thousands.add(signs[0])
        else:
            left, right = digits.split(signs[0])
            sure = bool(gaps) or len(body) > 1 or len(right) != 3
            sure |= not 1 <= len(left) <= 3 or left.startswith("0")
            (decimal if sure else unsure).add(signs[0])
            plain_thousands |= sure and len(left) >= 4 and not gaps
    marks = thousands & {".", ","}
    if not decimal and marks:
        decimal = {",", "."} - marks
    if not decimal and len(unsure) == 1 and plain_thousands:
        decimal = set(unsure)  # elsewhere thousands stand unparted, so this is no such sign
    if not decimal and not unsure:
        decimal = {"."}
    if not decimal:
        raise Unclear(
            "The numbers could be thousands or decimals, like 1,234: say which the decimal sign is."
        )
    if len(decimal) > 1 or len(thousands) > 1 or decimal & thousands:
        return None
    parted = thousands | (unsure - decimal)
    if len(parted) > 1:
        return None
    if parted and not thousands and plain_thousands:
        raise Unclear(
            "Some numbers seem to have parted thousands and others not: say which the decimal "
            "sign is."
        )
    return Style(decimal.pop(), parted.pop() if parted else "")
