"""A document as blocks, built once and drawn by `html_form.py` and `pages.py`.

Every text in it is plain text: whoever draws it must not take any of it for markup.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from enum import Enum, auto

from coatgui.output.drawing import Drawing


class Style(Enum):
    TEXT = auto()
    LEAD = auto()
    SMALL = auto()


@dataclass(frozen=True, slots=True)
class Heading:
    """`level` is 1 for a section, 2 for a part of one."""

    text: str
    level: int = 1


@dataclass(frozen=True, slots=True)
class Paragraph:
    text: str
    style: Style = Style.TEXT


@dataclass(frozen=True, slots=True)
class Listing:
    items: tuple[str, ...]
    numbered: bool = False


@dataclass(frozen=True, slots=True)
class Table:
    """`rows` are as wide as `headings`. `shares` are the columns' widths against each other;
    `numbers` are the columns that stand flush right."""

    caption: str
    headings: tuple[str, ...]
    rows: tuple[tuple[str, ...], ...]
    shares: tuple[float, ...]
    numbers: frozenset[int] = frozenset()


@dataclass(frozen=True, slots=True)
class Figure:
    """`name` serves for a file; `alternative` says in words what the picture shows."""

    name: str
    drawing: Drawing
    caption: str
    alternative: str


@dataclass(frozen=True, slots=True)
class Picture:
    """A photograph; `content` are the bytes of a PNG or JPEG, as `media_type` says."""

    content: bytes
    media_type: str
    caption: str
    alternative: str


Block = Heading | Paragraph | Listing | Table | Figure | Picture


@dataclass(frozen=True, slots=True)
class Document:
    """`running` stands at the head of every page."""

    title: str
    running: str
    author: str
    subject: str
    blocks: tuple[Block, ...]

    def numbered(self) -> Iterator[tuple[Block, str]]:
        """Each block with its number: "2" and "2.1" for headings, "Table 3", "Figure 1", else
        nothing."""
        sections = parts = tables = figures = 0
        for block in self.blocks:
            number = ""
            if isinstance(block, Heading):
                if block.level == 1:
                    sections, parts = sections + 1, 0
                    number = str(sections)
                else:
                    parts += 1
                    number = f"{sections}.{parts}"
            elif isinstance(block, Table):
                tables += 1
                number = f"Table {tables}"
            elif isinstance(block, Figure | Picture):
                figures += 1
                number = f"Figure {figures}"
            yield block, number
