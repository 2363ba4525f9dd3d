"""The workbook, written and read back with openpyxl."""

from __future__ import annotations

import zipfile
from dataclasses import replace
from pathlib import Path
from typing import Any

import openpyxl
import pytest
from openpyxl.workbook import Workbook

from coatgui.output import write_workbook
from coatgui.records import Assessment, Campaign, Severity

OHM = "(Ω cm², or Ω where the panel has no area)"
FARAD = "(F/cm², or F where the panel has no area)"


@pytest.fixture
def book(assessment: Assessment, campaign: Campaign, tmp_path: Path) -> Workbook:
    write_workbook(assessment, campaign, tmp_path / "x.xlsx")
    return openpyxl.load_workbook(tmp_path / "x.xlsx")


def table(book: Workbook, title: str) -> list[dict[str, Any]]:
    headings, *rows = book[title].iter_rows(values_only=True)
    assert len(set(headings)) == len(headings)
    return [dict(zip(map(str, headings), row, strict=True)) for row in rows]


def test_every_sheet_can_be_read_and_sorted(book: Workbook) -> None:
    assert book.sheetnames == [
        "Summary", "Settings", "Panels", "Readings", "Parameters", "Modulus", "Capacitance",
        "Water", "Pore resistance", "Courses", "Limits", "Comparison", "Findings",
        "Points left out", "Refused", "Charts", "Spectra", "Bode plots", "Method and cautions",
        "Provenance",
    ]  # fmt: skip
    for sheet in book:
        assert sheet.page_setup.orientation == "landscape"
        if sheet.title in ("Charts", "Bode plots"):
            continue
        assert sheet.freeze_panes is not None
        assert sheet.freeze_panes.endswith("2")
        assert sheet.auto_filter.ref == sheet.dimensions
        assert all(cell.value and cell.font.bold for cell in sheet[1])
        widths = [dimension.width for dimension in sheet.column_dimensions.values()]
        assert all(9 <= width <= 60 for width in widths)
        assert sheet.print_area is not None


def test_bounds_are_numbers_with_their_kind_beside(book: Workbook) -> None:
    first, second = table(book, "Readings")
    assert first[f"pore resistance {OHM}"] == 3e9
    assert first[f"pore resistance, low 95 % {OHM}"] == 3e9
    assert first[f"pore resistance, high 95 % {OHM}"] is None
    assert first["pore resistance, kind"] == "at least"
    assert second["pore resistance, kind"] == "at most"
    assert first["|Z|·A at 0.1 Hz, how"] == "interpolated"
    assert first["|Z|·A at 0.01 Hz, how"] == "not reached"
    assert first["|Z|·A at 0.01 Hz, kind"] == "no value"
    assert first[f"film capacitance {FARAD}"] == 4e-11
    assert first["film capacitance, law"] == "law of the film"
    name = "capacitance straight from the data at high frequency"
    assert first[f"{name} {FARAD}"] == 4.2e-11
    assert first["apparent water uptake (vol-%)"] == 1.5
    assert first["dry reference (h)"] == 0
    kinds = [row["value, kind"] for row in table(book, "Parameters")]
    assert kinds == [
        "between the limits", "at least", "at most", "fixed", "cannot be determined",
        "between the limits",
    ]  # fmt: skip
    unknown = table(book, "Parameters")[-1]
    assert [unknown[h] for h in ("value", "value, low 95 %", "value, high 95 %")] == [None] * 3


def test_a_missing_answer_shifts_nothing(book: Workbook) -> None:
    second = table(book, "Readings")[1]
    assert second[f"|Z|·A at 0.1 Hz {OHM}"] is None
    assert second["|Z|·A at 0.1 Hz, kind"] == "no value"
    assert second[f"|Z|·A at 0.01 Hz {OHM}"] == 7e8
    assert second[f"pore resistance {OHM}"] == 6e8
    assert second["model"] == "not fitted"
    assert second["points read"] == 2


def test_a_panel_without_an_area_is_said(book: Workbook) -> None:
    assert [row["amounts are per"] for row in table(book, "Readings")] == ["cm²", "specimen"]
    assert [row["area (cm²)"] for row in table(book, "Panels")] == [14.6, None]


def test_states_stand_in_words_not_only_in_colour(book: Workbook) -> None:
    assert [row["counts"] for row in table(book, "Readings")] == ["yes", "no, rejected"]
    for sheet in book:
        for row in sheet.iter_rows():
            for cell in row:
                # Yellow marks what a reader may change, filled in or not.
                if cell.fill.fill_type is not None and cell.fill.fgColor.rgb != "00FFF8DC":
                    assert cell.value


def test_findings_of_campaign_panels_and_readings(book: Workbook) -> None:
    found = [(r["panel"], r["severity"], r["finding"]) for r in table(book, "Findings")]
    assert found == [
        (None, "note", "Usual limits are used."),
        ("A1", "note", "Fick's law follows."),
        ("A1", "doubt", "It drifted."),
        ("B1", "reject", "Measure again."),
    ]


def test_panels_decisions_settings_and_origin(book: Workbook) -> None:
    panel = table(book, "Panels")[0]
    assert panel["diffusion coefficient of water (cm²/s)"] == 9e-10
    assert panel[f"dry capacitance {FARAD}"] == 3.8e-11
    assert (panel["substrate"], panel["regime"], panel["remark"]) == ("steel", "cyclic", "chipped")
    assert panel["notes"] == "operator: night shift"
    assert panel["what happened"] == "The pores conduct."
    assert panel["limits"] == "Below the limit."
    first, second = table(book, "Readings")
    assert "film_with_pores is insisted on" in first["decided by a person"]
    assert "points left out: 1" in first["decided by a person"]
    assert first["remark"] == "door open"
    assert second["decided by a person"] is None
    origin = table(book, "Provenance")
    assert [row["file"] for row in origin] == ["A1_24h.csv", "stack.csv", "open_lead.csv"]
    assert origin[0]["columns as understood"] == "1: frequency in kHz (times 1000)"
    assert origin[0]["encoding"] == "cp1252"
    assert origin[1]["part"] == "48 h"
    assert origin[2]["SHA-256"] == "3" * 64
    settings = {row["what"]: row for row in table(book, "Settings")}
    limit = settings["limit: Own limit, at 0.01 Hz"]
    assert (limit["value"], limit["source"], limit["name in formulas"]) == (
        1e6,
        "contract",
        "limit_1",
    )
    assert settings["temperature where neither reading nor panel has one"]["value"] == 21.5
    method = {row["quantity"]: row for row in table(book, "Method and cautions")}
    assert method["Caution"]["how it was obtained"] == "Mind the fog."


def test_courses_say_what_their_mean_is(book: Workbook) -> None:
    (row,) = table(book, "Courses")
    assert (row["mean"], row["kind"], row["of these only bounds"]) == (3e9, "at least", 1)
    assert row["kind of mean"] == "geometric mean of 1 panel"


@pytest.mark.parametrize("start", ["=", "+", "-", "@", "\t="])
def test_text_never_becomes_a_formula(
    assessment: Assessment, campaign: Campaign, tmp_path: Path, start: str
) -> None:
    evil = f'{start}HYPERLINK("x";"y")\x0b'
    reading = replace(assessment.readings[0], panel=evil, file=evil)
    path = tmp_path / "x.xlsx"
    write_workbook(replace(assessment, title=evil, readings=(reading,)), campaign, path)
    book = openpyxl.load_workbook(path)
    cells = [c for sheet in book for row in sheet.iter_rows() for c in row if c.value]
    formulas = [str(c.value) for c in cells if c.data_type == "f"]
    assert not [text for text in formulas if "HYPERLINK" in text]
    ours = [c for c in cells if str(c.value).startswith(start) and "HYPERLINK" in str(c.value)]
    assert len(ours) >= 4
    assert all(c.quotePrefix for c in ours)
    assert all("\x0b" not in str(c.value) for c in ours)


def test_no_row_is_lost_and_long_text_is_cut(
    assessment: Assessment, campaign: Campaign, tmp_path: Path
) -> None:
    finding = replace(assessment.readings[0].findings[0], text="\x01long " * 9000)
    many = tuple(replace(finding, severity=s) for s in Severity for _ in range(100))
    reading = replace(assessment.readings[0], findings=many)
    path = tmp_path / "x.xlsx"
    write_workbook(replace(assessment, readings=(reading,)), campaign, path)
    rows = table(openpyxl.load_workbook(path), "Findings")
    assert len(rows) == 300 + 2
    assert len(rows[-1]["finding"]) == 32_000


def test_no_clock_enters_the_file(
    assessment: Assessment, campaign: Campaign, tmp_path: Path
) -> None:
    write_workbook(assessment, campaign, tmp_path / "x.xlsx")
    with zipfile.ZipFile(tmp_path / "x.xlsx") as archive:
        assert {item.date_time for item in archive.infolist()} == {(1980, 1, 1, 0, 0, 0)}
    properties = openpyxl.load_workbook(tmp_path / "x.xlsx").properties
    assert properties.created is not None
    assert properties.modified is not None
    assert properties.created.year == properties.modified.year == 2000


def test_formulas_come_with_the_programs_values(
    assessment: Assessment, campaign: Campaign, tmp_path: Path
) -> None:
    write_workbook(assessment, campaign, tmp_path / "x.xlsx")
    formulas = openpyxl.load_workbook(tmp_path / "x.xlsx")
    values = openpyxl.load_workbook(tmp_path / "x.xlsx", data_only=True)
    first = table(formulas, "Modulus")[0]
    now = table(values, "Modulus")[0]
    assert first[f"value {OHM}"] == "=D2*Panels!$C$2"
    assert now[f"value {OHM}"] == 5e9
    assert now["per specimen (Ω)"] == pytest.approx(5e9 / 14.6)
    for sheet in formulas:
        for row in sheet.iter_rows():
            for cell in row:
                if cell.data_type == "f":
                    assert "{" not in str(cell.value)


def test_what_a_spreadsheet_reads_as_a_numbered_letter_stays_text(
    assessment: Assessment, campaign: Campaign, tmp_path: Path
) -> None:
    name = "_x0041_ & <b> \r\n 漢 " + "n" * 300
    reading = replace(assessment.readings[0], panel=name)
    write_workbook(replace(assessment, readings=(reading,)), campaign, tmp_path / "x.xlsx")
    book = openpyxl.load_workbook(tmp_path / "x.xlsx")
    with zipfile.ZipFile(tmp_path / "x.xlsx") as archive:
        raw = archive.read("xl/worksheets/sheet4.xml").decode("utf-8")
    assert "_x005F_x0041_ &amp; &lt;b&gt; _x000D_" in raw
    assert str(book["Readings"]["B2"].value).endswith("n" * 300)


def test_charts_stand_on_logarithmic_axes(book: Workbook, tmp_path: Path) -> None:
    charts = book["Charts"]._charts
    assert charts
    assert all(chart.y_axis.scaling.logBase == 10 for chart in charts[:1])
    bode = book["Bode plots"]._charts
    assert [chart.x_axis.scaling.logBase for chart in bode[:2]] == [10, 10]
    assert all(chart.x_axis.title and chart.y_axis.title for chart in [*charts, *bode])


def test_spectra_are_optional(assessment: Assessment, campaign: Campaign, tmp_path: Path) -> None:
    write_workbook(assessment, campaign, tmp_path / "x.xlsx", spectra=False)
    assert "Spectra" not in openpyxl.load_workbook(tmp_path / "x.xlsx").sheetnames
    write_workbook(assessment, campaign, tmp_path / "x.xlsx", spectra=True)
    rows = table(openpyxl.load_workbook(tmp_path / "x.xlsx"), "Spectra")
    assert len(rows) == 4
    assert rows[0]["Z′ (Ω)"] == 1e3
    assert rows[1]["left out because"] == "wild point"
