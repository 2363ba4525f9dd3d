"""What a person can do with ratings, photographs and the names on a summary."""

from __future__ import annotations

import hashlib
from collections.abc import Collection, Iterable
from dataclasses import replace
from typing import Any

from coatgui.campaign import photographs
from coatgui.campaign.build import new_id
from coatgui.campaign.changes import Operation
from coatgui.campaign.errors import OperationRefused
from coatgui.campaign.lookup import panel_of, photograph_of, rating_of, reading_of
from coatgui.campaign.replacing import replacing
from coatgui.campaign.rules import operation
from coatgui.records import Campaign, Photograph, Rating, VisualRating

_IDENTIFICATION = ("laboratory", "customer", "order", "author", "reviewer", "standards")


def identify(campaign: Campaign, **fields: Any) -> Operation:
    """Change what a summary names: laboratory, customer, order, author, reviewer, standards."""
    tidy: dict[str, Any] = {}
    for name, value in fields.items():
        if name not in _IDENTIFICATION:
            raise OperationRefused(f"'{name}' cannot be changed here.")
        if name == "standards":
            tidy[name] = tuple(text.strip() for text in value)
        else:
            tidy[name] = value.strip() if isinstance(value, str) else value
    changed = replace(campaign.identification, **tidy)
    differing = [n for n in tidy if getattr(changed, n) != getattr(campaign.identification, n)]
    after = replace(campaign, identification=changed)
    return operation(f"Set {', '.join(differing)} of the summary", campaign, after)


# ---------------------------------------------------------------------------------------------
# Ratings


def add_ratings(campaign: Campaign, seen: Iterable[VisualRating]) -> Operation:
    """Ratings by their scales; whether a scale has the grade is `assessment.ratings.order`'s to
    say, before."""
    made = tuple(Rating(new_id(), _tidy(one)) for one in seen)
    if not made:
        raise OperationRefused("Give at least one rating.")
    where = panel_of(campaign, made[0].seen.panel_id).name if len(made) == 1 else ""
    name = f"Rate panel {where} {made[0].seen.value}" if where else f"Add {len(made)} ratings"
    return operation(name, campaign, replace(campaign, ratings=(*campaign.ratings, *made)))


def rate_reading(campaign: Campaign, reading_id: str, scale: str, grade: str) -> Operation:
    """A rating of the panel of a reading at its exposure time."""
    reading = reading_of(campaign, reading_id)
    return add_ratings(campaign, [VisualRating(reading.panel_id, reading.exposure_h, scale, grade)])


def edit_rating(campaign: Campaign, rating_id: str, **fields: Any) -> Operation:
    """Change fields of a `VisualRating`, by name."""
    rating = rating_of(campaign, rating_id)
    try:
        changed = replace(rating, seen=_tidy(replace(rating.seen, **fields)))
    except TypeError:
        raise OperationRefused("A rating does not have such a field.") from None
    where = panel_of(campaign, rating.seen.panel_id).name
    return replacing(f"Change a rating of panel {where}", campaign, [(rating, changed)])


def remove_ratings(campaign: Campaign, rating_ids: Collection[str]) -> Operation:
    for rating_id in rating_ids:
        rating_of(campaign, rating_id)
    left = tuple(r for r in campaign.ratings if r.rating_id not in rating_ids)
    number = len(campaign.ratings) - len(left)
    name = "Remove a rating" if number == 1 else f"Remove {number} ratings"
    return operation(name, campaign, replace(campaign, ratings=left))


# ---------------------------------------------------------------------------------------------
# Photographs


def add_photograph(
    campaign: Campaign,
    panel_id: str,
    content: bytes,
    *,
    file: str = "",
    caption: str = "",
    exposure_h: float | None = None,
) -> Operation:
    """Keep a photograph of a panel. Its type is found from `content`; `file` is only its name."""
    where = panel_of(campaign, panel_id).name
    kept, media_type = photographs.judged(content)
    sha256 = hashlib.sha256(kept).hexdigest()
    made = Photograph(
        new_id(),
        panel_id,
        sha256,
        media_type,
        None if exposure_h is None else float(exposure_h),
        caption.strip(),
        photographs.plain_name(file),
    )
    after = replace(campaign, photographs=(*campaign.photographs, made))
    return operation(f"Add a photograph of panel {where}", campaign, after, {sha256: kept})


def photograph_reading(
    campaign: Campaign, reading_id: str, content: bytes, *, file: str = "", caption: str = ""
) -> Operation:
    """A photograph of the panel of a reading at its exposure time."""
    reading = reading_of(campaign, reading_id)
    return add_photograph(
        campaign,
        reading.panel_id,
        content,
        file=file,
        caption=caption,
        exposure_h=reading.exposure_h,
    )


def edit_photograph(campaign: Campaign, photograph_id: str, **fields: Any) -> Operation:
    """Change caption, panel or exposure time."""
    photograph = photograph_of(campaign, photograph_id)
    if not fields.keys() <= {"caption", "panel_id", "exposure_h"}:
        raise OperationRefused("Only caption, panel and exposure time of a photograph can change.")
    at = fields.get("exposure_h", photograph.exposure_h)
    changed = replace(photograph, **{**fields, "exposure_h": None if at is None else float(at)})
    where = panel_of(campaign, photograph.panel_id).name
    return replacing(f"Change a photograph of panel {where}", campaign, [(photograph, changed)])


def remove_photograph(campaign: Campaign, photograph_id: str) -> Operation:
    """It leaves the campaign; its bytes stay in the file, for undo."""
    photograph = photograph_of(campaign, photograph_id)
    where = panel_of(campaign, photograph.panel_id).name
    left = tuple(p for p in campaign.photographs if p is not photograph)
    return operation(
        f"Remove a photograph of panel {where}", campaign, replace(campaign, photographs=left)
    )


# ---------------------------------------------------------------------------------------------
# Finding


def without_panel(campaign: Campaign, panel_id: str) -> Campaign:
    """The campaign without the ratings and photographs of a panel that goes."""
    return replace(
        campaign,
        ratings=tuple(r for r in campaign.ratings if r.seen.panel_id != panel_id),
        photographs=tuple(p for p in campaign.photographs if p.panel_id != panel_id),
    )


def _tidy(seen: VisualRating) -> VisualRating:
    return replace(
        seen,
        exposure_h=_hours(seen.exposure_h),
        scale=seen.scale.strip(),
        value=seen.value.strip(),
        edition=seen.edition.strip(),
        rater=seen.rater.strip(),
    )


def _hours(value: Any) -> Any:
    return float(value) if isinstance(value, int) and not isinstance(value, bool) else value
