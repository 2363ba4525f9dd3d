"""Starting the window."""

from __future__ import annotations

import sys
from pathlib import Path

import pyqtgraph as pg
from PySide6.QtCore import QSettings
from PySide6.QtWidgets import QApplication

from coatgui.window import palette
from coatgui.window.main_window import MainWindow
from coatgui.window.unforeseen import watch, watch_for_fatal_errors


def run(target: Path | None = None) -> int:
    """Open the window on a campaign file or a folder, or on the welcome page; returns when it is
    closed."""
    existing = QApplication.instance()
    application = existing if isinstance(existing, QApplication) else QApplication(sys.argv[:1])
    application.setApplicationName("coatgui")
    application.setOrganizationName("coatgui")
    pg.setConfigOptions(antialias=True)
    settings = QSettings(
        QSettings.Format.IniFormat, QSettings.Scope.UserScope, "coatgui", "coatgui"
    )
    chosen = settings.value("dark")
    dark = palette.system_is_dark() if chosen is None else str(chosen).lower() == "true"
    palette.apply(application, palette.colours(dark))
    window = MainWindow(settings, dark)
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
