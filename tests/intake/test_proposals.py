"""The dry run: what each file becomes, corrections in place, names, dates, areas, the template."""

from __future__ import annotations

from dataclasses import replace
from datetime import datetime
from pathlib import Path

import numpy as np
import pytest

from coatgui.intake import (
    Correction,
    NamePattern,
    Standing,
    Told,
    UnreadableFolder,
    propose_folder,
    read_again,
    read_folder,
)
from coatgui.intake.names import NameSays, parts_of
from coatgui.intake.template import read_lists, template
from coatgui.records import FoundPanel, Source

FREQUENCY = np.logspace(5, -2, 29)
S = 2j * np.pi * FREQUENCY
Z = 120 + 1 / (2e-9 * S**0.95 + 1 / (4e6 + 1 / (3e-7 * S**0.85)))


def told(size: float = 1.0, headings: str = "f (Hz),Z' (ohm),Z'' (ohm)") -> str:
    rows = [f"{f!r},{z.real!r},{z.imag!r}" for f, z in zip(FREQUENCY.tolist(),
            (Z * size).tolist(), strict=True)]  # fmt: skip
    return "\n".join([headings, *rows]) + "\n"


def standings(folder: Path, what: Told | None = None) -> dict[str, Standing]:
    return {p.file: p.standing for p in propose_folder(folder, told=what).proposals}


def test_every_file_has_a_proposal(tmp_path: Path) -> None:
    below = tmp_path / "week 2"
    below.mkdir()
    (tmp_path / "A1_24h.csv").write_text(told())
    (below / "A1_14d.asc").write_text(told(2))  # the ending does not matter
    (tmp_path / "A2_24h.csv").write_text("Sample: B9\n" + told(3))
    (tmp_path / "unnamed.csv").write_text(told(4))
    (tmp_path / "A3_24h.csv").write_text(told(5, "f (Hz),Z' (mohm),Z'' (mohm)"))
    (tmp_path / "A4_24h.csv").write_text("f,Z',Z''\n1,2,-3\n")
    (tmp_path / "picture.png").write_bytes(b"\x89PNG\r\n\x1a\n\x00\x00")
    (tmp_path / "readme.md").write_text("Weather: fine.\n")
    (tmp_path / "panels.csv").write_text("panel,area_cm2\nA1,10\n")
    (tmp_path / "open_lead.csv").write_text(told(1e4))
    run = propose_folder(tmp_path)
    by_file = {p.file: p for p in run.proposals}
    assert {file: str(p.standing) for file, p in by_file.items()} == {
        "A1_24h.csv": "ready",
        "week 2/A1_14d.asc": "ready",
        "A2_24h.csv": "doubtful",
        "unnamed.csv": "asked",
        "A3_24h.csv": "asked",
        "A4_24h.csv": "refused",
        "picture.png": "passed over",
        "readme.md": "passed over",
        "panels.csv": "list",
        "open_lead.csv": "list",
    }
    first = by_file["A1_24h.csv"]
    assert first.becomes == "a reading of A1 at 24 h"
    assert (first.panel, first.exposure_h, first.points) == ("A1", 24.0, 29)
    assert (first.lowest_hz, first.highest_hz) == (FREQUENCY[-1], FREQUENCY[0])
    assert first.lowest_ohm == pytest.approx(np.abs(Z).min())
    assert by_file["unnamed.csv"].points == 29  # what could be read is shown
    assert "'B9'" in by_file["A2_24h.csv"].sentences[0]
    assert "only 1 point" in by_file["A4_24h.csv"].sentences[0]
    # What is asked is not imported, and named.
    assert {r.file for r in run.found.refused} == {"unnamed.csv", "A3_24h.csv", "A4_24h.csv"}
    assert len(run.found.readings) == 3
    assert run.summary() == "2 ready, 1 doubtful, 2 asked, 1 refused, 2 list, 2 passed over"
    assert "A4_24h.csv: nothing" in run.table()


def test_corrections_in_place(tmp_path: Path) -> None:
    (tmp_path / "one.csv").write_text(told())
    (tmp_path / "two.csv").write_text("x,y,z\n" + told(2).split("\n", 1)[1].replace("-", ""))
    (tmp_path / "three.csv").write_text(told(3))
    first = propose_folder(tmp_path).proposals
    dialect = next(p.dialect for p in first if p.file == "one.csv")
    assert dialect is not None
    # The person says that the imaginary part of two.csv stands there without its sign.
    columns = tuple(
        replace(c, factor=-1.0) if c.role == "imaginary" else c for c in dialect.columns
    )
    what = Told(
        corrections={
            ("one.csv", ""): Correction(panel="A1", exposure_h=24.0),
            ("two.csv", ""): Correction(
                panel="A2",
                exposure_h=24.0,
                dialect=replace(dialect, columns=columns, first_data_line=0),
            ),
            ("three.csv", ""): Correction(leave_out=True),
        }
    )
    run = propose_folder(tmp_path, told=what)
    assert {p.file: str(p.standing) for p in run.proposals} == {
        "one.csv": "ready", "two.csv": "ready", "three.csv": "left out"
    }  # fmt: skip
    assert run.found.refused == ()
    by_panel = {r.panel: r for r in run.found.readings}
    assert np.allclose(by_panel["A2"].spectrum.impedance_ohm, 2 * Z, rtol=1e-12)


def test_parts_of_a_file_are_corrected_one_by_one(tmp_path: Path) -> None:
    two = told(1) + "\n" + told(2)
    (tmp_path / "run.csv").write_text(two)
    assert [str(p.standing) for p in propose_folder(tmp_path).proposals] == ["asked", "asked"]
    what = Told(
        corrections={
            ("run.csv", ""): Correction(panel="A1"),
            ("run.csv", "spectrum 1"): Correction(exposure_h=24.0),
            ("run.csv", "spectrum 2"): Correction(exposure_h=168.0),
        }
    )
    readings = read_folder(tmp_path, told=what).readings
    assert [(r.panel, r.exposure_h) for r in readings] == [("A1", 24.0), ("A1", 168.0)]
    (tmp_path / "readings.csv").write_text(
        "file,part,panel,exposure_h\nrun.csv,spectrum 1,B1,1\nrun.csv,spectrum 2,B2,2\n"
    )
    readings = read_folder(tmp_path).readings
    assert [(r.panel, r.exposure_h) for r in readings] == [("B1", 1.0), ("B2", 2.0)]


def test_one_name_for_several_spectra_is_asked_about(tmp_path: Path) -> None:
    (tmp_path / "A1_24h.csv").write_text(told(1) + "\n" + told(2))
    run = propose_folder(tmp_path)
    assert [str(p.standing) for p in run.proposals] == ["asked", "asked"]
    assert "several spectra" in run.found.refused[0].reason


def test_stored_bytes_are_read_again(tmp_path: Path) -> None:
    (tmp_path / "A1_24h.csv").write_text(told())
    found = read_folder(tmp_path)
    (reading,) = found.readings
    data = found.raw[reading.source.sha256]
    dialect = reading.source.dialect
    assert dialect is not None
    kilo = tuple(
        replace(c, factor=c.factor * 1e3) if c.role in ("real", "imaginary") else c
        for c in dialect.columns
    )
    again = read_again(data, reading.source, replace(dialect, columns=kilo), "A2", 48.0)
    assert np.allclose(again.spectrum.impedance_ohm, 1e3 * Z, rtol=1e-12)
    assert (again.panel, again.exposure_h) == ("A2", 48.0)
    assert again.source.sha256 == reading.source.sha256
    assert again.source.dialect is not None
    assert again.source.dialect.remarks == ("The dialect was corrected by hand.",)
    same = read_again(data, Source("x", "y"), dialect, "A1", 24.0)
    assert same.spectrum == reading.spectrum


# ---------------------------------------------------------------------------------------------
# Names


def test_a_pattern_pointed_at_in_one_example() -> None:
    example = "series B/week 3/2026-03-08 panel B-07 t168h run2.txt"
    assert [p.text for p in parts_of(example)] == [
        "series", "B", "week", "3", "2026", "03", "08", "panel", "B", "07", "t168h", "run2"
    ]  # fmt: skip

    def mark(words: str) -> tuple[int, int]:
        start = example.index(words)
        return start, start + len(words)

    pattern = NamePattern.pointed_at(example, panel=mark("B-07"), time=mark("t168h"))
    rows = pattern.table(["x/2026-04-01 panel C-11 t2d run1.txt", "other.txt", example])
    assert [(says.panel, says.exposure_h) for _, says in rows] == [
        ("C-11", 48.0), ("", None), ("B-07", 168.0)
    ]  # fmt: skip
    folders = NamePattern.pointed_at(example, panel=mark("panel B-07"), time=mark("3"), unit="week")
    assert folders.says("series A/week 4/2026-03-08 panel B-08 x.csv").exposure_h == 672.0
    dated = NamePattern.pointed_at(example, date=mark("2026-03-08"))
    assert dated.says("a/b/2026-04-01 x.csv").moment == datetime(2026, 4, 1)
    with pytest.raises(ValueError, match="Mark a word"):
        NamePattern.pointed_at(example, panel=(8, 9))
    with pytest.raises(ValueError, match="no unit of time"):
        NamePattern.pointed_at(example, time=mark("t168h"), unit="fortnight")


def test_a_pattern_marked_in_one_example() -> None:
    pattern = NamePattern.marked("week 3/{panel:B-07} t{time:168}h run2.txt")
    assert pattern.says("week 4/C-11 t2d run1.txt") == NameSays("C-11", 48.0)
    by_folder = NamePattern.marked("week {time:3}/{panel:B-07}.txt", "week")
    assert by_folder.says("week 4/C-11.txt") == NameSays("C-11", 672.0)
    dated = NamePattern.marked("{panel:P07} {date:20260308}.csv")
    assert dated.says("P08 20260401.csv").moment == datetime(2026, 4, 1)
    for wrong in ("B-07.txt", "{panel:A1}{panel:A2}.txt", "{what:A1}.txt", "{panel:--}.txt"):
        with pytest.raises(ValueError, match="Mark"):
            NamePattern.marked(wrong)


def test_a_pattern_and_dates_fill_what_files_leave_open(tmp_path: Path) -> None:
    (tmp_path / "P07 20260308.csv").write_text(told())
    (tmp_path / "P08 20260309.csv").write_text(told(2))
    pattern = NamePattern.pointed_at("P07 20260308.csv", panel=(0, 3), date=(4, 12))
    started = {"": datetime(2026, 3, 1), "P08": datetime(2026, 3, 8)}
    readings = read_folder(tmp_path, told=Told(pattern=pattern, started=started)).readings
    assert [(r.panel, r.exposure_h) for r in readings] == [("P07", 168.0), ("P08", 24.0)]
    # The panel list may say when exposure started.
    (tmp_path / "panels.csv").write_text("panel,start\nP07,2026-03-01\nP08,2026-03-02\n")
    readings = read_folder(tmp_path, told=Told(pattern=pattern)).readings
    assert [r.exposure_h for r in readings] == [168.0, 168.0]
    late = Told(pattern=pattern, started={"": datetime(2026, 4, 1)})
    assert set(standings(tmp_path, late).values()) == {Standing.ASKED, Standing.LIST}


def test_values_per_area_are_divided_by_the_area_or_asked_about(tmp_path: Path) -> None:
    (tmp_path / "A1_24h.csv").write_text(told(20, "f (Hz),Z' (ohm cm2),Z'' (ohm cm2)"))
    assert standings(tmp_path) == {"A1_24h.csv": Standing.ASKED}
    known = read_folder(tmp_path, told=Told(areas_cm2={"A1": 20.0}))
    (tmp_path / "panels.csv").write_text("panel,area_cm2\nA1,20\n")
    for (reading,) in (known.readings, read_folder(tmp_path).readings):
        assert np.allclose(reading.spectrum.impedance_ohm, Z, rtol=1e-12)
        assert reading.source.dialect is not None
        assert any("20 cm²" in remark for remark in reading.source.dialect.remarks)
        again = read_again(
            (tmp_path / "A1_24h.csv").read_bytes(), reading.source, reading.source.dialect, "A1", 1
        )
        assert again.spectrum == reading.spectrum


# ---------------------------------------------------------------------------------------------
# The template workbook, and folders


def test_the_template_is_read_back(tmp_path: Path) -> None:
    panels = (FoundPanel("A1", "=Grey", 10.5, 60.0, "steel", notes=(("start", "2026-03-01"),)),)
    data = template(panels, ["run 1.csv", "run 2.csv"])
    lists = read_lists(data)
    assert lists is not None
    assert lists.panels == panels
    assert list(lists.readings) == [("run 1.csv", ""), ("run 2.csv", "")]
    assert lists.ratings == ()
    (tmp_path / "lists.xlsx").write_bytes(data)
    (tmp_path / "run 1.csv").write_text(told())
    (tmp_path / "run 2.csv").write_text("Panel;A1\nDate;2026-03-08\n" + told(2))
    run = propose_folder(tmp_path)
    assert {p.file: str(p.standing) for p in run.proposals} == {
        "lists.xlsx": "list", "run 1.csv": "asked", "run 2.csv": "ready"
    }  # fmt: skip
    assert run.found.panels == panels
    assert [(r.panel, r.exposure_h) for r in run.found.readings] == [("A1", 168.0)]


def test_hidden_files_and_links_out_of_the_folder_are_left_aside(tmp_path: Path) -> None:
    inside, outside = tmp_path / "in", tmp_path / "out"
    inside.mkdir()
    outside.mkdir()
    (outside / "A9_24h.csv").write_text(told(9))
    (inside / "A1_24h.csv").write_text(told())
    (inside / ".A2_24h.csv").write_text(told(2))
    (inside / "A9_24h.csv").symlink_to(outside / "A9_24h.csv")
    (inside / "more").symlink_to(outside)
    (inside / "round and round").symlink_to(inside)
    assert standings(inside) == {"A1_24h.csv": Standing.READY}
    deep = inside
    for level in range(20):
        deep = deep / f"d{level}"
    deep.mkdir(parents=True)
    (deep / "A3_24h.csv").write_text(told(3))
    assert standings(inside) == {"A1_24h.csv": Standing.READY}


def test_a_folder_with_nothing_but_other_files(tmp_path: Path) -> None:
    (tmp_path / "readme.md").write_text("Nothing here.\n")
    with pytest.raises(UnreadableFolder, match="no file that could be a spectrum"):
        propose_folder(tmp_path)
