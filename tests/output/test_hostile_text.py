"""Text from outside in every output: formulas, control characters, numbers that are none; and files
written whole or not at all."""

from __future__ import annotations

import json
import math
from pathlib import Path
from typing import IO

import openpyxl
import pytest

from coatgui.output import assessment_json, terminal_table, write_json, write_whole, write_workbook
from coatgui.records import (
    Assessment,
    Bound,
    Campaign,
    Finding,
    Modulus,
    ModulusStatus,
    Parameter,
    Quantity,
    ReadingAssessment,
    Refusal,
    Severity,
)

EVIL = '=cmd|"/c calc"!A1\x00\x0b<b>ü漢'


def make() -> Assessment:
    quantities = [
        Quantity(math.nan, math.inf, None, Bound.TWO_SIDED, "Ω cm²"),
        Quantity(None, None, None, Bound.UNDETERMINED, "Ω cm²"),
        Quantity(3e9, 3e9, None, Bound.AT_LEAST, "Ω cm²"),
        Quantity(2.0, None, 2.0, Bound.AT_MOST, ""),
    ]
    reading = ReadingAssessment(
        reading_id="r",
        panel_id="p",
        panel=EVIL,
        formulation=EVIL,
        exposure_h=1.0,
        file=EVIL,
        sha256="0" * 64,
        points_read=3,
        points_used=3,
        left_out=(),
        findings=(Finding("odd", Severity.DOUBT, EVIL),),
        counts=True,
        modulus=(
            Modulus(0.1, ModulusStatus.MEASURED, quantities[0]),
            Modulus(0.01, ModulusStatus.NOT_REACHED, None),
        ),
        fit=None,
        parameters=tuple(Parameter("R", EVIL, 1, q) for q in quantities),
        coating_capacitance=None,
        capacitance_at_high_frequency=None,
        pore_resistance=quantities[2],
        water_uptake=None,
    )
    refused = (Refusal(EVIL, EVIL),)
    return Assessment(EVIL, (reading,), (), (), (), EVIL, refused, (), ("Mind.",), EVIL)


def test_json_holds_no_number_that_is_none(tmp_path: Path) -> None:
    data = assessment_json(make())
    json.dumps(data, allow_nan=False)
    assert data["readings"][0]["modulus"]["0.1"]["ohm_cm2"] is None
    assert data["readings"][0]["modulus"]["0.01"]["status"] == "not_reached"
    write_json(make(), tmp_path / "x.json")
    assert json.loads((tmp_path / "x.json").read_text(encoding="utf-8")) == data


def test_workbook_takes_text_as_text_and_is_the_same_twice(tmp_path: Path) -> None:
    first, second = tmp_path / "1.xlsx", tmp_path / "2.xlsx"
    for path in (first, second):
        write_workbook(make(), Campaign("c", "t"), path)
    assert first.read_bytes() == second.read_bytes()
    book = openpyxl.load_workbook(first)
    texts = [
        cell.value
        for sheet in book
        for row in sheet.iter_rows()
        for cell in row
        if isinstance(cell.value, str)
    ]
    assert any(text.startswith("=cmd") for text in texts)
    formulas = [
        str(cell.value)
        for sheet in book
        for row in sheet.iter_rows()
        for cell in row
        if cell.data_type == "f"
    ]
    assert not [text for text in formulas if "cmd" in text]
    kinds = [row[-2] for row in book["Parameters"].iter_rows(values_only=True)][1:]
    assert kinds == ["between the limits", "cannot be determined", "at least", "at most"]


def test_terminal_table_says_bounds() -> None:
    text = terminal_table(make())
    assert "≥ 3.00e+09" in text
    assert "Mind." in text


def test_nothing_at_all_is_still_written(tmp_path: Path) -> None:
    empty = Assessment("t", (), (), (), (), "", (), (), ())
    write_workbook(empty, Campaign("c", "t"), tmp_path / "e.xlsx")
    write_json(empty, tmp_path / "e.json")
    assert "t" in terminal_table(empty)


def test_a_failing_writer_leaves_the_former_file(tmp_path: Path) -> None:
    target = tmp_path / "x.txt"
    target.write_bytes(b"former")

    def fail(file: IO[bytes]) -> None:
        file.write(b"half")
        raise RuntimeError("no")

    with pytest.raises(RuntimeError):
        write_whole(target, fail)
    assert target.read_bytes() == b"former"
    assert [p.name for p in tmp_path.iterdir()] == ["x.txt"]
