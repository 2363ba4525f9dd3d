"""The workbook recalculated by a spreadsheet program, as it is and after a reader's changes."""

from __future__ import annotations

import math
import shutil
import subprocess
from dataclasses import replace
from pathlib import Path
from typing import Any

import openpyxl
import pytest
from openpyxl.workbook import Workbook

from coatgui.assessment import assess
from coatgui.assessment.rules import default_criteria
from coatgui.campaign import campaign_from_found
from coatgui.intake import read_folder
from coatgui.output import write_workbook
from coatgui.records import Assessment, Campaign
from coatgui.shipped import sample_panels

TEMPERATURE_C, AREA_CM2, LIMIT = 41.0, 20.0, 3e8
WARM, WIDE = "K1", "M2"  # the panels that are changed


@pytest.fixture(scope="module")
def campaign() -> Campaign:
    found = campaign_from_found(read_folder(sample_panels()), "Sample")
    # No panel but one has a temperature of its own, so that the campaign's is used as well.
    panels = tuple(
        panel if panel.name == WARM else replace(panel, temperature_c=None)
        for panel in found.panels
    )
    return replace(found, panels=panels)


@pytest.fixture(scope="module")
def assessment(campaign: Campaign) -> Assessment:
    return assess(campaign)


def recalculated(path: Path, folder: Path) -> Workbook:
    tool = shutil.which("soffice")
    if tool is None:
        pytest.skip("LibreOffice (soffice) is not installed")
    folder.mkdir()
    subprocess.run(
        [
            tool,
            "--headless",
            f"-env:UserInstallation={(folder / 'profile').as_uri()}",
            *("--convert-to", "xlsx:Calc MS Excel 2007 XML", "--outdir", str(folder), str(path)),
        ],
        check=True,
        capture_output=True,
        timeout=300,
    )
    return openpyxl.load_workbook(folder / path.name, data_only=True)


def same(first: Any, second: Any) -> bool:
    if isinstance(first, int | float) and isinstance(second, int | float):
        return math.isclose(first, second, rel_tol=1e-9, abs_tol=1e-12)
    return bool((first or "") == (second or ""))


def differences(expected: Workbook, found: Workbook, formulas: Workbook) -> list[str]:
    """Formula cells whose values differ."""
    return [
        f"{sheet.title}!{cell.coordinate} {cell.value}"
        for sheet in formulas
        for row in sheet.iter_rows()
        for cell in row
        if cell.data_type == "f"
        and not same(
            expected[sheet.title][cell.coordinate].value, found[sheet.title][cell.coordinate].value
        )
    ]


def errors(book: Workbook) -> list[str]:
    return [
        f"{sheet.title}!{cell.coordinate} {cell.value}"
        for sheet in book
        for row in sheet.iter_rows()
        for cell in row
        if cell.data_type == "e"
    ]


def test_every_formula_gives_the_programs_value(
    assessment: Assessment, campaign: Campaign, tmp_path: Path
) -> None:
    path = tmp_path / "book.xlsx"
    write_workbook(assessment, campaign, path, spectra=False)
    formulas = openpyxl.load_workbook(path)
    for cells in formulas["Modulus"].iter_rows(min_row=2, max_row=2):
        assert str(cells[7].value).startswith("=")
    # Without the values that came along, so that nothing but the program's own arithmetic counts.
    formulas.save(tmp_path / "bare.xlsx")
    found = recalculated(tmp_path / "bare.xlsx", tmp_path / "office")
    assert errors(found) == []
    assert differences(openpyxl.load_workbook(path, data_only=True), found, formulas) == []


def test_a_changed_temperature_area_and_limit_change_the_sheet_as_they_change_the_program(
    assessment: Assessment, campaign: Campaign, tmp_path: Path
) -> None:
    path = tmp_path / "book.xlsx"
    write_workbook(assessment, campaign, path, spectra=False)
    book = openpyxl.load_workbook(path)
    panels = {row[1].value: row for row in book["Panels"].iter_rows(min_row=2)}
    panels[WARM][4].value = TEMPERATURE_C
    panels[WIDE][2].value = AREA_CM2
    settings = {row[3].value: row for row in book["Settings"].iter_rows(min_row=2)}
    settings["temperature_c"][1].value = 30.0
    settings["limit_1"][1].value = LIMIT
    book.save(tmp_path / "changed.xlsx")
    found = recalculated(tmp_path / "changed.xlsx", tmp_path / "office")
    assert errors(found) == []

    told = replace(
        campaign,
        panels=tuple(
            replace(
                panel,
                temperature_c=TEMPERATURE_C if panel.name == WARM else panel.temperature_c,
                area_cm2=AREA_CM2 if panel.name == WIDE else panel.area_cm2,
            )
            for panel in campaign.panels
        ),
        settings=replace(
            campaign.settings,
            temperature_c=30.0,
            criteria=tuple(replace(c, ohm_cm2=LIMIT) for c in default_criteria()),
        ),
    )
    write_workbook(assess(told), told, tmp_path / "told.xlsx", spectra=False)
    expected = openpyxl.load_workbook(tmp_path / "told.xlsx", data_only=True)
    formulas = openpyxl.load_workbook(tmp_path / "told.xlsx")
    # The wide panel is fitted anew by the program: only what is measured must agree there.
    fitted = {
        (sheet, row[0].row)
        for sheet in ("Capacitance", "Water", "Pore resistance")
        for row in formulas[sheet].iter_rows()
        if row[1].value == WIDE
    }
    wide = {
        row[0].value for row in formulas["Panels"].iter_rows() if row[1].value == WIDE
    }  # its formulation
    fitted |= {
        ("Courses", row[0].row)
        for row in formulas["Courses"].iter_rows()
        if row[0].value in wide and "|Z|" not in str(row[1].value)
    }
    wrong = [
        text
        for text in differences(expected, found, formulas)
        if (text.split("!")[0], int("".join(filter(str.isdigit, text.split(" ")[0].split("!")[1]))))
        not in fitted
    ]
    assert wrong == []
    # The changes reached the sheet at all.
    before = openpyxl.load_workbook(path, data_only=True)
    changed = differences(before, found, formulas)
    for sheet in ("Modulus", "Water", "Courses", "Limits"):
        assert [text for text in changed if text.startswith(sheet)], sheet
