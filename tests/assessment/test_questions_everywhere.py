"""What a campaign file asks is answered alike by everything that is handed over."""

from __future__ import annotations

import html
import json
from dataclasses import replace
from pathlib import Path

import openpyxl
import pytest

from coatgui.campaign import CampaignFile, campaign_from_found, operations
from coatgui.cli import main
from coatgui.intake import read_folder
from coatgui.records import (
    Judge,
    Limit,
    Method,
    ProjectionWanted,
    Question,
    Side,
    VisualRating,
)
from coatgui.shipped import sample_panels

WET = Limit("wet", "water_uptake", 1.5, "vol-%", "ours", Side.ABOVE)


@pytest.fixture(scope="module")
def handed_over(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """The sample campaign with questions, as a campaign file and all that is made of it."""
    folder = tmp_path_factory.mktemp("asked")
    found = read_folder(sample_panels())
    campaign = campaign_from_found(found, "Asked")
    campaign = replace(campaign, refused=())
    with CampaignFile.create(folder / "c.coatgui", campaign, found.raw) as file:
        file.apply(
            operations.edit_settings(
                file.campaign,
                limits=[WET],
                comparisons=[
                    Question("water_uptake", None, method=Method.TUKEY),
                    Question(judge=Judge.TIME_TO_LIMIT, method=Method.RANKS, limit=WET),
                    Question(judge=Judge.RATING, method=Method.RANKS, scale="iso_4628_3"),
                ],
                projections=[ProjectionWanted("modulus", 1000.0, 0.1)],
            )
        )
        seen = [
            VisualRating(panel.panel_id, 672.0, "iso_4628_3", f"Ri {place % 4}", "2016")
            for place, panel in enumerate(file.campaign.panels)
        ]
        file.apply(operations.add_ratings(file.campaign, seen))
    arguments = ["assess", str(folder / "c.coatgui"), "--quiet"]
    for option, name in (("json", "o.json"), ("workbook", "o.xlsx"), ("summary", "o.html")):
        arguments += [f"--{option}", str(folder / name)]
    assert main(arguments) == 0
    return folder


def test_json_workbook_and_summary_say_the_same(handed_over: Path) -> None:
    told = json.loads((handed_over / "o.json").read_text(encoding="utf-8"))
    asked = [c["question"]["judge"] for c in told["further_comparisons"]]
    assert asked == ["at_time", "time_to_limit", "rating"]
    assert told["further_comparisons"][0]["question"]["method"] == "tukey"
    studies = [s for s in told["limit_studies"] if s["limit"]["name"] == "wet"]
    assert [s["formulation"] for s in studies] == [f["formulation"] for f in told["formulations"]]
    assert len(told["projections"]) == len(told["formulations"])
    assert {r["edition"] for r in told["ratings"]} == {"2016"}
    texts = [c["text"] for c in told["further_comparisons"]]
    texts += [s["text"] for s in studies]
    texts += [p["text"] for p in told["projections"]]
    texts += [c["text"] for c in told["rating_correlations"]]
    assert len(texts) > 10
    assert all(texts)
    sheet = openpyxl.load_workbook(handed_over / "o.xlsx")["Summary"]
    cells = {row[1] for row in sheet.iter_rows(values_only=True)}
    page = html.unescape((handed_over / "o.html").read_text(encoding="utf-8"))
    for text in texts:
        assert text in cells
        assert text in page
