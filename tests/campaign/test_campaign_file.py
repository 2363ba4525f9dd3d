import hashlib
import json
import os
import sqlite3
import subprocess
import sys
import threading
from contextlib import closing
from dataclasses import fields, replace
from pathlib import Path

import numpy as np
import pytest

import coatgui
from coatgui.campaign import (
    CampaignFile,
    CampaignFileError,
    Operation,
    OperationRefused,
    RowChange,
    operations,
)
from coatgui.campaign.schema import APPLICATION_ID
from coatgui.records import Campaign, Formulation, Panel, Spectrum


def tell(path: Path, *statements: str) -> None:
    """Change a file behind the program's back."""
    with closing(sqlite3.connect(path)) as connection, connection:
        for statement in statements:
            connection.execute(statement)


# Round trip


def test_every_record_comes_back_exactly(file: CampaignFile, campaign: Campaign) -> None:
    path = file.path
    assert file.campaign == campaign
    file.close()
    with CampaignFile.open(path) as again:
        assert again.campaign == campaign


def test_every_field_of_the_sample_differs_from_its_default(campaign: Campaign) -> None:
    """Otherwise the round trip above could pass with a field forgotten."""
    richest = [
        campaign,
        campaign.settings,
        campaign.formulations[0],
        campaign.panels[0],
        campaign.readings[0],
        campaign.readings[0].source,
        campaign.readings[0].source.dialect,
        campaign.ratings[0],
        campaign.ratings[0].seen,
        campaign.photographs[0],
        campaign.identification,
    ]
    for record in richest:
        for field in fields(record):  # type: ignore[arg-type]
            assert getattr(record, field.name) != field.default, (type(record), field.name)


def test_floats_keep_every_bit(path: Path) -> None:
    awkward = [5e-324, 1.7976931348623157e308, 0.1, -0.0, 1e22, 2**53 + 1.0, 1 / 3]
    spectrum = Spectrum(np.arange(7.0, 0, -1), np.array(awkward) + 0j)
    imaginary = Spectrum(np.arange(7.0, 0, -1), np.array([complex(-0.0, x) for x in awkward]))
    campaign = Campaign("c", "t", open_lead=spectrum)
    for kept in (spectrum, imaginary):
        with CampaignFile.create(path, replace(campaign, open_lead=kept), {}, replace=True) as f:
            back = f.campaign.open_lead
            assert back is not None
            assert back.content_key() == kept.content_key()


def test_an_empty_campaign(path: Path) -> None:
    empty = Campaign("c", "Nothing yet")
    with CampaignFile.create(path, empty, {}) as file:
        assert file.campaign == empty
        assert file.undo_name is None
        assert file.undo() is None
        assert file.redo() is None


def test_a_plain_sqlite_shell_reads_everything(file: CampaignFile, campaign: Campaign) -> None:
    query = """
        SELECT panels.name, readings.exposure_h, frequency.value, real.value, imaginary.value
        FROM readings JOIN panels USING (panel_id) JOIN spectra USING (spectrum_id),
            json_each(spectra.frequency_hz) AS frequency,
            json_each(spectra.real_ohm) AS real, json_each(spectra.imaginary_ohm) AS imaginary
        WHERE real.key = frequency.key AND imaginary.key = frequency.key
        ORDER BY readings.place, frequency.key"""
    wanted = [
        ("A1" if reading.panel_id == "p1" else "B-2", reading.exposure_h, frequency, z.real, z.imag)
        for reading in campaign.readings
        for frequency, z in zip(
            reading.spectrum.frequency_hz, reading.spectrum.impedance_ohm, strict=True
        )
    ]
    with closing(sqlite3.connect(file.path)) as shell:
        # json_each of older SQLite rounds the last digit; the text itself is exact.
        for row, expected in zip(shell.execute(query), wanted, strict=True):
            assert row[:2] == expected[:2]
            assert row[2:] == pytest.approx(expected[2:], rel=1e-14)
        (notes,) = shell.execute("SELECT notes FROM panels WHERE name = 'A1'").fetchone()
        assert json.loads(notes) == [["Lot", "7"]]


# Creating and copying


def test_create_does_not_overwrite_unless_told(
    file: CampaignFile, campaign: Campaign, raw: dict[str, bytes], path: Path
) -> None:
    file.close()
    other = replace(campaign, title="Another")
    with pytest.raises(CampaignFileError, match="already a file"):
        CampaignFile.create(path, other, raw)
    with CampaignFile.create(path, other, raw, replace=True) as again:
        assert again.campaign.title == "Another"
    assert [p.name for p in path.parent.iterdir()] == [path.name]


def test_a_file_that_is_open_is_not_overwritten(file: CampaignFile, campaign: Campaign) -> None:
    with pytest.raises(CampaignFileError, match="open in this program"):
        CampaignFile.create(file.path, campaign, {}, replace=True)
    with pytest.raises(CampaignFileError, match="open in this program"):
        file.save_copy(file.path, replace=True)
    assert file.campaign == campaign


def test_a_journal_left_by_another_file_is_not_played_back(
    file: CampaignFile, campaign: Campaign, raw: dict[str, bytes], path: Path
) -> None:
    file.close()
    journal = path.with_name(path.name + "-journal")
    # A journal of a transaction that was cut off: take it from a connection before it commits.
    with closing(sqlite3.connect(path, isolation_level=None)) as connection:
        connection.execute("PRAGMA cache_spill = 1")
        connection.execute("PRAGMA cache_size = 1")
        connection.execute("BEGIN IMMEDIATE")
        connection.execute("UPDATE campaign SET title = 'half'")
        connection.executemany(
            "INSERT INTO cached_results VALUES (?, ?, '')",
            [(str(k), b"x" * 4000) for k in range(50)],
        )
        left = journal.read_bytes()
        connection.execute("ROLLBACK")
    path.unlink()
    journal.write_bytes(left)
    other = replace(campaign, title="Another")
    with CampaignFile.create(path, other, raw) as again:
        assert again.campaign == other
    assert not journal.exists()


@pytest.mark.parametrize(
    "unsound",
    [
        Campaign("c", " "),
        Campaign("c", "t", formulations=(Formulation("f", "A"), Formulation("g", "A"))),
        Campaign("c", "t", formulations=(Formulation("f", "A"), Formulation("f", "B"))),
        Campaign("c", "t", panels=(Panel("p", "A", "nowhere"),)),
        Campaign("c", "t", formulations=(Formulation("f", "lone surrogate \ud800"),)),
    ],
)
def test_an_unsound_campaign_leaves_no_file(path: Path, unsound: Campaign) -> None:
    with pytest.raises(CampaignFileError):
        CampaignFile.create(path, unsound, {})
    assert list(path.parent.iterdir()) == []


def test_raw_bytes_must_fit_their_hash(path: Path, campaign: Campaign) -> None:
    with pytest.raises(CampaignFileError, match="SHA-256"):
        CampaignFile.create(path, campaign, {"0" * 64: b"something else"})
    assert list(path.parent.iterdir()) == []


def test_create_in_a_folder_that_is_missing(tmp_path: Path, campaign: Campaign) -> None:
    with pytest.raises(CampaignFileError, match="does not exist"):
        CampaignFile.create(tmp_path / "no" / "x.coatgui", campaign, {})


def test_a_copy_holds_everything(
    file: CampaignFile, campaign: Campaign, raw: dict[str, bytes], tmp_path: Path
) -> None:
    file.apply(operations.rename_campaign(file.campaign, "Later"))
    file.keep_results({"k": b"v"})
    target = tmp_path / "copy.coatgui"
    file.save_copy(target)
    with pytest.raises(CampaignFileError, match="already a file"):
        file.save_copy(target)
    file.save_copy(target, replace=True)
    with CampaignFile.open(target) as copy:
        assert copy.campaign == file.campaign
        assert copy.history() == file.history()
        assert copy.cached_results(["k"]) == {"k": b"v"}
        assert all(copy.raw(sha256) == content for sha256, content in raw.items())
        copy.undo()
        assert copy.campaign == campaign
    assert file.campaign.title == "Later"
    file.close()
    assert {p.name for p in tmp_path.iterdir()} == {file.path.name, target.name}


# Raw files and cached results


def test_raw_bytes(file: CampaignFile, raw: dict[str, bytes]) -> None:
    for sha256, content in raw.items():
        assert file.raw(sha256) == content
        assert hashlib.sha256(content).hexdigest() == sha256
    assert file.raw("0" * 64) is None


def test_changed_raw_bytes_are_not_handed_out(file: CampaignFile, raw: dict[str, bytes]) -> None:
    sha256 = next(iter(raw))
    tell(file.path, f"UPDATE raw_files SET bytes = x'00' WHERE sha256 = '{sha256}'")
    with pytest.raises(CampaignFileError, match="have changed"):
        file.raw(sha256)


def test_results_are_kept_from_any_thread(file: CampaignFile) -> None:
    problems: list[BaseException] = []

    def work(number: int) -> None:
        try:
            for step in range(10):
                file.keep_results({f"{number}/{step}": bytes([number, step])})
                assert file.cached_results([f"{number}/{step}", "absent"]) == {
                    f"{number}/{step}": bytes([number, step])
                }
        except BaseException as problem:
            problems.append(problem)

    threads = [threading.Thread(target=work, args=(number,)) for number in range(4)]
    for thread in threads:
        thread.start()
    for step in range(10):
        file.apply(operations.rename_campaign(file.campaign, f"Title {step}"))
    for thread in threads:
        thread.join()
    assert problems == []
    assert file.campaign.title == "Title 9"
    path = file.path
    file.close()
    with CampaignFile.open(path) as again:
        assert again.cached_results(["3/9"]) == {"3/9": bytes([3, 9])}
        again.keep_results({"3/9": b"newer"})
        assert again.cached_results(["3/9"]) == {"3/9": b"newer"}


def test_a_cache_that_cannot_be_written_is_no_failure(file: CampaignFile) -> None:
    file._connection.execute("PRAGMA query_only = ON")
    file.keep_results({"k": b"v"})
    assert file.cached_results(["k"]) == {}
    with pytest.raises(CampaignFileError, match="write-protected"):
        file.apply(operations.rename_campaign(file.campaign, "Later"))


# Files that are not to be opened


def test_no_such_file(tmp_path: Path) -> None:
    with pytest.raises(CampaignFileError, match="no campaign file"):
        CampaignFile.open(tmp_path / "nothing.coatgui")
    with pytest.raises(CampaignFileError, match="no campaign file"):
        CampaignFile.open(tmp_path)
    assert list(tmp_path.iterdir()) == []


@pytest.mark.parametrize(
    "content", [b"", b"frequency;real;imaginary\n1;2;3\n", b"SQLite format 3\0"]
)
def test_not_a_campaign(path: Path, content: bytes) -> None:
    path.write_bytes(content)
    with pytest.raises(CampaignFileError, match="not a campaign file"):
        CampaignFile.open(path)
    assert path.read_bytes() == content


def test_another_programs_database_is_left_alone(path: Path) -> None:
    tell(path, "CREATE TABLE campaign (title)", "INSERT INTO campaign VALUES ('x')")
    before = path.read_bytes()
    with pytest.raises(CampaignFileError, match="not a campaign file"):
        CampaignFile.open(path)
    assert path.read_bytes() == before


def test_a_file_of_a_newer_version_is_refused(file: CampaignFile) -> None:
    file.close()
    tell(file.path, "PRAGMA user_version = 999")
    with pytest.raises(CampaignFileError, match=r"newer coatgui \(file version 999"):
        CampaignFile.open(file.path)


@pytest.mark.parametrize(
    ("statement", "says"),
    [
        ("CREATE TRIGGER t AFTER UPDATE ON panels BEGIN DELETE FROM readings; END", "trigger 't'"),
        ("CREATE VIEW v AS SELECT * FROM panels", "view 'v'"),
        ("CREATE TABLE more (x)", "table 'more'"),
        ("CREATE INDEX i ON panels (upper(name))", "index 'i'"),
        ("DROP TABLE cached_results", "cached_results.* is missing"),
        ("ALTER TABLE panels ADD COLUMN extra TEXT", "table 'panels' is not as"),
    ],
)
def test_a_structure_that_is_not_ours_is_refused(
    file: CampaignFile, statement: str, says: str
) -> None:
    file.close()
    tell(file.path, statement)
    with pytest.raises(CampaignFileError, match=says):
        CampaignFile.open(file.path)


def test_a_database_that_only_carries_our_mark_is_refused(path: Path) -> None:
    tell(path, "CREATE TABLE x (y)", f"PRAGMA application_id = {APPLICATION_ID}")
    with pytest.raises(CampaignFileError, match="cannot be trusted"):
        CampaignFile.open(path)


@pytest.mark.parametrize(
    "statement",
    [
        "UPDATE spectra SET real_ohm = '[1, 2]'",
        "UPDATE spectra SET real_ohm = 'nonsense'",
        "UPDATE spectra SET frequency_hz = '[1, 1, 1, 1, 1, -1]'",
        "UPDATE readings SET left_out = '[[99, \"no such point\"]]'",
        "UPDATE readings SET left_out = '{}'",
        "UPDATE readings SET dialect = '{}'",
        "UPDATE panels SET notes = '[1]'",
        "UPDATE settings SET criteria = '[{}]'",
        "DELETE FROM settings",
        "UPDATE open_lead SET dialect = 'x'",
        "UPDATE history SET action = 'undo'",
    ],
)
def test_damaged_content_is_refused_in_words(file: CampaignFile, statement: str) -> None:
    file.close()
    tell(file.path, statement)
    with pytest.raises(CampaignFileError, match="damaged"):
        CampaignFile.open(file.path)


def test_a_damaged_page_is_refused_in_words(file: CampaignFile) -> None:
    file.close()
    content = bytearray(file.path.read_bytes())
    content[4096 + 100 :] = b"\xff" * (len(content) - 4096 - 100)
    file.path.write_bytes(content)
    with pytest.raises(CampaignFileError):
        CampaignFile.open(file.path)


def test_a_closed_file_says_so(file: CampaignFile) -> None:
    file.close()
    file.close()
    with pytest.raises(CampaignFileError, match="closed"):
        file.apply(operations.rename_campaign(file.campaign, "Later"))
    with pytest.raises(CampaignFileError, match="closed"):
        file.cached_results(["k"])


def test_the_connection_is_set_up_with_care(file: CampaignFile) -> None:
    wanted = {
        "journal_mode": "delete",
        "synchronous": 2,
        "trusted_schema": 0,
        "cell_size_check": 1,
        "foreign_keys": 1,
        "application_id": APPLICATION_ID,
    }
    for pragma, value in wanted.items():
        assert file._connection.execute(f"PRAGMA {pragma}").fetchone()[0] == value, pragma


# Two at once, and sudden ends


def test_two_programs_do_not_mix_their_changes(
    file: CampaignFile, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Even where the lock failed, as it may on a network folder."""
    file._opened.lock.release()  # type: ignore[union-attr]
    with CampaignFile.open(file.path) as other:
        assert not file.changed_elsewhere()
        other.apply(operations.rename_campaign(other.campaign, "From the other"))
        assert file.changed_elsewhere()
        with pytest.raises(CampaignFileError, match="changed by another program"):
            file.apply(operations.rename_campaign(file.campaign, "From here"))
        assert other.campaign.title == "From the other"
    with CampaignFile.open(file.path) as again:
        assert again.campaign.title == "From the other"


_KILLED = """
import os, sys
from pathlib import Path
from coatgui.campaign import CampaignFile, operations
from coatgui.campaign.trail import Trail

file = CampaignFile.open(Path(sys.argv[1]))
file._connection.execute("PRAGMA cache_size = 1")  # so that pages reach the disk before the end
write = Trail.write
def write_and_end(*arguments):
    write(*arguments)
    os._exit(7)
Trail.write = write_and_end
file.apply(operations.remove_panel(file.campaign, "p1"))
"""


def test_a_sudden_end_inside_a_change_leaves_the_state_before(
    file: CampaignFile, campaign: Campaign
) -> None:
    file.close()
    home = Path(coatgui.__file__).parent.parent
    ended = subprocess.run(
        [sys.executable, "-c", _KILLED, str(file.path)],
        cwd=home,
        env={**os.environ, "PYTHONPATH": str(home)},
        check=False,
    )
    assert ended.returncode == 7
    assert file.path.with_name(file.path.name + "-journal").exists()  # it was under way
    with CampaignFile.open(file.path) as again:
        assert again.campaign == campaign
        assert len(again.history()) == 1


def test_a_failure_inside_a_change_leaves_the_state_before(
    file: CampaignFile, campaign: Campaign, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(file._trail, "write", lambda *_: 1 / 0)
    with pytest.raises(ZeroDivisionError):
        file.apply(operations.remove_panel(file.campaign, "p1"))
    monkeypatch.undo()
    assert file.campaign == campaign
    file.apply(operations.remove_panel(file.campaign, "p1"))
    file.undo()
    assert file.campaign == campaign


def test_a_rule_that_only_the_file_knows_is_kept_too(file: CampaignFile) -> None:
    """The operations refuse this themselves; the door must not rely on it."""
    before = file.campaign
    for change in (
        RowChange("panels", "p1", {"name": "A1"}, {"name": "B-2"}),
        RowChange("panels", "p1", {"area_cm2": 10.1}, {"area_cm2": -1.0}),
        RowChange("panels", "p1", {"formulation_id": "f1"}, {"formulation_id": "gone"}),
        RowChange("panels", "p1", {"name": "not this"}, {"name": "Z"}),
        RowChange("panels", "gone", {"name": "A1"}, {"name": "Z"}),
        RowChange("panels", "p9", None, {"panel_id": "p8", "name": "Z", "formulation_id": "f1"}),
        RowChange("formulations", "f1", None, {"formulation_id": "f1", "name": "Z"}),
        RowChange("panels", "p1", {}, {"name = '' --": "x"}),
        RowChange("history", "1", {}, {"name": "x"}),
        RowChange("settings", "c1", {"mains_hz": 60.0}, {"modulus_frequencies_hz": "nonsense"}),
    ):
        with pytest.raises(CampaignFileError):
            file.apply(Operation("Break it", (change,)))
        assert file.campaign is before
    with pytest.raises(OperationRefused, match="changed meanwhile"):
        file.apply(Operation("x", (RowChange("panels", "p1", {"name": "?"}, {"name": "Z"}),)))
    path = file.path
    file.close()
    with CampaignFile.open(path) as again:
        assert again.campaign == before
        assert len(again.history()) == 1


def test_only_touched_records_are_made_anew(file: CampaignFile) -> None:
    before = file.campaign
    file.apply(operations.leave_out_points(before, "r2", [1], "spike"))
    after = file.campaign
    assert after.readings[1] is not before.readings[1]
    assert after.readings[1].spectrum is before.readings[1].spectrum
    assert all(after.readings[k] is before.readings[k] for k in (0, 2, 3))
    assert after.panels is before.panels
    assert after.settings is before.settings
