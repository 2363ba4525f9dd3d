"""Rows of what is seen on panels, ratings and photographs, and of what a summary names."""

from __future__ import annotations

import json
from typing import Any

from coatgui.campaign.changes import Row
from coatgui.records import Identification, Photograph, Rating, VisualRating


def identification_cells(named: Identification) -> Row:
    return {
        "laboratory": named.laboratory,
        "customer": named.customer,
        "order_number": named.order,
        "author": named.author,
        "reviewer": named.reviewer,
        "standards": json.dumps(named.standards, ensure_ascii=False),
    }


def identification_of(row: Any) -> Identification:
    standards = json.loads(_string(row["standards"]))
    if not isinstance(standards, list):
        raise TypeError("A list was expected.")
    return Identification(
        laboratory=_string(row["laboratory"]),
        customer=_string(row["customer"]),
        order=_string(row["order_number"]),
        author=_string(row["author"]),
        reviewer=_string(row["reviewer"]),
        standards=tuple(map(_string, standards)),
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
        _string(row["rating_id"]),
        VisualRating(
            panel_id=_string(row["panel_id"]),
            exposure_h=float(row["exposure_h"]),
            scale=_string(row["scale"]),
            value=_string(row["grade"]),
            edition=_string(row["edition"]),
            rater=_string(row["rater"]),
            remark=_string(row["remark"]),
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
        photograph_id=_string(row["photograph_id"]),
        panel_id=_string(row["panel_id"]),
        sha256=_string(row["sha256"]),
        media_type=_string(row["media_type"]),
        exposure_h=None if at is None else float(at),
        caption=_string(row["caption"]),
        file=_string(row["file"]),
    )


def _string(value: Any) -> str:
    if not isinstance(value, str):
        raise TypeError("A text was expected.")
    return value
