"""Rows of what is seen on panels, ratings and photographs, and of what a summary names."""

from __future__ import annotations

from typing import Any

from coatgui.campaign.cells import list_of, string, to_json
from coatgui.campaign.changes import Row
from coatgui.records import Identification, Photograph, Rating, VisualRating


def identification_cells(named: Identification) -> Row:
    return {
        "laboratory": named.laboratory,
        "customer": named.customer,
        "order_number": named.order,
        "author": named.author,
        "reviewer": named.reviewer,
        "standards": to_json(named.standards),
    }


def identification_of(row: Any) -> Identification:
    return Identification(
        laboratory=string(row["laboratory"]),
        customer=string(row["customer"]),
        order=string(row["order_number"]),
        author=string(row["author"]),
        reviewer=string(row["reviewer"]),
        standards=tuple(map(string, list_of(row["standards"]))),
    )


def rating_row(rating: Rating) -> Row:
    seen = rating.seen
    return {
        "rating_id": rating.rating_id,
        "panel_id": seen.panel_id,
        "exposure_h": float(seen.exposure_h),
        "scale": seen.scale,
        "grade": seen.value,
        "edition": seen.edition,
        "rater": seen.rater,
        "remark": seen.remark,
    }


def rating_of(row: Any) -> Rating:
    return Rating(
        string(row["rating_id"]),
        VisualRating(
            panel_id=string(row["panel_id"]),
            exposure_h=float(row["exposure_h"]),
            scale=string(row["scale"]),
            value=string(row["grade"]),
            edition=string(row["edition"]),
            rater=string(row["rater"]),
            remark=string(row["remark"]),
        ),
    )


def photograph_row(photograph: Photograph) -> Row:
    at = photograph.exposure_h
    return {
        "photograph_id": photograph.photograph_id,
        "panel_id": photograph.panel_id,
        "exposure_h": None if at is None else float(at),
        "sha256": photograph.sha256,
        "media_type": photograph.media_type,
        "caption": photograph.caption,
        "file": photograph.file,
    }


def photograph_of(row: Any) -> Photograph:
    at = row["exposure_h"]
    return Photograph(
        photograph_id=string(row["photograph_id"]),
        panel_id=string(row["panel_id"]),
        sha256=string(row["sha256"]),
        media_type=string(row["media_type"]),
        exposure_h=None if at is None else float(at),
        caption=string(row["caption"]),
        file=string(row["file"]),
    )
