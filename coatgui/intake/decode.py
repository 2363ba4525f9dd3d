"""From bytes to lines of cells: encoding, delimiter, decimal sign."""

from __future__ import annotations

import codecs
import csv
import re
from dataclasses import dataclass

LARGEST_FILE = 200_000_000

_POINT = re.compile(r"^[+−-]?(\d+\.?\d*|\.\d+)([eEdD][+−-]?\d+)?$")
_COMMA = re.compile(r"^[+−-]?(\d+,?\d*|,\d+)([eEdD][+−-]?\d+)?$")


class Unreadable(Exception):
    """A file that cannot be used; the message is one sentence for a person."""


@dataclass(frozen=True, slots=True)
class Grid:
    """The cells of a text file. `lines` are as many as the file has; empty ones are empty."""

    encoding: str
    delimiter: str
    decimal_sign: str
    lines: tuple[tuple[str, ...], ...]


def decode(data: bytes) -> tuple[str, str]:
    """Text and encoding. Raises Unreadable for what is no text."""
    if len(data) > LARGEST_FILE:
        raise Unreadable("The file is larger than 200 MB: split it.")
    for mark, name in (
        (codecs.BOM_UTF8, "utf-8-sig"),
        (codecs.BOM_UTF16_LE, "utf-16"),
        (codecs.BOM_UTF16_BE, "utf-16"),
    ):
        if data.startswith(mark):
            try:
                return data.decode(name), name
            except UnicodeDecodeError as error:
                raise Unreadable(
                    f"The file says it is {name} but breaks at byte {error.start}."
                ) from None
    if b"\x00" in data[:4096]:
        half = data[1:400:2].count(0) >= data[0:400:2].count(0)
        name = "utf-16-le" if half else "utf-16-be"
        try:
            text = data.decode(name)
        except UnicodeDecodeError:
            raise Unreadable("The file is not text: export the table as text.") from None
        if text.isprintable() or any(c in text for c in "\n\t"):
            return text, name
    try:
        return data.decode("utf-8"), "utf-8"
    except UnicodeDecodeError:
        pass
    if any(byte < 9 for byte in data[:4096]):
        raise Unreadable("The file is not text: export the table as text.")
    try:
        return data.decode("cp1252"), "cp1252"
    except UnicodeDecodeError:
        return data.decode("latin-1"), "latin-1"


def is_number(cell: str, decimal_sign: str) -> bool:
    return bool((_POINT if decimal_sign == "." else _COMMA).match(cell))


def to_number(cell: str, decimal_sign: str) -> float:
    """The number in a cell that `is_number` takes."""
    text = cell.replace("−", "-")
    if decimal_sign == ",":
        text = text.replace(",", ".")
    return float(text.replace("D", "e").replace("d", "e"))


def _split(text: str, delimiter: str) -> list[tuple[str, ...]]:
    if delimiter == " ":
        return [tuple(line.split()) for line in text.splitlines()]
    reader = csv.reader(text.splitlines(), delimiter=delimiter)
    try:
        return [tuple(cell.strip() for cell in row) for row in reader]
    except csv.Error:
        raise Unreadable("The file is not a table of text: a cell is far too long.") from None


def _trimmed(row: tuple[str, ...]) -> tuple[str, ...]:
    while row and not row[-1]:
        row = row[:-1]
    return row


def numeric_lines(lines: list[tuple[str, ...]], decimal_sign: str) -> int:
    """How many lines hold at least two numbers of this kind, and nothing that is half a number."""
    return sum(
        sum(is_number(cell, decimal_sign) for cell in row) >= 2 for row in lines if len(row) >= 2
    )


def cells(text: str, encoding: str) -> Grid:
    """Part text into cells. Delimiter and decimal sign are found together: the pair under which
    most lines hold the same number (three or more, or two) of numeric cells. Raises Unreadable
    where the text holds no table, or where two pairs make equal sense."""
    best: list[tuple[int, int, str, str, list[tuple[str, ...]]]] = []
    for delimiter in (";", "\t", ",", "|", " "):
        if delimiter != " " and delimiter not in text:
            continue
        lines = [_trimmed(row) for row in _split(text, delimiter)]
        for decimal_sign in (".", ","):
            if decimal_sign == delimiter:
                continue
            wide = numeric_lines(lines, decimal_sign)
            if wide < 3:
                continue
            width = _usual_width(lines, decimal_sign)
            # A comma that parts cells of whole numbers could as well be a decimal sign; a
            # delimiter whose cells hold no other candidate sign is the better account.
            best.append((wide, -abs(width - 3), delimiter, decimal_sign, lines))
    if not best:
        raise Unreadable("The file holds no table of numbers: nothing to read.")
    most = max(entry[0] for entry in best)
    good = [entry for entry in best if entry[0] >= 0.9 * most and entry[1] > -1000]
    order = {";": 0, "\t": 1, "|": 2, ",": 3, " ": 4}
    good.sort(
        key=lambda e: (
            -_consistency(e[4], e[3]),
            -_numeric_share(e[4], e[3]),
            order[e[2]],
            -_signs(e[4], e[3]),
        )
    )
    _, _, delimiter, decimal_sign, lines = good[0]
    return Grid(encoding, delimiter, decimal_sign, tuple(lines))


def _usual_width(lines: list[tuple[str, ...]], decimal_sign: str) -> int:
    widths = [len(row) for row in lines if sum(is_number(c, decimal_sign) for c in row) >= 2]
    return max(set(widths), key=widths.count) if widths else 0


def _consistency(lines: list[tuple[str, ...]], decimal_sign: str) -> float:
    """Share of the numeric lines that have the usual width and hold only numbers and words."""
    rows = [row for row in lines if sum(is_number(c, decimal_sign) for c in row) >= 2]
    width = _usual_width(lines, decimal_sign)
    other = "," if decimal_sign == "." else "."
    whole = sum(
        len(row) == width
        and not any(is_number(c, other) and not is_number(c, decimal_sign) for c in row)
        for row in rows
    )
    return round(whole / len(rows), 2)


def _numeric_share(lines: list[tuple[str, ...]], decimal_sign: str) -> float:
    """Share of numeric cells on numeric lines: parted wrongly, cells are half numbers."""
    rows = [row for row in lines if sum(is_number(c, decimal_sign) for c in row) >= 2]
    number = sum(is_number(c, decimal_sign) for row in rows for c in row)
    return round(number / max(sum(len(row) for row in rows), 1), 2)


def _signs(lines: list[tuple[str, ...]], decimal_sign: str) -> int:
    """How many cells use the decimal sign: what is used is what is meant."""
    return sum(decimal_sign in c for row in lines for c in row if is_number(c, decimal_sign))
