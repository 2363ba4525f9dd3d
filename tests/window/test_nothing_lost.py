"""What the window does so that nothing is lost: one writer, damage, disks,
copies, crashes."""

from __future__ import annotations

import json
import logging
import signal
import sqlite3
import subprocess
import sys
import time
from collections.abc import Callable, Iterator
from contextlib import closing
from pathlib import Path

import pytest

pytest.importorskip("PySide6")

from PySide6.QtCore import QSettings, Qt, QTimer
from PySide6.QtTest import QTest
from PySide6.QtWidgets import QApplication, QPushButton

from coatgui.campaign import CampaignFile, check_file, operations
from coatgui.campaign.copies import copies_of, folder_beside
from coatgui.campaign.session import unfinished_sessions
from coatgui.window import file_actions, unforeseen
from coatgui.window.main_window import MainWindow

Wait = Callable[[Callable[[], bool]], None]


def settled(window: MainWindow) -> Callable[[], bool]:
    return lambda: window.desk.job is None and window.desk.file is not None


def press(button: QPushButton) -> None:
    assert button.isVisible()
    QTest.mouseClick(button, Qt.MouseButton.LeftButton)


def press_way(window: MainWindow, text: str) -> None:
    notices = (window.keeping.standing, window.keeping.offer)
    press(next(b for n in notices for b in n.ways if b.text().startswith(text)))


def file_of(window: MainWindow) -> CampaignFile:
    assert window.desk.file is not None
    return window.desk.file


def rename(window: MainWindow, title: str) -> None:
    window.desk.edit(operations.rename_campaign, title)


@pytest.fixture
def named(monkeypatch: pytest.MonkeyPatch, tmp_path: Path) -> Path:
    """What every dialogue for a file's name is answered with."""
    path = tmp_path / "elsewhere" / "kept elsewhere.coatgui"
    path.parent.mkdir()
    monkeypatch.setattr(file_actions, "file_to_write", lambda *_: path)
    return path


# --- one writer ------------------------------------------------------------------------------


def test_a_file_in_use_is_read_only_and_says_who_has_it(
    window: MainWindow, wait: Wait, judged_sample: Path, tmp_path: Path
) -> None:
    path = tmp_path / "shared 🎨.coatgui"
    path.write_bytes(judged_sample.read_bytes())
    with CampaignFile.open(path) as writer:
        window.open_path(path)
        wait(settled(window))
        holder = file_of(window).holder
        assert holder is not None
        line = window.keeping.standing
        assert line.isVisible()
        assert str(holder) in line.words.text()
        assert window.status.kept.text() == f"{path.name}: read only"
        title = file_of(window).campaign.title
        rename(window, "Not to be")
        assert file_of(window).campaign.title == title
        assert window.trouble.isVisible()
        assert f"open for writing by {holder}" in window.trouble.words.text()
        assert QApplication.activeModalWidget() is None
        # What the writer does shows, and can be followed.
        writer.apply(operations.rename_campaign(writer.campaign, "Renamed there"))
        window.keeping.look()
        assert "was changed by somebody else" in line.words.text()
    press_way(window, "Open again")
    wait(settled(window))
    assert file_of(window).campaign.title == "Renamed there"
    assert file_of(window).read_only_because == ""
    assert not line.isVisible()
    assert not window.status.kept.text().endswith("read only")


def test_a_copy_of_what_can_only_be_read_can_be_changed(
    window: MainWindow, wait: Wait, judged_sample: Path, tmp_path: Path, named: Path
) -> None:
    path = tmp_path / "shared.coatgui"
    path.write_bytes(judged_sample.read_bytes())
    with CampaignFile.open(path):
        window.open_path(path)
        wait(settled(window))
        press_way(window, "Save a copy…")
        wait(settled(window))
        assert file_of(window).path == named
        rename(window, "My own")
        assert file_of(window).campaign.title == "My own"


def test_a_change_by_somebody_else_is_told(sample: MainWindow, wait: Wait) -> None:
    path = file_of(sample).path
    code = (
        "import sqlite3, sys; c = sqlite3.connect(sys.argv[1]);"
        "c.execute(\"INSERT INTO history SELECT entry_id + 1, 'edit', NULL, 'x', who, when_utc,"
        " '[]', '', state, chain FROM history ORDER BY entry_id DESC LIMIT 1\"); c.commit()"
    )
    subprocess.run([sys.executable, "-c", code, str(path)], check=True)
    sample.keeping.look()
    assert "was changed by somebody else" in sample.keeping.standing.words.text()
    assert [b.text() for b in sample.keeping.standing.ways] == ["Open again"]


# --- damage ----------------------------------------------------------------------------------


def test_a_damaged_file_is_recovered_and_what_is_lost_is_shown(
    window: MainWindow, wait: Wait, judged_sample: Path, tmp_path: Path, named: Path
) -> None:
    path = tmp_path / "damaged.coatgui"
    content = bytearray(judged_sample.read_bytes())
    with closing(sqlite3.connect(judged_sample)) as connection:
        (numbers,) = connection.execute("SELECT real_ohm FROM spectra LIMIT 1").fetchone()
    at = content.index(numbers[:30].encode()) + 2
    content[at] = ord("7") if content[at] != ord("7") else ord("8")  # a digit of a spectrum
    path.write_bytes(content)
    window.open_path(path)
    wait(lambda: window.desk.job is None and window.keeping.offer.isVisible())
    assert window.desk.file is None
    assert f"{path.name} is damaged" in window.keeping.offer.words.text()
    press_way(window, "Recover what can be read…")
    wait(lambda: settled(window)() and window.keeping.offer.isVisible())
    offer = window.keeping.offer
    assert offer.words.text().startswith("Recovered ")
    lost = [offer.particulars.item(i).text() for i in range(offer.particulars.count())]
    assert any("history" in sentence for sentence in lost)
    assert offer.particulars.isVisible()
    assert file_of(window).path == named
    assert not check_file(named)
    assert path.read_bytes() == bytes(content)  # as it was
    readings = len(file_of(window).campaign.readings)
    assert f"Recovered {readings} readings" in offer.words.text()
    press_way(window, "Read ")
    wait(lambda: not window.incoming.busy)
    assert window.incoming.is_there


def test_the_newest_copy_of_a_damaged_file_is_offered(sample: MainWindow, wait: Wait) -> None:
    rename(sample, "With a copy")
    path = file_of(sample).path
    sample.files.close_campaign()
    assert len(copies_of(path)) == 1
    content = bytearray(path.read_bytes())
    content[3000:5000] = bytes(2000)
    path.write_bytes(content)
    sample.open_path(path)
    wait(lambda: sample.desk.job is None and sample.keeping.offer.isVisible())
    press_way(sample, "Open the copy of")
    wait(settled(sample))
    assert file_of(sample).campaign.title == "With a copy"
    assert file_of(sample).path.parent == folder_beside(path)


# --- disks that fail -------------------------------------------------------------------------


def test_a_full_disk_is_said_and_save_elsewhere_is_offered(
    sample: MainWindow, wait: Wait, named: Path
) -> None:
    rename(sample, "Before it was full")
    wait(settled(sample))
    file = file_of(sample)
    pages = file._connection.execute("PRAGMA page_count").fetchone()[0]
    file._connection.execute(f"PRAGMA max_page_count = {pages}")
    campaign = file.campaign
    for _ in range(50):
        sample.desk.edit(operations.edit_campaign_remark, "long " * 3000 + str(time.monotonic()))
        if sample.trouble.isVisible():
            break
    assert "full" in sample.trouble.words.text()
    assert QApplication.activeModalWidget() is None
    assert sample.desk.campaign is not None
    assert sample.desk.campaign.title == campaign.title
    held = sample.desk.campaign
    press(sample.trouble.elsewhere)
    wait(lambda: settled(sample)() and file_of(sample).path == named)
    assert file_of(sample).campaign == held
    assert not check_file(named)
    rename(sample, "Goes on elsewhere")
    assert file_of(sample).campaign.title == "Goes on elsewhere"
    sample.trouble.say("Something else")
    assert not sample.trouble.elsewhere.isVisible()


def test_a_file_that_vanishes_loses_no_more_than_the_edit_at_hand(
    sample: MainWindow, wait: Wait, named: Path
) -> None:
    rename(sample, "Before it went")
    wait(settled(sample))
    file_of(sample).path.rename(named.with_name("taken away"))
    sample.keeping.look()
    assert "no longer in its place" in sample.keeping.standing.words.text()
    rename(sample, "The edit at hand")
    assert sample.trouble.elsewhere.isVisible()
    assert file_of(sample).campaign.title == "Before it went"
    press_way(sample, "Save elsewhere…")
    wait(lambda: settled(sample)() and file_of(sample).path == named)
    assert file_of(sample).campaign.title == "Before it went"
    assert file_of(sample).undo_name == "Rename the campaign to Before it went"


# --- copies ----------------------------------------------------------------------------------


def test_copies_are_made_by_the_clock_and_at_closing(sample: MainWindow, wait: Wait) -> None:
    path = file_of(sample).path
    keeping = sample.keeping
    assert keeping._clock.isActive()
    keeping._clock.timeout.emit()
    assert keeping._copying is None  # nothing was edited
    rename(sample, "One")
    keeping._clock.timeout.emit()
    wait(lambda: keeping._copying is None)
    (first,) = copies_of(path)
    keeping._clock.timeout.emit()
    assert keeping._copying is None
    wait(lambda: time.time() - first[0].timestamp() > 1.1)  # named by the second
    rename(sample, "Two")
    sample.files.close_campaign()
    assert not keeping._clock.isActive()
    copies = [copy for _, copy in copies_of(path)]
    assert len(copies) == 2
    titles = []
    for copy in copies:
        assert not check_file(copy)
        with CampaignFile.open(copy) as file:
            titles.append(file.campaign.title)
    assert titles == ["Two", "One"]


def test_copies_go_to_a_chosen_folder(
    sample: MainWindow, wait: Wait, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    folder = tmp_path / "Kopien ü"
    monkeypatch.setattr(sample.files, "ask_folder", lambda _title: folder)
    sample.keeping.choose_copies_folder()
    rename(sample, "One")
    sample.keeping.copy_now()
    wait(lambda: sample.keeping._copying is None)
    path = file_of(sample).path
    assert len(copies_of(path, folder)) == 1
    assert not folder_beside(path).exists()
    # Where it cannot be written, that is said, and the work goes on.
    said: list[str] = []
    sample.desk.told.connect(said.append)
    sample.settings.setValue("copies", str(path))  # a file, not a folder
    rename(sample, "Two")
    sample.keeping.copy_now()
    wait(lambda: sample.keeping._copying is None)
    assert any(text.startswith("No copy of the campaign could be made") for text in said)
    sample.keeping.copies_beside()
    assert sample.keeping.copies_folder() is None


# --- errors that should not happen -----------------------------------------------------------


@pytest.fixture
def watched(window: MainWindow, data_folder: Path) -> Iterator[Path]:
    end = unforeseen.watch(window.trouble.say)
    yield data_folder
    end()
    for handler in list(logging.getLogger("coatgui").handlers):
        logging.getLogger("coatgui").removeHandler(handler)
        handler.close()


def test_an_unforeseen_error_writes_a_report_and_the_window_goes_on(
    watched: Path, sample: MainWindow, wait: Wait
) -> None:
    rename(sample, "A secret title")

    def fail() -> None:
        raise RuntimeError("panel A1 had 4711 ohm")

    QTimer.singleShot(0, fail)
    wait(sample.trouble.isVisible)
    (report,) = (watched / "reports").glob("crash *.json")
    assert str(report) in sample.trouble.words.text()
    text = report.read_text(encoding="utf-8")
    told = json.loads(text)
    assert told["error"][0]["kind"] == "RuntimeError"
    assert told["last_operations"][-1].endswith("rename_campaign campaign")
    assert any(line.endswith(" open") for line in told["last_operations"])
    for private in ("4711", "secret", "A1", "sample_panels"):
        assert private not in text
    log = (watched / "log.txt").read_text(encoding="utf-8")
    assert "rename_campaign campaign" in log
    assert "secret" not in log
    rename(sample, "It goes on")
    assert file_of(sample).campaign.title == "It goes on"


def test_so_does_one_in_the_background(
    watched: Path, sample: MainWindow, wait: Wait, monkeypatch: pytest.MonkeyPatch, tmp_path: Path
) -> None:
    from coatgui import output

    def fail(*_: object) -> None:
        raise ZeroDivisionError("4711 ohm")

    wait(settled(sample))
    monkeypatch.setattr(output, "write_workbook", fail)
    sample.desk.export(tmp_path / "w.xlsx")
    wait(lambda: sample.desk.job is None)
    assert "ZeroDivisionError" in sample.trouble.words.text()
    assert "4711" not in sample.trouble.words.text()
    assert len(list((watched / "reports").glob("crash *.json"))) == 1


# --- sessions --------------------------------------------------------------------------------

_SESSION = """
import sys, time
from pathlib import Path
from PySide6.QtCore import QSettings
from PySide6.QtWidgets import QApplication
from coatgui.campaign import operations
from coatgui.window.main_window import MainWindow
app = QApplication([])
window = MainWindow(QSettings(sys.argv[2], QSettings.Format.IniFormat), False)
window.show()
window.desk.open(Path(sys.argv[1]))
def until(there):
    while not there():
        app.processEvents()
        time.sleep(0.005)
until(lambda: window.desk.job is None and window.desk.assessment is not None)
window.desk.edit(operations.rename_campaign, "Edited before the crash")
window.go_to("Course")
readings = window.desk.campaign.readings
window.desk.select(readings[-1].reading_id)
until(lambda: not window.keeping._note.isActive())
print(readings[-1].reading_id, flush=True)
until(lambda: False)
"""


def killed(source: Path, folder: Path) -> str:
    """Work on a campaign in another process and kill it; returns the reading it stood at."""
    command = [sys.executable, "-c", _SESSION, str(source), str(folder / "other.ini")]
    process = subprocess.Popen(command, stdout=subprocess.PIPE, text=True)
    assert process.stdout is not None
    reading = process.stdout.readline().strip()
    process.send_signal(signal.SIGKILL)
    process.wait()
    process.stdout.close()
    assert reading
    return reading


@pytest.mark.skipif(sys.platform == "win32", reason="there is no SIGKILL")
@pytest.mark.parametrize("is_unsaved", [False, True])
def test_a_session_that_a_crash_ended_can_be_gone_on_with(
    window: MainWindow, wait: Wait, judged_sample: Path, small: Path, tmp_path: Path,
    is_unsaved: bool,
) -> None:  # fmt: skip
    path = tmp_path / "crashed.coatgui"
    path.write_bytes(judged_sample.read_bytes())
    (small / "remark.txt").unlink()
    reading = killed(small if is_unsaved else path, tmp_path)
    window.keeping.offer_unfinished()
    line = window.keeping.offer
    assert "was not closed in order" in line.words.text()
    assert ("was never saved" in line.words.text()) == is_unsaved
    press_way(window, "Go on where it stopped")
    wait(lambda: settled(window)() and window.desk.assessment is not None)
    assert file_of(window).campaign.title == "Edited before the crash"
    assert window.desk.selection == reading
    assert window.open_place().noun == "Course"
    assert window.desk.is_saved != is_unsaved
    assert not unfinished_sessions()
    if is_unsaved:
        assert window.status.kept.text() == "not saved yet"
        folder = file_of(window).path.parent
        window.desk.close()
        assert not folder.exists()


@pytest.mark.skipif(sys.platform == "win32", reason="there is no SIGKILL")
def test_it_need_not_be(window: MainWindow, judged_sample: Path, tmp_path: Path) -> None:
    path = tmp_path / "crashed.coatgui"
    path.write_bytes(judged_sample.read_bytes())
    killed(path, tmp_path)
    window.keeping.offer_unfinished()
    press(window.keeping.offer.dismiss)
    assert not window.keeping.offer.isVisible()
    assert not unfinished_sessions()
    window.keeping.offer_unfinished()
    assert not window.keeping.offer.isVisible()


def test_a_session_closed_in_order_leaves_nothing(sample: MainWindow, data_folder: Path) -> None:
    sample.keeping.note_session()
    assert list((data_folder / "sessions").glob("*.session"))
    sample.close()
    assert not list((data_folder / "sessions").glob("*.session"))


def test_a_campaign_opens_where_it_was_left(
    sample: MainWindow, wait: Wait, judged_sample: Path
) -> None:
    path = file_of(sample).path
    reading = file_of(sample).campaign.readings[-1].reading_id
    sample.desk.select(reading)
    sample.go_to("Water")
    sample.files.close_campaign()
    sample.go_to("Map")
    sample.open_path(path)
    wait(settled(sample))
    assert sample.desk.selection == reading
    assert sample.open_place().noun == "Water"


def test_the_window_has_the_size_it_had(window: MainWindow, application: QApplication) -> None:
    window.resize(window.width(), 693)
    window.close()
    again = MainWindow(QSettings(window.settings.fileName(), QSettings.Format.IniFormat), False)
    height = again.height()
    again.keeping.close()
    again.deleteLater()
    assert height == 693
