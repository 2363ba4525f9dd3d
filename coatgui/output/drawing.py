"""A small painter of lines, marks and words that gives SVG.

Nothing in a drawing depends on the machine, the clock or a library, so the same picture gives the
same bytes. Lines differ by dashes and marks by shape, so that it reads in black and white.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from html import escape

from coatgui.output.text import printable

INK, SECOND, GRID, PAPER = "#20282E", "#545C61", "#D9D3C7", "#FFFFFF"
FONT = "DejaVu Sans, Liberation Sans, Arial, Helvetica, sans-serif"
DASHES = ("", "7 3", "2 3", "9 3 2 3", "5 2 2 2 2 2", "1 4")
SHAPES = ("circle", "square", "triangle", "diamond", "down", "cross")

Point = tuple[float, float]


def _n(value: float) -> str:
    text = f"{value:.2f}".rstrip("0").rstrip(".")
    return "0" if text in ("-0", "") else text


class Drawing:
    """Elements in the order in which they are painted; units are points of 1/72 inch, y down."""

    def __init__(self, width: float, height: float) -> None:
        self.width, self.height = width, height
        self._elements: list[str] = []

    def line(
        self,
        points: Sequence[Point],
        colour: str = INK,
        width: float = 1.0,
        dashes: str = "",
    ) -> None:
        """A line through the points; a single point is not drawn."""
        if len(points) < 2:
            return
        path = " ".join(f"{_n(x)},{_n(y)}" for x, y in points)
        dashed = f' stroke-dasharray="{dashes}"' if dashes else ""
        self._elements.append(
            f'<polyline points="{path}" fill="none" stroke="{colour}" '
            f'stroke-width="{_n(width)}"{dashed}/>'
        )

    def area(self, points: Sequence[Point], fill: str, stroke: str = "linear") -> None:
        path = " ".join(f"{_n(x)},{_n(y)}" for x, y in points)
        self._elements.append(f'<polygon points="{path}" fill="{fill}" stroke="{stroke}"/>')

    def box(
        self, x: float, y: float, width: float, height: float, fill: str, stroke: str = "none"
    ) -> None:
        self._elements.append(
            f'<rect x="{_n(x)}" y="{_n(y)}" width="{_n(width)}" height="{_n(height)}" '
            f'fill="{fill}" stroke="{stroke}" stroke-width="0.75"/>'
        )

    def mark(
        self, shape: str, at: Point, colour: str = INK, size: float = 3.0, fill: str = PAPER
    ) -> None:
        """A mark of one of SHAPES around a point."""
        x, y = at
        if shape == "circle":
            self._elements.append(
                f'<circle cx="{_n(x)}" cy="{_n(y)}" r="{_n(size)}" fill="{fill}" '
                f'stroke="{colour}" stroke-width="1"/>'
            )
            return
        if shape == "cross":
            self.line([(x - size, y - size), (x + size, y + size)], colour, 1.2)
            self.line([(x - size, y + size), (x + size, y - size)], colour, 1.2)
            return
        corners = {
            "square": ((-0.9, -0.9), (0.9, -0.9), (0.9, 0.9), (-0.9, 0.9)),
            "triangle": ((0.0, -1.2), (1.1, 0.8), (-1.1, 0.8)),
            "diamond": ((0.0, -1.25), (1.25, 0.0), (0.0, 1.25), (-1.25, 0.0)),
            "down": ((0.0, 1.2), (1.1, -0.8), (-1.1, -0.8)),
        }[shape]
        self.area([(x + size * a, y + size * b) for a, b in corners], fill, colour)

    def arrow(self, at: Point, upward: bool, colour: str = INK, length: float = 11.0) -> None:
        """From a bound to where the value may lie."""
        x, y = at
        end = y - length if upward else y + length
        back = 3.5 if upward else -3.5
        self.line([(x, y), (x, end)], colour, 1.0)
        self.line([(x - 2.5, end + back), (x, end), (x + 2.5, end + back)], colour, 1.0)

    def text(
        self,
        at: Point,
        text: str,
        *,
        anchor: str = "start",
        size: float = 8.0,
        colour: str = INK,
        bold: bool = False,
        upright: bool = False,
    ) -> None:
        """`anchor` is start, middle or end; `upright` turns the text to be read from the right."""
        x, y = at
        turned = f' transform="rotate(-90 {_n(x)} {_n(y)})"' if upright else ""
        weight = ' font-weight="bold"' if bold else ""
        self._elements.append(
            f'<text x="{_n(x)}" y="{_n(y)}" font-size="{_n(size)}" text-anchor="{anchor}" '
            f'fill="{colour}"{weight}{turned}>{escape(printable(text))}</text>'
        )

    def svg(self, title: str, description: str, name: str = "") -> str:
        """The picture as an SVG element. `name` keeps the ids of several on one page apart."""
        ids = f"{name or 'picture'}-title", f"{name or 'picture'}-words"
        return (
            f'<svg xmlns="http://www.w3.org/2000/svg" viewBox="0 0 {_n(self.width)} '
            f'{_n(self.height)}" width="{_n(self.width)}pt" height="{_n(self.height)}pt" '
            f'font-family="{FONT}" role="img" aria-labelledby="{ids[0]} {ids[1]}">'
            f'<title id="{ids[0]}">{escape(printable(title))}</title>'
            f'<desc id="{ids[1]}">{escape(printable(description))}</desc>'
            + "".join(self._elements)
            + "</svg>"
        )


# ---------------------------------------------------------------------------------------------
# Axes

_PREFIXES = {-15: "f", -12: "p", -9: "n", -6: "µ", -3: "m", 0: "", 3: "k", 6: "M", 9: "G", 12: "T"}


def with_prefix(value: float) -> str:
    """ "10 M" for 1e7, "100 p" for 1e-10."""
    if value == 0:
        return "0"
    power = 3 * math.floor(math.log10(abs(value)) / 3 + 1e-9)
    power = min(max(power, -15), 12)
    return f"{value / 10.0**power:.3g} {_PREFIXES[power]}".rstrip()


def drawable(value: float, kind: str) -> bool:
    """Numbers near the ends of what a computer holds have no place on an axis."""
    if not abs(value) < 1e200 or (kind == "root" and value < 0):
        return False
    return kind != "log" or value > 1e-200


class Scale:
    """From values to places. `kind` is log, linear or root; a place is None where the value cannot
    be drawn on such a scale."""

    def __init__(self, low: float, high: float, start: float, end: float, kind: str) -> None:
        self.kind = kind
        self.low, self.high = low, high
        first, last = self._footing(low), self._footing(high)
        assert first is not None
        assert last is not None
        self._first, self._start = first, start
        self._per = (end - start) / ((last - first) or 1.0)

    def _footing(self, value: float) -> float | None:
        if not drawable(value, self.kind):
            return None
        if self.kind == "log":
            return math.log10(value)
        return math.sqrt(value) if self.kind == "root" else value

    def __call__(self, value: float | None) -> float | None:
        footing = None if value is None else self._footing(value)
        return None if footing is None else self._start + (footing - self._first) * self._per

    def ticks(self) -> list[tuple[float, str]]:
        """At least two values with their labels."""
        if self.kind == "log":
            first, last = math.log10(self.low), math.log10(self.high)
            step = max(1, math.ceil((last - first) / 8))
            decades = [
                10.0**k for k in range(math.ceil(first - 1e-9), math.floor(last + 1e-9) + 1, step)
            ]
            for between in ((1, 2, 5), (1, 1.5, 2, 3, 4, 5, 6, 7, 8, 9)):
                if len(decades) < 3:
                    decades = [
                        m * 10.0**k
                        for k in range(math.floor(first), math.ceil(last) + 1)
                        for m in between
                        if self.low * 0.999 <= m * 10.0**k <= self.high * 1.001
                    ]
            if len(decades) < 2:
                decades = [self.low, self.high]
            return [(value, with_prefix(value)) for value in decades]
        if self.kind == "root":
            return [(value, f"{value:g}") for value in _squares(self.high)]
        span = (self.high - self.low) or 1.0
        raw = 10.0 ** math.floor(math.log10(span / 4))
        step_size = next(m * raw for m in (1, 2, 2.5, 5, 10) if span / (m * raw) <= 6)
        first_step = math.ceil(self.low / step_size - 1e-9)
        count = math.floor((self.high - first_step * step_size) / step_size + 1e-9) + 1
        values = [(first_step + i) * step_size for i in range(count)]
        return [(value, f"{value:.6g}") for value in values]


def _squares(high: float) -> list[float]:
    """Round values from 0 to `high` with room between them on a root scale."""
    top = math.floor(math.log10(high)) if high > 0 else 0
    candidates = [m * 10.0**k for k in range(top, top - 4, -1) for m in (8, 6, 4, 2, 1)]
    kept: list[float] = []
    for value in [v for v in candidates if v <= high]:
        if not kept or math.sqrt(kept[-1]) - math.sqrt(value) > 0.08 * math.sqrt(high):
            kept.append(value)
    return [0.0, *reversed([v for v in kept if v > 0.006 * high])]


def span_of(values: Sequence[float | None], kind: str) -> tuple[float, float] | None:
    """The ends of an axis that holds all the values; None where none can be drawn."""
    good = [v for v in values if v is not None and drawable(v, kind)]
    if not good:
        return None
    low, high = min(good), max(good)
    if kind == "log":
        if high / low < 30:  # less than a decade and a half: no room is wasted on whole decades
            return low / 1.25, high * 1.25
        return 10.0 ** math.floor(math.log10(low)), 10.0 ** math.ceil(math.log10(high))
    margin = 0.06 * (high - low) or max(abs(high) * 0.1, 1.0)
    if kind == "root":
        return 0.0, high + margin
    return (0.0 if 0 <= low < margin * 6 else low - margin), high + margin


class Plot:
    """A frame with two scales, its grid, ticks and titles drawn."""

    def __init__(
        self,
        drawing: Drawing,
        frame: tuple[float, float, float, float],
        x: tuple[float, float, str],
        y: tuple[float, float, str],
        titles: tuple[str, str],
    ) -> None:
        """`frame` is left, top, right, bottom; `x` and `y` are low, high and kind of scale."""
        left, top, right, bottom = frame
        self.drawing, self.frame = drawing, frame
        self.x = Scale(x[0], x[1], left, right, x[2])
        self.y = Scale(y[0], y[1], bottom, top, y[2])
        for value, label in self.x.ticks():
            place = self.x(value)
            if place is not None:
                drawing.line([(place, top), (place, bottom)], GRID, 0.5)
                drawing.text((place, bottom + 11), label, anchor="middle", size=7.5)
        for value, label in self.y.ticks() if titles[1] else ():
            place = self.y(value)
            if place is not None:
                drawing.line([(left, place), (right, place)], GRID, 0.5)
                drawing.text((left - 4, place + 2.7), label, anchor="end", size=7.5)
        drawing.line(
            [(left, top), (right, top), (right, bottom), (left, bottom), (left, top)], SECOND, 0.75
        )
        if titles[0]:
            drawing.text(((left + right) / 2, bottom + 24), titles[0], anchor="middle", size=8)
        middle = (left - 38, (top + bottom) / 2)
        if titles[1]:
            drawing.text(middle, titles[1], anchor="middle", size=8, upright=True)

    def at(self, x: float | None, y: float | None) -> Point | None:
        """Where a pair of values lies; None where it cannot be drawn."""
        across, down = self.x(x), self.y(y)
        return None if across is None or down is None else (across, down)
