"""Crash reports, the log, and what the next start knows of a session that was cut off."""

import json
import logging
import os
import signal
import subprocess
import sys
from pathlib import Path

import pytest

from coatgui.campaign import CampaignFile, crash_report, operations, session, user_data
from coatgui.campaign.session import Session, unfinished_sessions


@pytest.fixture(autouse=True)
def _no_handlers_left() -> object:
    yield
    log = logging.getLogger("coatgui")
    for handler in list(log.handlers):
        log.removeHandler(handler)
        handler.close()


def test_a_report_tells_the_place_and_no_data(file: CampaignFile, tmp_path: Path) -> None:
    change = file.apply(operations.edit_panel(file.campaign, "p1", remark="secret 4711"))
    crash_report.note_operation("edit", change)
    try:
        try:
            float("secret 4711")
        except ValueError as problem:
            raise KeyError("secret 4712") from problem
    except KeyError as problem:
        report = crash_report.write_crash_report(problem, tmp_path / "reports")
    assert report is not None
    text = report.read_text(encoding="utf-8")
    told = json.loads(text)
    assert [one["kind"] for one in told["error"]] == ["KeyError", "ValueError"]
    assert "in test_a_report_tells_the_place" in told["error"][0]["places"][0]
    assert told["last_operations"][-1].endswith("edit panels")
    assert {"coatgui", "python", "sqlite", "system", "when_utc"} <= told.keys()
    for private in ("secret", "4711", "A1", str(Path.home())):
        assert private not in text


def test_old_reports_go(tmp_path: Path) -> None:
    for _ in range(25):
        assert crash_report.write_crash_report(ValueError(), tmp_path)
    assert len(list(tmp_path.iterdir())) == 20


def test_a_report_that_cannot_be_written_is_no_second_crash(tmp_path: Path) -> None:
    (tmp_path / "file").write_text("x", encoding="utf-8")
    assert crash_report.write_crash_report(ValueError(), tmp_path / "file") is None
    assert crash_report.start_log(tmp_path / "file") is None


def test_the_log_is_written_and_limited(tmp_path: Path) -> None:
    path = crash_report.start_log(tmp_path)
    assert path is not None
    for _ in range(30_000):
        crash_report.note_operation("open")
    assert "open" in path.read_text(encoding="utf-8")
    assert sum(p.stat().st_size for p in tmp_path.iterdir()) < 1_600_000


@pytest.mark.parametrize(
    ("system", "variables", "wanted"),
    [
        ("linux", {"XDG_DATA_HOME": "/data"}, "/data/coatgui"),
        ("linux", {"XDG_DATA_HOME": "relative"}, "/home/x/.local/share/coatgui"),
        ("linux", {}, "/home/x/.local/share/coatgui"),
        ("darwin", {}, "/home/x/Library/Application Support/coatgui"),
        ("win32", {"LOCALAPPDATA": "/c/local"}, "/c/local/coatgui"),
        ("win32", {}, "/home/x/AppData/Local/coatgui"),
        ("linux", {"COATGUI_DATA": "/elsewhere"}, "/elsewhere"),
    ],
)
def test_the_folder_is_the_systems(
    system: str, variables: dict[str, str], wanted: str, monkeypatch: pytest.MonkeyPatch
) -> None:
    for name in ("COATGUI_DATA", "XDG_DATA_HOME", "LOCALAPPDATA"):
        monkeypatch.delenv(name, raising=False)
    for name, value in variables.items():
        monkeypatch.setenv(name, value)
    monkeypatch.setattr(user_data.sys, "platform", system)
    monkeypatch.setattr(Path, "home", lambda: Path("/home/x"))
    assert user_data.user_data_folder() == Path(wanted)


_KILLED = """
import sys, time
from pathlib import Path
from coatgui.campaign.session import Session
one = Session(Path(sys.argv[1]))
one.note(Path(sys.argv[2]), is_unsaved=True, reading_id="r2", place="spectra")
print("noted", flush=True)
time.sleep(60)
"""


def test_a_session_that_was_killed_is_offered_once(file: CampaignFile, tmp_path: Path) -> None:
    folder = tmp_path / "sessions"
    with subprocess.Popen(
        [sys.executable, "-c", _KILLED, str(folder), str(file.path)],
        stdout=subprocess.PIPE,
        env={**os.environ, "PYTHONPATH": os.pathsep.join(sys.path)},
    ) as running:
        assert running.stdout is not None
        assert running.stdout.readline()
        assert unfinished_sessions(folder) == ()  # it is still open
        running.send_signal(signal.SIGKILL)
    (left,) = unfinished_sessions(folder)
    assert left.campaign == file.path
    assert (left.is_unsaved, left.reading_id, left.place) == (True, "r2", "spectra")
    left.forget()
    assert unfinished_sessions(folder) == ()
    assert list(folder.iterdir()) == []


def test_a_session_that_ends_in_order_leaves_nothing(file: CampaignFile, tmp_path: Path) -> None:
    one = Session(tmp_path / "sessions")
    one.note(file.path)
    assert unfinished_sessions(tmp_path / "sessions") == ()
    one.note(None)
    one.note(file.path)
    one.end()
    assert list((tmp_path / "sessions").iterdir()) == []


def test_a_note_that_is_none_or_whose_campaign_is_gone_is_dropped(tmp_path: Path) -> None:
    (tmp_path / "a.session").write_text("nonsense", encoding="utf-8")
    gone = {"campaign": str(tmp_path / "gone"), "is_unsaved": 0, "reading_id": "", "place": ""}
    (tmp_path / "b.session").write_text(json.dumps({**gone, "since_utc": ""}), encoding="utf-8")
    assert unfinished_sessions(tmp_path) == ()
    assert list(tmp_path.iterdir()) == []
    assert session.unfinished_sessions(tmp_path / "absent") == ()
