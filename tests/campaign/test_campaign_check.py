import sqlite3
from contextlib import closing
from pathlib import Path

import pytest

from coatgui.campaign import CampaignFile, check_file, operations


def tell(path: Path, *statements: str) -> None:
    with closing(sqlite3.connect(path)) as connection, connection:
        for statement in statements:
            connection.execute(statement)


def test_a_sound_file(file: CampaignFile) -> None:
    file.apply(operations.remove_panel(file.campaign, "p1"))
    file.undo()
    file.apply(operations.rename_campaign(file.campaign, "Later"))
    file.keep_results({"k": b"v"})
    # Also while it is open here, and without changing it.
    before = file.path.stat().st_mtime_ns
    assert check_file(file.path) == ()
    assert file.path.stat().st_mtime_ns == before
    file.apply(operations.rename_campaign(file.campaign, "Later still"))
    file.close()
    assert check_file(file.path) == ()


@pytest.mark.parametrize(
    ("statement", "says"),
    [
        ("UPDATE raw_files SET bytes = x'00' WHERE rowid = 2", "not what its SHA-256"),
        ("DELETE FROM raw_files WHERE rowid = 1", "bytes of one/a1.csv"),
        (
            "UPDATE spectra SET real_ohm = replace(real_ohm, '1', '2')",
            "cannot be read, or was altered",
        ),
        ("UPDATE spectra SET imaginary_ohm = '[]'", "cannot be read"),
        ("UPDATE readings SET panel_id = 'gone' WHERE reading_id = 'r1'", "refers to a row"),
        ("UPDATE readings SET kept_in = '[6]' WHERE reading_id = 'r2'", "row r2 of readings"),
        ("UPDATE panels SET notes = '{' WHERE panel_id = 'p2'", "row p2 of panels"),
        ("UPDATE open_lead SET dialect = '7'", "open-lead run cannot be read"),
        ("DELETE FROM settings", "settings are missing"),
        (
            "INSERT INTO campaign VALUES ('c2', 'second', '', '', '', '', '', '', '[]')",
            "more than one row",
        ),
        ("UPDATE settings SET thresholds = '[[\"x\", NaN]]'", "settings or open-lead run cannot"),
        ("UPDATE history SET changes = '[{}]'", "Line 1 of the history"),
        (
            "UPDATE history SET changes = "
            '\'[{"table": "panels", "key": "p1", "before": [], "after": null}]\'',
            "Line 1 of the history",
        ),
        (
            "INSERT INTO history VALUES (2, 'redo', 1, 'n', 'w', 't', '[]', '', '', '')",
            "contradicts",
        ),
        ("CREATE TRIGGER t AFTER DELETE ON panels BEGIN SELECT 1; END", "trigger 't'"),
        ("CREATE TABLE notes (x)", "table 'notes' that coatgui does not make"),
        ("UPDATE history SET who = 'nobody'", "Line 1 of the history, or one before"),
        ("UPDATE history SET when_utc = '2020-01-01T00:00:00Z'", "Line 1 of the history"),
        ("UPDATE history SET reason = 'another'", "Line 1 of the history"),
        ("DELETE FROM history", "history is missing"),
        ("UPDATE sqlite_sequence SET seq = 7", "end of the history are missing"),
        ("UPDATE panels SET area_cm2 = 10.2 WHERE panel_id = 'p1'", "changed from outside"),
        ("UPDATE ratings SET grade = '1(S3)'", "changed from outside"),
        ("UPDATE photographs SET caption = ''", "changed from outside"),
        ("UPDATE campaign SET reviewer = 'EF'", "changed from outside"),
        ("UPDATE photographs SET sha256 = 'x'", "refers to a row"),
        ("INSERT INTO raw_files VALUES ('x', x'00')", "changed from outside"),
        ("INSERT INTO cached_results VALUES ('k', x'00', '')", "kept result k"),
        ("PRAGMA user_version = 999", "newer coatgui"),
        ("PRAGMA application_id = 1", "not a campaign file"),
    ],
)
def test_what_is_wrong_is_found(file: CampaignFile, statement: str, says: str) -> None:
    file.close()
    tell(file.path, statement)
    problems = check_file(file.path)
    assert any(says in problem for problem in problems), problems


def test_several_problems_are_all_named(file: CampaignFile) -> None:
    file.close()
    tell(
        file.path,
        "UPDATE raw_files SET bytes = x'00'",
        "UPDATE panels SET notes = 'x'",
        "UPDATE history SET changes = ''",
    )
    # Five files, two panels, one line that cannot be read and breaks the chain, and the state.
    assert len(check_file(file.path)) == 5 + 2 + 2 + 1


def test_what_stands_in_a_damaged_file_breaks_no_sentence(file: CampaignFile) -> None:
    """Found by damaged files: a hash that was not one brought its line ends along."""
    file.close()
    tell(
        file.path,
        "PRAGMA foreign_keys = OFF",
        "UPDATE raw_files SET sha256 = 'ab' || char(10) || char(7) || 'cd' WHERE rowid = 1",
    )
    problems = check_file(file.path)
    assert problems
    assert any(
        "ab\N{REPLACEMENT CHARACTER}\N{REPLACEMENT CHARACTER}cd" in said for said in problems
    )
    assert all(said.isprintable() for said in problems)


def test_damaged_pages_are_found(file: CampaignFile) -> None:
    file.keep_results({str(number): bytes(3000) for number in range(40)})
    file.close()
    content = bytearray(file.path.read_bytes())
    middle = 4096 * (len(content) // 4096 - 10)
    content[middle : middle + 4096] = b"\xa5" * 4096
    file.path.write_bytes(content)
    assert check_file(file.path) != ()


def test_no_file_and_no_campaign(tmp_path: Path) -> None:
    (problem,) = check_file(tmp_path / "nothing")
    assert "no campaign file" in problem
    text = tmp_path / "a.csv"
    text.write_text("1;2;3", encoding="utf-8")
    (problem,) = check_file(text)
    assert "not a campaign file" in problem
