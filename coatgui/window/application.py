"""Starting the window."""

from __future__ import annotations

import sys
from pathlib import Path

import pyqtgraph as pg
from PySide6.QtCore import QEvent, QObject, QSettings
from PySide6.QtGui import QFileOpenEvent, QIcon
from PySide6.QtWidgets import QApplication

from coatgui.shipped import resource
from coatgui.window import palette
from coatgui.window.main_window import MainWindow
from coatgui.window.unforeseen import watch, watch_for_fatal_errors


class OpenedFromOutside(QObject):
    """macOS hands a file that was opened on the desktop to the running program as an event."""

    def __init__(self, window: MainWindow) -> None:
        super().__init__(window)
        self.window = window

    def eventFilter(self, watched: QObject, event: QEvent) -> bool:
        if isinstance(event, QFileOpenEvent) and event.file():
            self.window.open_path(Path(event.file()))
            return True
        return super().eventFilter(watched, event)


def run(target: Path | None = None) -> int:
    """Open the window on a campaign file or a folder, or on the welcome page; returns when it is
    closed."""
    existing = QApplication.instance()
    application = existing if isinstance(existing, QApplication) else QApplication(sys.argv[:1])
    application.setApplicationName("coatgui")
    application.setOrganizationName("coatgui")
    application.setDesktopFileName("coatgui")
    application.setWindowIcon(QIcon(str(resource("icons", "coatgui.svg"))))
    pg.setConfigOptions(antialias=True)
    settings = QSettings(
        QSettings.Format.IniFormat, QSettings.Scope.UserScope, "coatgui", "coatgui"
    )
    chosen = settings.value("dark")
    dark = palette.system_is_dark() if chosen is None else str(chosen).lower() == "true"
    palette.apply(application, palette.colours(dark))
    window = MainWindow(settings, dark)
    application.installEventFilter(OpenedFromOutside(window))
    stop_watching = watch(window.trouble.say)
    watch_for_fatal_errors()
    window.show()
    window.keeping.offer_unfinished()
    if target is not None:
        window.desk.open(target)
    try:
        return int(application.exec())
    finally:
        stop_watching()
