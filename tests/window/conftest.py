"""One application for all window tests, drawn off the screen."""

from __future__ import annotations

import os
import threading
import time
from collections.abc import Callable, Iterator
from pathlib import Path

import pytest

os.environ.setdefault("QT_QPA_PLATFORM", "offscreen")
pytest.importorskip("PySide6")

from PySide6.QtCore import QSettings
from PySide6.QtWidgets import QApplication

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


@pytest.fixture
def window(application: QApplication, tmp_path: Path) -> Iterator[MainWindow]:
    before = threading.active_count()
    settings = QSettings(str(tmp_path / "window.ini"), QSettings.Format.IniFormat)
    made = MainWindow(settings, False)
    made.show()
    yield made
    made.desk.close()
    made.hide()
    made.deleteLater()
    application.processEvents()
    end = time.monotonic() + 10.0
    while threading.active_count() > before and time.monotonic() < end:
        time.sleep(0.01)
    assert threading.active_count() <= before
