"""A watched folder: new files are named once they rest, never while they are written."""

from __future__ import annotations

from pathlib import Path

from coatgui.intake import NamePattern, Told, propose_files
from coatgui.intake.watch import FolderWatch


class Clock:
    now = 0.0

    def __call__(self) -> float:
        return self.now


def test_a_file_is_named_once_it_rests(tmp_path: Path) -> None:
    clock = Clock()
    (tmp_path / "old.csv").write_text("there before")
    watch = FolderWatch(tmp_path, quiet_s=5.0, clock=clock)
    assert watch.settled() == ()
    new = tmp_path / "below" / "new.csv"
    new.parent.mkdir()
    new.write_text("one")
    for second in range(1, 8):
        # Written on every second: never whole.
        clock.now = float(second)
        with new.open("a") as file:
            file.write(f" more {second}")
        assert watch.settled() == ()
    clock.now = 11.9
    assert watch.settled() == ()
    clock.now = 12.0
    assert watch.settled() == (new,)
    clock.now = 30.0
    assert watch.settled() == ()


def test_a_changed_file_is_named_again_and_an_empty_one_never(tmp_path: Path) -> None:
    clock = Clock()
    path = tmp_path / "a.csv"
    path.write_text("first")
    (tmp_path / "empty.csv").touch()
    watch = FolderWatch(tmp_path, known_now=False, quiet_s=5.0, clock=clock)
    assert watch.settled() == ()
    clock.now = 5.0
    assert watch.settled() == (path,)
    path.write_text("corrected")
    assert watch.settled() == ()
    clock.now = 10.0
    assert watch.settled() == (path,)
    path.unlink()
    clock.now = 20.0
    assert watch.settled() == ()


def test_a_folder_that_is_away_for_a_while(tmp_path: Path) -> None:
    clock = Clock()
    folder = tmp_path / "drive"
    folder.mkdir()
    (folder / "a.csv").write_text("x")
    watch = FolderWatch(folder, clock=clock)
    away = folder.rename(tmp_path / "away")
    assert watch.settled() == ()
    away.rename(folder)
    clock.now = 100.0
    assert watch.settled() == ()


def test_files_in_folders_below_are_named_and_keep_their_folders(tmp_path: Path) -> None:
    clock = Clock()
    watch = FolderWatch(tmp_path, quiet_s=5.0, clock=clock)
    rows = "".join(f"{10.0**k};100;-{10.0**-k}\n" for k in range(5, -2, -1))
    for week in (1, 2):
        (tmp_path / f"week {week}").mkdir()
        (tmp_path / f"week {week}" / "A1.csv").write_text(f"f;Z';Z''\n{10.0**6};{week};-1\n{rows}")
    assert watch.settled() == ()
    clock.now = 5.0
    new = watch.settled()
    assert [path.relative_to(tmp_path).as_posix() for path in new] == [
        "week 1/A1.csv", "week 2/A1.csv"
    ]  # fmt: skip
    # Two files of one name stay two, and the folder's name may be the time.
    pattern = NamePattern.marked("week {time:1}/{panel:A1}.csv", "week")
    run = propose_files(new, below=tmp_path, told=Told(pattern=pattern))
    assert [(r.source.file, r.panel, r.exposure_h) for r in run.found.readings] == [
        ("week 1/A1.csv", "A1", 168.0), ("week 2/A1.csv", "A1", 336.0)
    ]  # fmt: skip
