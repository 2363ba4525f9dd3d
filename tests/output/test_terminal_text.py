"""The table on the terminal: in line, with signs, and out of reach of what files contain."""

from __future__ import annotations

from dataclasses import replace

import pytest

from coatgui.output import terminal_table
from coatgui.output.text import columns_of, one_line
from coatgui.records import Assessment, Finding, Modulus, ModulusStatus, Severity


def test_values_bounds_and_states_are_said(assessment: Assessment) -> None:
    text = terminal_table(assessment)
    first = next(line for line in text.splitlines() if line.startswith("A1 "))
    for said in ("24", "5.00e+09", "Film with pores", "4.00e-11", "1.5", "≥ 3.00e+09", "1 doubt"):
        assert said in first
    second = next(line for line in text.splitlines() if line.startswith("B1 "))
    for said in ("not fitted", "–", "≤ 6.00e+08", "rejected"):
        assert said in second
    for said in (
        "By hand\n2 panels.",
        "A and B cannot be told apart.",
        "A1: The pores conduct. Below the limit.",
        "Usual limits are used.",
        "notes.txt: No table.",
        "Mind the fog.",
    ):
        assert said in text


def test_columns_stand_under_their_headings(assessment: Assessment) -> None:
    names = ("A1", "a panel with a long name", "漢字1", "e\u0301")
    readings = tuple(replace(assessment.readings[0], panel=name) for name in names)
    lines = terminal_table(replace(assessment, readings=readings)).splitlines()
    heading = next(line for line in lines if line.startswith("panel "))
    place = columns_of(heading[: heading.index("|Z|")])
    rows = [line for line in lines if line.startswith(names) and "5.00e+09" in line]
    assert len(rows) == 4
    for row in rows:
        assert columns_of(row[: row.index("5.00e+09")]) == place


def test_the_frequency_is_the_campaigns(assessment: Assessment) -> None:
    modulus = (replace(assessment.readings[0].modulus[0], frequency_hz=0.05),)
    reading = replace(assessment.readings[0], modulus=modulus)
    text = terminal_table(replace(assessment, readings=(reading,)))
    assert "|Z|·A at 0.05 Hz" in text
    assert "5.00e+09" in text


def test_what_cannot_be_said_is_not_a_number(assessment: Assessment) -> None:
    unsure = Modulus(0.1, ModulusStatus.MEASURED, assessment.readings[0].parameters[4].quantity)
    reading = replace(assessment.readings[0], modulus=(unsure,))
    assert "undetermined" in terminal_table(replace(assessment, readings=(reading,)))


@pytest.mark.parametrize("evil", ["\x1b[2J", "\x9b31m", "\x07", "\u202egpj", "\udcfc", "\x00"])
def test_nothing_steers_the_terminal(assessment: Assessment, evil: str) -> None:
    finding = Finding("x", Severity.NOTE, evil)
    reading = replace(assessment.readings[0], panel=evil, formulation=f"F{evil}")
    refused = (replace(assessment.refused[0], file=f"f{evil}", reason=f"first\nsecond{evil}"),)
    text = terminal_table(
        replace(
            assessment,
            title=evil,
            headline=evil,
            readings=(reading,),
            ranking_text=evil,
            refused=refused,
            findings=(finding,),
            cautions=(evil,),
        )
    )
    assert not set(evil) & set("\x1b\x9b\x07\u202e\udcfc\x00") & set(text)
    assert "first second" in text
    text.encode("utf-8")


def test_one_line_keeps_ordinary_letters() -> None:
    assert one_line("Prüfstand\t2,\n Zelle 4 漢") == "Prüfstand 2, Zelle 4 漢"


def test_a_campaign_without_readings(assessment: Assessment) -> None:
    text = terminal_table(replace(assessment, readings=()))
    assert "no readings" in text
    assert "notes.txt" in text
