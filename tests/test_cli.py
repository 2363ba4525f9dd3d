"""The command line on the sample campaign and on wrong calls."""

from __future__ import annotations

import json
import shutil
import sys
from html import escape
from pathlib import Path

import openpyxl
import pytest

from coatgui import __version__
from coatgui.assessment.cautions import cautions
from coatgui.campaign import CampaignFile, operations
from coatgui.cli import main
from coatgui.shipped import sample_panels


@pytest.fixture(scope="module")
def outputs(tmp_path_factory: pytest.TempPathFactory) -> Path:
    folder = tmp_path_factory.mktemp("outputs")
    status = main(
        [
            *("assess", str(sample_panels()), "--quiet", "--workers", "1"),
            *("--json", str(folder / "o.json"), "--workbook", str(folder / "o.xlsx")),
            *("--campaign", str(folder / "o.coatgui"), "--summary", str(folder / "o.html")),
            *("--figures", str(folder / "figures"), "--tables", str(folder / "tables")),
            *("--customer", "=Estuary <Rowing> Club"),
        ]
    )
    assert status == 1  # some input was refused, on purpose
    return folder


def test_the_json_keeps_to_its_schema(outputs: Path) -> None:
    data = json.loads((outputs / "o.json").read_text(encoding="utf-8"))
    assert data["schema"] == "coatgui-assessment/1"
    assert len(data["readings"]) == 107
    assert {r["file"] for r in data["refused"]} == {"K4_3h.csv", "notes.txt", "K1_24h_again.csv"}
    reading = next(r for r in data["readings"] if r["panel"] == "P1" and r["exposure_h"] == 336)
    assert set(reading["modulus"]) == {"0.1", "0.01"}
    assert reading["modulus"]["0.1"]["status"] in ("measured", "interpolated", "not_reached")
    assert {"read", "used", "left_out"} == set(reading["points"])
    assert {"symbol", "value", "unit", "low", "high", "bound"} <= set(reading["parameters"][0])
    assert {"f_per_cm2", "low", "high", "method"} <= set(reading["coating_capacitance"])
    assert {"ohm_cm2", "low", "high", "bound"} <= set(reading["pore_resistance"])
    assert {"volume_percent", "low", "high", "method", "reference_h"} <= set(
        reading["water_uptake"]
    )
    rejected = next(r for r in data["readings"] if r["panel"] == "P3" and r["exposure_h"] == 504)
    assert rejected["model"] is None
    assert "reject" in {f["severity"] for f in rejected["findings"]}


def test_the_workbook_reads_back(outputs: Path) -> None:
    book = openpyxl.load_workbook(outputs / "o.xlsx")
    assert book.sheetnames[:3] == ["Summary", "Settings", "Panels"]
    rows = list(book["Readings"].iter_rows(values_only=True))
    assert len(rows) == 108
    assert "at least" in {cell for row in rows for cell in row}
    formulas = {
        sheet.title
        for sheet in book
        for row in sheet.iter_rows()
        for c in row
        if c.data_type == "f"
    }
    assert formulas == {"Modulus", "Capacitance", "Water", "Pore resistance", "Courses", "Limits"}


def test_a_kept_campaign_is_sound_and_gives_the_same(
    outputs: Path, capsys: pytest.CaptureFixture[str], tmp_path: Path
) -> None:
    assert main(["check", str(outputs / "o.coatgui")]) == 0
    again = tmp_path / "again.json"
    kept = str(outputs / "o.coatgui")
    assert main(["assess", kept, "--json", str(again), "--workers", "1"]) == 1
    first = json.loads((outputs / "o.json").read_text(encoding="utf-8"))
    second = json.loads(again.read_text(encoding="utf-8"))
    first.pop("title"), second.pop("title")
    assert first == second
    shown = capsys.readouterr()
    assert "K slow-cure epoxy is ahead" in shown.out
    assert "does not predict service life" in shown.out
    assert "refused notes.txt" in shown.err


def test_the_summary_figures_and_tables_are_written(outputs: Path) -> None:
    text = (outputs / "o.html").read_text(encoding="utf-8")
    assert "=Estuary &lt;Rowing&gt; Club" in text
    for caution in cautions():
        assert escape(caution) in text
    figures = {path.name for path in (outputs / "figures").iterdir()}
    assert {"map_1.svg", "water_uptake.svg", "comparison.svg", "spectra_K1.svg"} <= figures
    described = json.loads((outputs / "tables" / "tables.json").read_text(encoding="utf-8"))
    assert {t["file"] for t in described["tables"]} | {"tables.json"} == {
        path.name for path in (outputs / "tables").iterdir()
    }


def test_the_summary_names_what_the_campaign_keeps(outputs: Path, tmp_path: Path) -> None:
    kept = tmp_path / "kept.coatgui"
    shutil.copy(outputs / "o.coatgui", kept)
    with CampaignFile.open(kept) as file:
        file.apply(operations.identify(file.campaign, laboratory="Kept", customer="Also kept"))
    written = tmp_path / "s.html"
    told = ["--customer", "Told"]
    assert main(["assess", str(kept), "--summary", str(written), "--workers", "1", *told]) == 1
    text = written.read_text(encoding="utf-8")
    assert ">Kept<" in text
    assert ">Told<" in text
    assert "Also kept" not in text


def test_a_pdf_without_qt_is_refused_before_the_work(
    monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str], tmp_path: Path
) -> None:
    monkeypatch.setitem(sys.modules, "PySide6", None)
    wanted = str(tmp_path / "s.pdf")
    assert main(["assess", str(sample_panels()), "--summary", wanted]) == 2
    assert "needs Qt's libraries" in capsys.readouterr().err
    assert list(tmp_path.iterdir()) == []


@pytest.mark.parametrize(
    ("arguments", "words"),
    [
        (["assess"], "required"),
        (["assess", "no such folder"], "there is no"),
        (["assess", ".", "--workers", "0"], "at least 1"),
        (["assess", ".", "--json", "no such folder/x.json"], "make it first"),
        (["assess", ".", "--campaign", "x.sqlite"], ".coatgui"),
        (["assess", ".", "--json", "x.j", "--workbook", "x.j"], "same file"),
        (["assess", ".", "--summary", "x.doc"], ".pdf or .html"),
        (["assess", ".", "--figures", "pyproject.toml"], "is a file"),
        (["assess", ".", "--tables", "no such folder/x"], "make it first"),
        (["check", "no such file"], ""),
        (["no such folder"], "there is no"),
        (["--frobnicate"], "--help"),
    ],
)
def test_a_wrong_call_is_one_line_and_two(
    arguments: list[str], words: str, capsys: pytest.CaptureFixture[str]
) -> None:
    assert main(arguments) == 2
    error = capsys.readouterr().err
    assert words in error
    assert "Traceback" not in error


def test_nothing_usable(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    (tmp_path / "prose.txt").write_text("no numbers here", encoding="utf-8")
    assert main(["assess", str(tmp_path)]) == 2
    assert "nothing usable" in capsys.readouterr().err
    assert main(["assess", str(tmp_path / "prose.txt")]) == 2


def test_the_version(capsys: pytest.CaptureFixture[str]) -> None:
    with pytest.raises(SystemExit) as stopped:
        main(["--version"])
    assert stopped.value.code == 0
    assert __version__ in capsys.readouterr().out


def test_a_dry_run_says_what_each_file_would_become(capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["assess", str(sample_panels()), "--dry-run"]) == 1
    said = capsys.readouterr().out
    assert "K1_24h.csv: a reading of K1 at 24 h, 57 points" in said
    assert said.splitlines()[-1].startswith("107 ready, 3 refused")


def test_a_folder_is_added_in_one_edit(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    from coatgui.campaign import CampaignFile, campaign_from_found
    from coatgui.intake import read_folder

    folder, path = tmp_path / "week", tmp_path / "c.coatgui"
    folder.mkdir()
    sample = sample_panels()
    (folder / "K1_1h.csv").write_bytes((sample / "K1_1h.csv").read_bytes())
    found = read_folder(folder)
    CampaignFile.create(path, campaign_from_found(found, "T"), found.raw).close()
    (folder / "K1_8h.csv").write_bytes((sample / "K1_8h.csv").read_bytes())
    assert main(["add", str(path), str(folder), "--dry-run"]) == 0
    said = "Import 1 reading; 1 reading there already."
    assert f"Would be done: {said}" in capsys.readouterr().out
    assert main(["add", str(path), str(folder)]) == 0
    assert capsys.readouterr().out.strip() == said
    with CampaignFile.open(path) as file:
        assert [r.exposure_h for r in file.campaign.readings] == [1.0, 8.0]
        assert file.undo_name == said.rstrip(".")
    assert main(["add", str(path), str(tmp_path / "nowhere")]) == 2
    assert main(["add", str(tmp_path / "none.coatgui"), str(folder)]) == 2


def test_names_starts_and_corrections_are_told(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    folder, table = tmp_path / "week", tmp_path / "proposals.csv"
    (folder / "first").mkdir(parents=True)
    for name, source in (("no 1 K1 t1h", "K1_1h"), ("no 2 K1 t8h", "K1_8h"), ("odd", "K1_24h")):
        content = (sample_panels() / f"{source}.csv").read_bytes()
        (folder / "first" / f"{name}.csv").write_bytes(content)
    call = ["assess", str(folder), "--names", "first/no 1 {panel:K1} t{time:1}h.csv"]
    assert main([*call, "--dry-run", "--proposals", str(table)]) == 1
    assert "first/no 2 K1 t8h.csv: a reading of K1 at 8 h" in capsys.readouterr().out
    lines = table.read_text(encoding="utf-8-sig").splitlines()
    assert lines[0].startswith("file,part,standing,becomes,panel,exposure_h,leave_out")
    changed = [line.replace("asked,nothing yet,,", "asked,,K1,1d") for line in lines]
    table.write_text("\n".join(changed), encoding="utf-8")
    assert main([*call, "--dry-run", "--corrections", str(table)]) == 2
    assert "exposure_h is '1d', which is not a number" in capsys.readouterr().err
    table.write_text("\n".join(changed).replace("1d", "24"), encoding="utf-8")
    out = tmp_path / "o.json"
    told = [*call, "--corrections", str(table), "--quiet", "--workers", "1"]
    assert main([*told, "--json", str(out)]) == 0
    readings = json.loads(out.read_text(encoding="utf-8"))["readings"]
    assert [(r["panel"], r["exposure_h"]) for r in readings] == [
        ("K1", 1.0), ("K1", 8.0), ("K1", 24.0)
    ]  # fmt: skip


def test_a_start_of_exposure_is_told(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    content = (sample_panels() / "K1_1h.csv").read_bytes()
    (tmp_path / "K1 20260302.csv").write_bytes(content)
    call = ["assess", str(tmp_path), "--dry-run", "--names", "{panel:K1} {date:20260302}.csv"]
    assert main([*call, "--started", "K2=2026-02-01", "--started", "2026-03-01"]) == 0
    assert "a reading of K1 at 24 h" in capsys.readouterr().out
    for wrong, words in (
        (["--started", "03/04/2026"], "is no date"),
        (["--time-unit", "fortnight"], "no unit of time"),
        (["--corrections", str(tmp_path / "none.csv")], "cannot be opened"),
        (["--names", "K1.csv"], "Mark parts"),
    ):
        assert main([*call, *wrong]) == 2
        assert words in capsys.readouterr().err
    assert main(["assess", str(tmp_path), "--proposals", "x.csv"]) == 2
    assert "goes with --dry-run" in capsys.readouterr().err
