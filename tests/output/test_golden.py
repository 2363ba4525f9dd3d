"""What leaves the program, word for word, against files that a person has read.

After a change that is meant: COATGUI_NEW_GOLDEN=1 python -m pytest tests/output/test_golden.py
writes them anew; look at the difference before it is committed.
"""

from __future__ import annotations

import json
import os
from pathlib import Path

import openpyxl
import pytest

from coatgui import __version__
from coatgui.assessment import assess
from coatgui.campaign import campaign_from_found
from coatgui.intake import read_folder
from coatgui.output import assessment_json, inspection_summary, write_workbook
from coatgui.output.document import Document, Figure, Heading, Table
from coatgui.output.html_form import html_document
from coatgui.output.shown import number
from coatgui.records import Assessment, Campaign, Quantity
from coatgui.shipped import sample_panels

GOLDEN = Path(__file__).parent / "golden"


def compare(name: str, text: str) -> None:
    text = text.replace(f"coatgui {__version__}", "coatgui <version>")
    path = GOLDEN / name
    if os.environ.get("COATGUI_NEW_GOLDEN"):
        path.parent.mkdir(exist_ok=True)
        path.write_text(text, encoding="utf-8", newline="\n")
        pytest.skip(f"{name} was written anew")
    assert text.splitlines() == path.read_text(encoding="utf-8").splitlines()


def without_method(document: Document) -> Document:
    """The sections on method and settings follow from data of other rooms."""
    kept, inside = [], False
    for block in document.blocks:
        if isinstance(block, Heading) and block.level == 1:
            inside = block.text == "Method and sources"
        if not inside:
            kept.append(block)
    return Document(
        document.title, document.running, document.author, document.subject, tuple(kept)
    )


def cells(path: Path) -> str:
    """Every cell of a workbook: sheet, place, formula or value."""
    book = openpyxl.load_workbook(path)
    lines = []
    for sheet in book:
        if sheet.title == "Method and cautions":
            continue
        lines.append(f"== {sheet.title} {sheet.dimensions} charts {len(sheet._charts)}")
        for row in sheet.iter_rows():
            for cell in row:
                if cell.value is not None:
                    shown = f"{cell.value:.9g}" if isinstance(cell.value, float) else cell.value
                    lines.append(f"{cell.coordinate} [{cell.number_format}] {shown!r}")
    return "\n".join(lines) + "\n"


def test_json(assessment: Assessment) -> None:
    data = assessment_json(assessment)
    compare("by_hand.json", json.dumps(data, ensure_ascii=False, indent=1) + "\n")


def test_html(assessment: Assessment, campaign: Campaign) -> None:
    text = html_document(without_method(inspection_summary(assessment, campaign)))
    compare("by_hand.html", text)


def test_workbook(assessment: Assessment, campaign: Campaign, tmp_path: Path) -> None:
    write_workbook(assessment, campaign, tmp_path / "x.xlsx")
    compare("by_hand_workbook.txt", cells(tmp_path / "x.xlsx"))


def two_digits(quantity: Quantity | None) -> str:
    if quantity is None or quantity.value is None:
        return "-"
    return f"{quantity.bound.value} {number(float(f'{quantity.value:.2g}'))} {quantity.unit}"


def test_the_sample_campaign(tmp_path: Path) -> None:
    """The shape of every output, and what was measured to two digits: what is fitted is held
    against the truth elsewhere."""
    campaign = campaign_from_found(read_folder(sample_panels()), "Sample")
    assessment = assess(campaign)
    lines = ["Summary"]
    for block, place in inspection_summary(assessment, campaign).numbered():
        match block:
            case Heading():
                lines.append(f"{place} {block.text}")
            case Table():
                lines.append(f"  table: {' | '.join(block.headings)}")
            case Figure():
                lines.append(f"  figure: {block.name}")
    lines.append("Workbook")
    write_workbook(assessment, campaign, tmp_path / "x.xlsx", spectra=False)
    book = openpyxl.load_workbook(tmp_path / "x.xlsx")
    for sheet in book:
        headings = [str(cell.value) for cell in sheet[1] if cell.value is not None]
        lines.append(f"{sheet.title}: {' | '.join(headings)}")
    lines.append("Readings")
    for reading in assessment.readings:
        moduli = [two_digits(m.quantity) for m in reading.modulus]
        said = [two_digits(reading.capacitance_at_high_frequency), *moduli]
        lines.append(f"{reading.panel} {reading.exposure_h:g} h: {'; '.join(said)}")
    compare("sample.txt", "\n".join(lines) + "\n")
