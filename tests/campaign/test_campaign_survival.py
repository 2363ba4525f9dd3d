"""One writer, files that vanish or cannot be written, copies by age, odd paths."""

import os
import shutil
import sqlite3
import subprocess
import sys
import tempfile
from collections.abc import Iterator
from contextlib import closing
from datetime import UTC, datetime, timedelta
from pathlib import Path

import pytest

from coatgui.campaign import (
    CampaignDamaged,
    CampaignFile,
    CampaignFileError,
    FileGone,
    OperationRefused,
    check_file,
    copies,
    lock,
    operations,
)
from coatgui.records import Campaign


def rename(file: CampaignFile, title: str) -> None:
    file.apply(operations.rename_campaign(file.campaign, title))


# One writer


def test_a_second_window_reads_only_and_says_who_writes(
    file: CampaignFile, campaign: Campaign
) -> None:
    with CampaignFile.open(file.path) as second:
        assert second.holder is not None
        assert second.holder.process == os.getpid()
        assert f"open for writing by {second.holder}" in second.read_only_because
        assert second.campaign == campaign
        with pytest.raises(OperationRefused, match="open for writing by"):
            rename(second, "From the second")
        with pytest.raises(OperationRefused):
            second.undo() or rename(second, "x")
        second.keep_results({"k": b"v"})
        rename(file, "From the first")
        assert second.changed_elsewhere()
        assert second.cached_results(["k"]) == {}
    path = file.path
    file.close()
    assert not path.with_name(path.name + lock.ENDING).exists()
    with CampaignFile.open(path) as again:
        assert (again.read_only_because, again.left_open) == ("", None)
        assert again.campaign.title == "From the first"


def test_what_is_opened_for_reading_locks_nobody_out(file: CampaignFile) -> None:
    file.close()
    with CampaignFile.open(file.path, read_only=True) as reading:
        assert "for reading only" in reading.read_only_because
        with CampaignFile.open(file.path) as writing:
            rename(writing, "Later")


_HOLD = """
import sys, time
from pathlib import Path
from coatgui.campaign import CampaignFile
file = CampaignFile.open(Path(sys.argv[1]))
print(repr(file.read_only_because), flush=True)
time.sleep(60)
"""


def test_a_lock_left_by_a_killed_process_is_stale(file: CampaignFile) -> None:
    file.close()
    with subprocess.Popen(
        [sys.executable, "-c", _HOLD, str(file.path)],
        stdout=subprocess.PIPE,
        env={**os.environ, "PYTHONPATH": os.pathsep.join(sys.path)},
    ) as other:
        assert other.stdout is not None
        assert other.stdout.readline().strip() == b"''"
        with CampaignFile.open(file.path) as second:
            assert second.holder is not None
            assert second.holder.process == other.pid
        other.kill()
    with CampaignFile.open(file.path) as again:
        assert again.read_only_because == ""
        assert again.left_open is not None
        assert again.left_open.process == other.pid
        rename(again, "Goes on")


@pytest.mark.parametrize(
    ("told", "is_free"),
    [
        ('{"who": "x", "computer": "HERE", "process": 99999999, "since_utc": "t"}', True),
        ('{"who": "x", "computer": "HERE", "process": 1, "since_utc": "t"}', False),
        ('{"who": "x", "computer": "elsewhere", "process": 1, "since_utc": "t"}', False),
        ("nonsense", False),
    ],
)
def test_where_the_system_has_no_locks_the_file_is_the_lock(
    file: CampaignFile, told: str, is_free: bool, monkeypatch: pytest.MonkeyPatch
) -> None:
    file.close()
    beside = file.path.with_name(file.path.name + lock.ENDING)
    beside.write_text(told.replace("HERE", lock.here().computer), encoding="utf-8")
    monkeypatch.setattr(lock, "_lock", lambda _: False)
    with CampaignFile.open(file.path) as again:
        assert (again.read_only_because == "") == is_free
        if is_free:
            # SQLite has a lock of its own there, which is a folder, also one left by a crash.
            rename(again, "Without locks")
            with CampaignFile.open(file.path) as second:
                assert second.holder is not None
    assert beside.exists() != is_free
    file.path.with_name(file.path.name + ".lock").mkdir()
    beside.unlink(missing_ok=True)
    with CampaignFile.open(file.path) as again:
        rename(again, "Once more")
    assert check_file(file.path) == ()


# The file vanishes, is replaced, cannot be written


@pytest.mark.parametrize("replaced", [False, True])
def test_a_file_that_vanishes_loses_nothing(
    file: CampaignFile, raw: dict[str, bytes], tmp_path: Path, replaced: bool
) -> None:
    rename(file, "Kept")
    other = tmp_path / "moved away.coatgui"
    file.path.rename(other)
    if replaced:
        shutil.copy(other, file.path)
    with pytest.raises(FileGone, match="no longer in its place"):
        rename(file, "Not made")
    assert file.campaign.title == "Kept"
    target = tmp_path / "elsewhere.coatgui"
    assert file.save_copy(target) == ()
    with CampaignFile.open(target) as again:
        assert again.campaign == file.campaign
        assert again.undo_name == "Rename the campaign to Kept"
        assert all(again.raw(sha256) for sha256 in raw)


def test_what_is_in_memory_is_saved_where_the_file_cannot_be_read(
    file: CampaignFile, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    def fails(*_: object) -> None:
        raise sqlite3.OperationalError("disk I/O error")

    rename(file, "Kept")
    monkeypatch.setattr(copies, "back_up", fails)
    assert file.save_copy(tmp_path / "bytes.coatgui") == ()
    monkeypatch.setattr(copies, "copy_with_journal", lambda *_: False)
    said = file.save_copy(tmp_path / "memory.coatgui")
    assert "history" in said[0]
    with CampaignFile.open(tmp_path / "memory.coatgui") as again:
        assert again.campaign == file.campaign


@pytest.fixture
def not_root() -> Iterator[Path]:
    """A folder whose permissions count, for the superuser as well."""
    folder = Path(tempfile.mkdtemp())
    folder.chmod(0o777)
    yield folder
    folder.chmod(0o777)
    shutil.rmtree(folder)


@pytest.mark.skipif(sys.platform == "win32", reason="folders have other permissions there")
@pytest.mark.parametrize("version", [1, 3])
def test_a_read_only_folder(
    not_root: Path, file: CampaignFile, campaign: Campaign, version: int
) -> None:
    path = not_root / "campaign.coatgui"
    if version == 3:
        file.save_copy(path)
    else:
        sql = Path(__file__).parent / "old_versions" / "version_1.sql"
        with closing(sqlite3.connect(path)) as shell:
            shell.executescript(sql.read_text(encoding="utf-8"))
    path.chmod(0o444)
    not_root.chmod(0o555)
    me = os.geteuid()
    if me == 0:
        os.seteuid(65534)
    try:
        with CampaignFile.open(path) as reading:
            assert "write-protected" in reading.read_only_because
            assert reading.campaign.panels[1:] == campaign.panels[1:]
            with pytest.raises(OperationRefused, match="save a copy elsewhere"):
                rename(reading, "x")
            with pytest.raises(CampaignFileError):
                reading.save_copy(not_root / "copy.coatgui")
        assert check_file(path) == ()
    finally:
        os.seteuid(me)
    assert [p.name for p in not_root.iterdir()] == [path.name]


# Damage, copies


def test_a_change_from_outside_is_seen_at_opening(file: CampaignFile) -> None:
    file.close()
    for statement in (
        "UPDATE panels SET area_cm2 = 11 WHERE panel_id = 'p1'",
        "UPDATE history SET who = 'nobody'",
    ):
        copy = file.path.with_name("altered.coatgui")
        shutil.copy(file.path, copy)
        with closing(sqlite3.connect(copy)) as shell, shell:
            shell.execute(statement)
        with pytest.raises(CampaignDamaged, match="recovered"):
            CampaignFile.open(copy)


def test_a_file_that_comes_with_a_write_ahead_log_is_turned_back(file: CampaignFile) -> None:
    file.close()
    with closing(sqlite3.connect(file.path)) as shell:
        shell.execute("PRAGMA journal_mode = WAL")
    assert file.path.read_bytes()[18:20] == b"\x02\x02"
    with CampaignFile.open(file.path) as again:
        rename(again, "Later")
    assert file.path.read_bytes()[18:20] == b"\x01\x01"
    assert [p.name for p in file.path.parent.iterdir()] == [file.path.name]


def test_a_copy_is_made_before_a_file_is_brought_up_to_date(path: Path) -> None:
    sql = (Path(__file__).parent / "old_versions" / "version_2.sql").read_text(encoding="utf-8")
    with closing(sqlite3.connect(path)) as shell:
        shell.executescript(sql)
    before = path.read_bytes()
    CampaignFile.open(path).close()
    copy = path.with_name("Tafeln 1 (file version 2).coatgui")
    assert {p.name for p in path.parent.iterdir()} == {path.name, copy.name}
    with closing(sqlite3.connect(copy)) as kept, closing(sqlite3.connect(":memory:")) as was:
        was.deserialize(before)
        assert list(kept.iterdump()) == list(was.iterdump())


def test_rolling_copies(file: CampaignFile, tmp_path: Path) -> None:
    first = file.keep_copy()
    assert first is not None
    assert first.parent == tmp_path / "Tafeln 1 copies"
    assert file.keep_copy() is None  # nothing changed
    rename(file, "Later")
    elsewhere = tmp_path / "chosen"
    second = file.keep_copy(elsewhere)
    assert second is not None
    assert second.parent == elsewhere
    for copy, title in ((first, "Salt and patience"), (second, "Later")):
        assert check_file(copy) == ()
        with CampaignFile.open(copy, read_only=True) as kept:
            assert kept.campaign.title == title
    (newest,) = copies.copies_of(file.path)
    assert newest[1] == first


def test_edits_go_on_while_a_copy_is_made(
    file: CampaignFile, monkeypatch: pytest.MonkeyPatch
) -> None:
    file.keep_results({str(number): bytes(9000) for number in range(50)})
    monkeypatch.setattr(copies, "_PAGES_AT_ONCE", 5)
    monkeypatch.setattr(copies.time, "sleep", lambda _: rename(file, f"{file.campaign.title}+"))
    made = file.keep_copy()
    assert made is not None
    assert check_file(made) == ()
    assert file.campaign.title.endswith("+++")


def test_copies_are_kept_by_their_age() -> None:
    now = datetime(2026, 6, 1, 12, tzinfo=UTC)
    made: set[datetime] = set()
    for hour in range(24 * 200):
        moment = now - timedelta(hours=24 * 200 - hour)
        made.add(moment)
        made -= copies.superfluous(made, moment)
    ages = sorted(now - moment for moment in made)
    assert sum(age <= timedelta(days=1) for age in ages) == 24
    assert 12 <= sum(timedelta(days=1) < age <= timedelta(days=14) for age in ages) <= 15
    assert 9 <= sum(timedelta(days=14) < age <= timedelta(days=92) for age in ages) <= 14
    assert 3 <= sum(age > timedelta(days=92) for age in ages) <= 6


@pytest.mark.parametrize("name", ["a b.coatgui", "Prüfköper Ä.coatgui", "🧪 %20?#'.coatgui"])
def test_odd_paths(tmp_path: Path, campaign: Campaign, raw: dict[str, bytes], name: str) -> None:
    folder = tmp_path / f"in {name}"
    folder.mkdir()
    path = folder / name
    with CampaignFile.create(path, campaign, raw) as file:
        rename(file, "Odd")
        assert file.keep_copy() is not None
        file.save_copy(folder / f"copy of {name}")
    assert check_file(path) == ()
    assert check_file(folder / f"copy of {name}") == ()
    with CampaignFile.open(path) as again:
        assert again.campaign.title == "Odd"
