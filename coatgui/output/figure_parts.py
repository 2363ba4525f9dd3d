"""What the figures have in common: their width, the quantities they take, how formulations look."""

from __future__ import annotations

from collections.abc import Callable

from coatgui.output.drawing import DASHES, SHAPES
from coatgui.records import Assessment, Quantity, ReadingAssessment

WIDTH = 480.0  # points: the width of the text on a page
INKS = ("#1F4E79", "#A63F1E", "#1E6F6A", "#7A3E70", "#8A5A00", "#545C61")

Take = Callable[[ReadingAssessment], Quantity | None]


def ink_of(place: int) -> tuple[str, str, str]:
    """Colour, shape and dashes of the formulation at this place."""
    return (
        INKS[place % len(INKS)],
        SHAPES[place % len(SHAPES)],
        DASHES[place % len(DASHES)],
    )


def watched_frequency(assessment: Assessment) -> float | None:
    """The first frequency of the modulus: the one that panels are judged by."""
    return next((m.frequency_hz for r in assessment.readings for m in r.modulus), None)


def modulus_taken(frequency_hz: float) -> Take:
    def take(reading: ReadingAssessment) -> Quantity | None:
        at = reading.modulus_at(frequency_hz)
        return None if at is None else at.quantity

    return take


def uptake_taken(reading: ReadingAssessment) -> Quantity | None:
    return None if reading.water_uptake is None else reading.water_uptake.quantity


def shortened(text: str, most: int) -> str:
    """Text that fits beside a picture; the whole name stands in the tables."""
    text = " ".join(text.split())
    return text if len(text) <= most else text[: most - 1] + "…"


def between(pale: tuple[int, int, int], deep: tuple[int, int, int], share: float) -> str:
    """A colour at a share of the way from one to the other."""
    return "#" + "".join(
        f"{round(a + (b - a) * share):02X}" for a, b in zip(pale, deep, strict=True)
    )
