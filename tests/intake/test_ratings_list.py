"""The ratings list, as a file of its own and as a sheet of the template workbook."""

from __future__ import annotations

import io
import json
from pathlib import Path

import openpyxl
import pytest

from coatgui.assessment.ratings import scales
from coatgui.campaign import campaign_from_found
from coatgui.campaign.build import gather
from coatgui.cli import main
from coatgui.intake import read_folder, read_lists, template
from coatgui.intake.ratings_list import read_ratings, scale_ids
from coatgui.records import FoundPanel, FoundRating
from coatgui.shipped import sample_panels

ROWS = (
    "panel;exposure_h;scale;rating;edition;rater;remark\n"
    "A1;168;iso_4628_2;2(S3);2016;AB;lower edge\n"
    "A2;167,5;Rust grade, ISO 4628-3;Ri 1;;;\n"
)
READ = (
    FoundRating("ratings.csv", "A1", 168.0, "iso_4628_2", "2(S3)", "2016", "AB", "lower edge"),
    FoundRating("ratings.csv", "A2", 167.5, "iso_4628_3", "Ri 1"),
)


def test_a_list_is_read() -> None:
    assert read_ratings(ROWS.encode(), "ratings.csv") == READ
    assert set(scale_ids()) == set(scales())


@pytest.mark.parametrize(
    ("row", "says"),
    [
        (";168;iso_2409;1", "Line 2 names no panel"),
        ("A1;;iso_2409;1", "needs exposure_h, 0 h or more"),
        ("A1;-1;iso_2409;1", "needs exposure_h, 0 h or more"),
        ("A1;soon;iso_2409;1", "not a number"),
        ("A1;168;iso_9999;1", "no rating scale “iso_9999”. Known are astm_d610"),
        ("A1;168;iso_2409;9", "“9” is no rating by cross-cut, ISO 2409: 0 to 5"),
    ],
)
def test_a_wrong_row_is_refused_with_its_line(row: str, says: str, tmp_path: Path) -> None:
    (tmp_path / "ratings.csv").write_text(f"panel;exposure_h;scale;rating\n{row}\n")
    (tmp_path / "A1_1h.csv").write_bytes((sample_panels() / "K1_24h.csv").read_bytes())
    found = read_folder(tmp_path)
    assert len(found.readings) == 1
    assert found.ratings == ()
    (refusal,) = found.refused
    assert refusal.file == "ratings.csv"
    assert says in refusal.reason


def test_the_templates_sheet_is_read_back(tmp_path: Path) -> None:
    book = openpyxl.load_workbook(io.BytesIO(template([FoundPanel("A1")])))
    book["Ratings"].append(["A1", 168, "astm_d3359_b", "4B", None, "AB"])
    book.save(tmp_path / "lists.xlsx")
    lists = read_lists((tmp_path / "lists.xlsx").read_bytes(), "lists.xlsx")
    assert lists is not None
    assert lists.ratings == (
        FoundRating("lists.xlsx", "A1", 168.0, "astm_d3359_b", "4B", "", "AB"),
    )


def test_ratings_come_from_a_folder_to_the_assessment(tmp_path: Path) -> None:
    for file in sorted(sample_panels().glob("K*_*h.?sv")):
        if file.stem.endswith(("_24h", "_168h")):
            (tmp_path / file.name).write_bytes(file.read_bytes())
    (tmp_path / "panels.csv").write_text(
        "panel,formulation,area_cm2\nK1,A,14.6\nK2,A,14.6\nK3,B,14.6\nK4,B,14.6\n"
    )
    rows = [f"{p},168,iso_4628_3,Ri {g}" for p, g in (("K1", 0), ("K2", 1), ("K3", 3), ("K4", 4))]
    (tmp_path / "ratings.csv").write_text(
        "\n".join(["panel,exposure_h,scale,rating", *rows, "Z9,168,iso_4628_3,Ri 0"])
    )
    out = tmp_path / "out.json"
    assert main(["assess", str(tmp_path), "--json", str(out), "--quiet"]) == 1
    told = json.loads(out.read_text(encoding="utf-8"))
    assert [(r["best"], r["worst"]) for r in told["ratings"]] == [
        ("Ri 0", "Ri 1"),
        ("Ri 3", "Ri 4"),
    ]
    assert told["rating_correlations"][0]["panels"] == 4
    assert "names panel Z9, which the campaign does not have" in told["refused"][0]["reason"]
    # Brought in once more, they add nothing.
    found = read_folder(tmp_path)
    campaign = campaign_from_found(found, "C")
    assert len(campaign.ratings) == 4
    assert gather(campaign, found).campaign.ratings == campaign.ratings
