"""The courses as a table: what the plots show, for a spreadsheet or a screen reader."""

from __future__ import annotations

from collections.abc import Sequence

from coatgui.fitting.relaxation import RelaxationOutline
from coatgui.records import Assessment, ReadingAssessment
from coatgui.window.places.map_place import amount

_HEADINGS = (
    "formulation", "panel", "exposure_h", "quantity", "value", "low", "high", "bound", "unit",
)  # fmt: skip


def course_rows(
    assessment: Assessment | None,
    code: str,
    here: ReadingAssessment | None,
    outlines: Sequence[tuple[float, RelaxationOutline | None]] | None,
) -> list[list[object]]:
    """The quantity `code` and the water of every reading that counts, the events and the ratings;
    the time constants of the panel `here` where they are shown."""
    rows: list[list[object]] = [list(_HEADINGS)]
    if assessment is None:
        return rows
    for each in (code, "water_uptake"):
        for r in assessment.readings:
            q = amount(r, each)
            if q is not None and r.counts:
                rows.append(
                    [r.formulation, r.panel, r.exposure_h, each, q.value, q.low, q.high,
                     q.bound.value, q.unit]
                )  # fmt: skip
    for panel in assessment.panels:
        for event in panel.events:
            rows.append(
                [panel.formulation, panel.panel, event.by_h, f"event: {event.code}", None,
                 event.after_h, event.by_h, "" if event.confirmed else "one reading", "h"]
            )  # fmt: skip
    for rating in assessment.ratings:
        for name, grade in rating.ratings:
            rows.append(
                [rating.formulation, name, rating.exposure_h, rating.scale, grade,
                 None, None, "", ""]
            )  # fmt: skip
    names = [here.formulation, here.panel] if here else ["", ""]
    for exposure_h, outline in outlines or ():
        rows += [
            [*names, exposure_h, "time_constant_exploratory", peak.time_constant_s, None, None, "",
             "s"]
            for peak in (outline.peaks if outline else ())
        ]  # fmt: skip
    return rows
