"""CSV tables with their description, and figures as files."""

from __future__ import annotations

import csv
import json
import xml.etree.ElementTree as ElementTree
from dataclasses import replace
from pathlib import Path

import pytest

from coatgui.output import PagesUnavailable, require_qt, write_figures, write_tables
from coatgui.output.drawing import Scale, span_of, with_prefix
from coatgui.output.figures import all_figures
from coatgui.output.handing_over import _file_name
from coatgui.records import Assessment, Campaign


def rows_of(path: Path) -> list[dict[str, str]]:
    with path.open(encoding="utf-8", newline="") as file:
        return list(csv.DictReader(file))


def test_every_column_is_described(
    assessment: Assessment, campaign: Campaign, tmp_path: Path
) -> None:
    write_tables(assessment, campaign, tmp_path / "t")
    described = json.loads((tmp_path / "t" / "tables.json").read_text(encoding="utf-8"))
    assert described["schema"] == "coatgui-tables/1"
    for table in described["tables"]:
        with (tmp_path / "t" / table["file"]).open(encoding="utf-8", newline="") as file:
            headings = next(csv.reader(file))
        assert headings == [column["name"] for column in table["columns"]]
        for column in table["columns"]:
            assert column["kind"] in ("text", "number", "truth")
            assert column["meaning"] or column["kind"] == "truth"
            assert column["unit"] or not column["name"].endswith(("_h", "_hz", "_cm2", "_um"))


def test_numbers_come_back_exactly_and_missing_ones_are_empty(
    assessment: Assessment, campaign: Campaign, tmp_path: Path
) -> None:
    write_tables(assessment, campaign, tmp_path)
    first, second = rows_of(tmp_path / "readings.csv")
    assert float(first["coating_capacitance"]) == 4e-11
    assert first["pore_resistance_high"] == ""
    assert first["pore_resistance_bound"] == "at_least"
    assert second["counts"] == "false"
    parameters = rows_of(tmp_path / "parameters.csv")
    assert float(parameters[0]["value"]) == 1e-9 * (1 / 3)
    assert parameters[-1]["value"] == ""  # not a number
    assert parameters[-1]["value_high"] == ""  # infinite
    assert rows_of(tmp_path / "panels.csv")[1]["area_cm2"] == ""


@pytest.mark.parametrize("start", ["=", "+", "-", "@"])
def test_no_text_is_a_formula(
    assessment: Assessment, campaign: Campaign, tmp_path: Path, start: str
) -> None:
    evil = f'{start}cmd|"x"!A1,\n;'
    reading = replace(assessment.readings[0], panel=evil, file=evil)
    write_tables(replace(assessment, readings=(reading,)), campaign, tmp_path)
    (row,) = rows_of(tmp_path / "readings.csv")
    assert row["panel"].startswith(f"'{start}cmd")
    assert row["file"].startswith(f"'{start}cmd")
    assert float(row["exposure_h"]) == 24


@pytest.mark.parametrize("name", ["<b>&\"'</svg>", "漢字", "n" * 300, "\x00\u202e", "", "../../x"])
def test_figures_are_sound_svg_under_safe_names(
    assessment: Assessment, campaign: Campaign, tmp_path: Path, name: str
) -> None:
    evil = replace(
        assessment,
        readings=tuple(replace(r, panel=name, formulation=name) for r in assessment.readings),
        panels=tuple(replace(p, panel=name, formulation=name) for p in assessment.panels),
    )
    written = write_figures(evil, campaign, tmp_path / "f")
    assert {path.parent for path in written} == {tmp_path / "f"}
    assert len({path.name.lower() for path in written}) == len(written) >= 3
    for path in written:
        root = ElementTree.parse(path).getroot()
        tags = {element.tag.rpartition("}")[2] for element in root.iter()}
        assert tags <= {
            "svg", "title", "desc", "polyline", "polygon", "rect", "circle", "text"
        }  # fmt: skip
        assert root[0].text
        assert root[1].text


def test_names_that_systems_keep_are_not_used() -> None:
    assert _file_name("CON", []) == "_CON"
    assert _file_name("a/b", ["a_b"]) == "a_b_2"
    assert _file_name("...", []) == "figure"


def test_figures_as_pdf_and_png(assessment: Assessment, campaign: Campaign, tmp_path: Path) -> None:
    try:
        require_qt()
    except PagesUnavailable as error:
        pytest.skip(f"pages cannot be painted here: {error}")
    for path in write_figures(assessment, campaign, tmp_path, "pdf"):
        assert path.read_bytes().startswith(b"%PDF-")
    for path in write_figures(assessment, campaign, tmp_path, "png"):
        assert path.read_bytes().startswith(b"\x89PNG")


def test_no_number_is_too_far_for_a_figure(assessment: Assessment, campaign: Campaign) -> None:
    strange = [0.0, -1.0, 1e-310, 1e308, float("inf"), float("nan"), None]
    for value in strange:
        moduli = tuple(
            replace(m, quantity=m.quantity and replace(m.quantity, value=value))
            for m in assessment.readings[0].modulus
        )
        reading = replace(assessment.readings[0], modulus=moduli, exposure_h=0.0)
        for figure in all_figures(replace(assessment, readings=(reading,)), campaign):
            ElementTree.fromstring(figure.drawing.svg("t", "d"))


@pytest.mark.parametrize(
    ("low", "high", "kind"),
    [
        (1e6, 1e11, "log"),
        (2.0, 2.9, "log"),
        (1e-11, 1.02e-11, "log"),
        (3e-12, 9e4, "log"),
        (0.0, 700.0, "root"),
        (0.0, 1e-3, "root"),
        (-3.0, 5.5, "linear"),
        (1e9, 1.0001e9, "linear"),
    ],
)
def test_every_axis_has_two_labels_within_it(low: float, high: float, kind: str) -> None:
    ticks = Scale(low, high, 0.0, 100.0, kind).ticks()
    assert len(ticks) >= 2
    assert len({label for _, label in ticks}) == len(ticks) <= 12
    assert all(
        low * 0.99 - 1e-9 <= value <= high * 1.01 + 1e-9 or kind == "linear" for value, _ in ticks
    )


def test_prefixes_and_spans() -> None:
    assert [with_prefix(v) for v in (1e7, 1e-10, 0.01, 250.0)] == ["10 M", "100 p", "10 m", "250"]
    assert span_of([None, float("nan"), -1.0, 0.0], "log") is None
    assert span_of([5.0], "log") == (4.0, 6.25)
