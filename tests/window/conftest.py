"""One application for all window tests, drawn off the screen."""

from __future__ import annotations

import os
import shutil
import threading
import time
from collections.abc import Callable, Iterator
from pathlib import Path

import pytest

os.environ.setdefault("QT_QPA_PLATFORM", "offscreen")
pytest.importorskip("PySide6")

from PySide6.QtCore import QEvent, QSettings
from PySide6.QtWidgets import QApplication, QFrame, QMenu

from coatgui.assessment import assess
from coatgui.campaign import CampaignFile, campaign_from_found
from coatgui.intake import read_folder
from coatgui.jobs import spread_over_processes
from coatgui.shipped import sample_panels
from coatgui.window import palette
from coatgui.window.main_window import MainWindow


@pytest.fixture(scope="session")
def application() -> QApplication:
    existing = QApplication.instance()
    app = existing if isinstance(existing, QApplication) else QApplication([])
    palette.apply(app, palette.colours(False))
    return app


Wait = Callable[[Callable[[], bool]], None]


@pytest.fixture
def wait(application: QApplication) -> Wait:
    def until(there: Callable[[], bool]) -> None:
        end = time.monotonic() + 90.0
        while not there():
            application.processEvents()
            time.sleep(0.005)
            assert time.monotonic() < end, "waited too long"
        application.processEvents()

    return until


@pytest.fixture(autouse=True)
def data_folder(tmp_path_factory: pytest.TempPathFactory, monkeypatch: pytest.MonkeyPatch) -> Path:
    """Reports, the log and notes on sessions of a test go to a folder of its own."""
    folder = tmp_path_factory.mktemp("data")
    monkeypatch.setenv("COATGUI_DATA", str(folder))
    return folder


@pytest.fixture
def window(application: QApplication, tmp_path: Path) -> Iterator[MainWindow]:
    before = threading.active_count()
    settings = QSettings(str(tmp_path / "window.ini"), QSettings.Format.IniFormat)
    made = MainWindow(settings, False)
    made.show()
    yield made
    made.desk.close()
    made.keeping.close()
    made.hide()
    made.deleteLater()
    # Nothing may be left behind: no thread, no running timer, no widget.
    QApplication.sendPostedEvents(None, QEvent.Type.DeferredDelete.value)
    application.processEvents()
    left = [w for w in application.topLevelWidgets() if not isinstance(w, (QMenu, QFrame))]
    assert not left, left
    end = time.monotonic() + 10.0
    while threading.active_count() > before and time.monotonic() < end:
        time.sleep(0.01)
    assert threading.active_count() <= before


@pytest.fixture
def small(tmp_path: Path) -> Path:
    """Two panels of the sample with seven inspections each: quick, and still a campaign."""
    folder = tmp_path / "two panels"
    folder.mkdir()
    for name in ("panels.csv", "open_lead.csv"):
        shutil.copy(sample_panels() / name, folder)
    for hours in (1, 3, 8, 24, 168, 336, 672):
        shutil.copy(sample_panels() / f"P1_{hours}h.dat", folder)
        shutil.copy(sample_panels() / f"P2_{hours}h.dat", folder)
    # Only these panels, so that the others do not stand there without readings.
    lines = (folder / "panels.csv").read_text(encoding="utf-8").splitlines()
    kept = [line for line in lines if line.startswith(("panel,", "P1,", "P2,"))]
    (folder / "panels.csv").write_text("\n".join(kept) + "\n", encoding="utf-8")
    (folder / "remark.txt").write_text("not a spectrum\n", encoding="utf-8")
    return folder


@pytest.fixture(scope="session")
def judged_sample(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """The sample as a campaign file that keeps its fits, so that they are computed only once."""
    path = tmp_path_factory.mktemp("sample") / "sample_panels.coatgui"
    found = read_folder(sample_panels())
    campaign = campaign_from_found(found, "sample_panels")
    with CampaignFile.create(path, campaign, found.raw) as file, spread_over_processes() as spread:
        assess(campaign, spread=spread, cache=file)
    return path


@pytest.fixture
def sample(window: MainWindow, wait: Wait, judged_sample: Path, tmp_path: Path) -> MainWindow:
    """The window with the sample, judged."""
    own = tmp_path / judged_sample.name
    shutil.copy(judged_sample, own)
    window.desk.open(own)
    wait(lambda: window.desk.job is None and window.desk.assessment is not None)
    return window
