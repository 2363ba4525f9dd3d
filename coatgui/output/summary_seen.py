"""What people saw on the panels, as the campaign keeps it: ratings one by one, and photographs."""

from __future__ import annotations

from collections.abc import Mapping

from coatgui.assessment.ratings import edition, scales
from coatgui.output.document import Picture, Table
from coatgui.output.shown import NOTHING, hours
from coatgui.records import Campaign

# Own choice: what a mail still carries once photographs are written as text in an HTML file.
_MOST_BYTES = 60_000_000


def rated_table(campaign: Campaign) -> Table:
    """Every rating with its edition and who gave it."""
    panels = {panel.panel_id: panel.name for panel in campaign.panels}
    rows = []
    for rating in campaign.ratings:
        seen = rating.seen
        known = seen.scale in scales()
        rows.append(
            (
                panels.get(seen.panel_id, NOTHING),
                hours(seen.exposure_h),
                str(scales()[seen.scale]["name"]) if known else seen.scale,
                (edition(seen) if known else seen.edition) or NOTHING,
                seen.value,
                seen.rater or NOTHING,
                seen.remark or NOTHING,
            )
        )
    return Table(
        "Ratings as they were given, with the edition of the scale and the person.",
        ("panel", "hours", "scale", "edition", "grade", "rater", "remark"),
        tuple(rows),
        (0.9, 0.8, 2.6, 1.4, 0.8, 1.2, 2.2),
        frozenset({1}),
    )


def pictures(
    campaign: Campaign, photographs: Mapping[str, bytes]
) -> tuple[tuple[Picture, ...], int]:
    """Photographs in the order of panels and times, and how many cannot be shown."""
    panels = {panel.panel_id: panel.name for panel in campaign.panels}
    place = {panel_id: i for i, panel_id in enumerate(panels)}
    ordered = sorted(
        campaign.photographs,
        key=lambda p: (place.get(p.panel_id, len(place)), p.exposure_h is None, p.exposure_h or 0),
    )
    shown: list[Picture] = []
    room = _MOST_BYTES
    for photograph in ordered:
        content = photographs.get(photograph.sha256)
        if content is None or len(content) > room:
            continue
        room -= len(content)
        when = "" if photograph.exposure_h is None else f" at {photograph.exposure_h:g} h"
        whose = f"Panel {panels.get(photograph.panel_id, NOTHING)}{when}"
        words = photograph.caption.strip().rstrip(".")
        caption = f"{whose}: {words}." if words else f"{whose}."
        shown.append(Picture(content, photograph.media_type, caption, f"Photograph. {caption}"))
    return tuple(shown), len(ordered) - len(shown)
