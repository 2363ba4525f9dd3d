"""Files are written whole or not at all, and can be read by those who should."""

from __future__ import annotations

import os
import stat
from collections.abc import Callable
from pathlib import Path
from typing import IO

import pytest

from coatgui.output import write_json, write_whole, write_workbook
from coatgui.records import Assessment, Campaign


def content(file: IO[bytes]) -> None:
    file.write(b"new")


def mode_of(path: Path) -> int:
    return stat.S_IMODE(path.stat().st_mode)


def test_a_file_takes_the_place_of_the_former(tmp_path: Path) -> None:
    target = tmp_path / "x.txt"
    target.write_bytes(b"a former one, longer")
    write_whole(target, content)
    assert target.read_bytes() == b"new"
    assert [p.name for p in tmp_path.iterdir()] == ["x.txt"]


@pytest.mark.parametrize("error", [OSError("full"), KeyboardInterrupt(), ValueError("no")])
def test_whatever_goes_wrong_leaves_nothing_behind(tmp_path: Path, error: BaseException) -> None:
    def fail(file: IO[bytes]) -> None:
        file.write(b"half")
        raise error

    with pytest.raises(type(error)):
        write_whole(tmp_path / "x.txt", fail)
    assert list(tmp_path.iterdir()) == []


def test_a_file_that_cannot_be_put_in_place_leaves_nothing(tmp_path: Path) -> None:
    (tmp_path / "taken").mkdir()
    with pytest.raises(OSError, match="taken"):
        write_whole(tmp_path / "taken", content)
    assert [p.name for p in tmp_path.iterdir()] == ["taken"]
    with pytest.raises(FileNotFoundError):
        write_whole(tmp_path / "no such folder" / "x.txt", content)


@pytest.mark.skipif(os.name == "nt", reason="Windows keeps no such modes")
def test_who_may_read_is_kept(tmp_path: Path) -> None:
    plain, new, own = tmp_path / "plain", tmp_path / "new", tmp_path / "own"
    plain.write_bytes(b"")
    write_whole(new, content)
    assert mode_of(new) == mode_of(plain)
    own.write_bytes(b"")
    own.chmod(0o640)
    write_whole(own, content)
    assert mode_of(own) == 0o640


def test_a_name_may_be_as_long_as_the_system_allows(tmp_path: Path) -> None:
    target = tmp_path / ("n" * 200)
    write_whole(target, content)
    assert target.read_bytes() == b"new"


@pytest.mark.parametrize(
    "write",
    [
        lambda a, c, path: write_json(a, path),
        lambda a, c, path: write_workbook(a, c, path),
    ],
)
def test_outputs_leave_the_former_file_when_the_disk_fails(
    write: Callable[[Assessment, Campaign, Path], None],
    assessment: Assessment,
    campaign: Campaign,
    tmp_path: Path,
    monkeypatch: pytest.MonkeyPatch,
) -> None:
    target = tmp_path / "out"
    target.write_bytes(b"former")

    def full(_: int) -> None:
        raise OSError(28, "No space left on device")

    monkeypatch.setattr("coatgui.output.whole.os.fsync", full)
    with pytest.raises(OSError, match="No space"):
        write(assessment, campaign, target)
    assert target.read_bytes() == b"former"
    assert [p.name for p in tmp_path.iterdir()] == ["out"]
