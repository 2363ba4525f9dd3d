"""How the tests work the window as a person does: by menus, buttons, dialogues, points and keys."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path
from typing import Any

from PySide6.QtCore import QPoint, Qt, QTimer
from PySide6.QtGui import QAction
from PySide6.QtTest import QTest
from PySide6.QtWidgets import QApplication, QDialog, QFileDialog, QLineEdit, QMenu, QMessageBox

from coatgui.window.main_window import MainWindow

LEFT = Qt.MouseButton.LeftButton


def settled(window: MainWindow) -> Callable[[], bool]:
    return lambda: window.desk.job is None and window.desk.assessment is not None


def action(window: MainWindow, name: str) -> QAction:
    return next(a for _, a in window._actions if a.text().startswith(name))


def shortcut(
    window: MainWindow,
    key: Qt.Key,
    modifier: Qt.KeyboardModifier = Qt.KeyboardModifier.NoModifier,
) -> None:
    """Press the keys of a shortcut; off the screen nothing makes the window active again when a
    dialogue goes, as a desktop does."""
    window.activateWindow()
    assert QTest.qWaitForWindowActive(window)
    QTest.keyClick(window, key, modifier)


def choose(window: MainWindow, menu: str, name: str) -> None:
    """Open a menu with the mouse and choose an entry with the mouse."""
    bar = window.menuBar()
    top = next(a for a in bar.actions() if a.text() == f"&{menu}")
    QTest.mouseClick(bar, LEFT, pos=bar.actionGeometry(top).center())
    shown = QApplication.activePopupWidget()
    assert isinstance(shown, QMenu)
    entry = next(a for a in shown.actions() if a.text().startswith(name))
    assert entry.isEnabled(), name
    QTest.mouseClick(shown, LEFT, pos=shown.actionGeometry(entry).center())


def meanwhile(do: Callable[[Any], None]) -> list[BaseException]:
    """When the next dialogue stands, do something with it; what goes wrong is kept, since nothing
    can be raised through the dialogue's own loop."""
    troubles: list[BaseException] = []

    def act() -> None:
        dialog = QApplication.activeModalWidget()
        if dialog is None:
            QTimer.singleShot(20, act)
            return
        try:
            do(dialog)
        except BaseException as trouble:
            troubles.append(trouble)
            assert isinstance(dialog, QDialog)
            dialog.reject()

    QTimer.singleShot(0, act)
    return troubles


def name_it(path: Path) -> Callable[[Any], None]:
    def act(dialog: Any) -> None:
        assert isinstance(dialog, QFileDialog)
        edit = next(e for e in dialog.findChildren(QLineEdit) if e.objectName() == "fileNameEdit")
        edit.selectAll()
        # Pasted whole: half a path would make the dialogue go to other folders meanwhile.
        QApplication.clipboard().setText(str(path))
        QTest.keyClick(edit, Qt.Key.Key_V, Qt.KeyboardModifier.ControlModifier)
        QTest.keyClick(edit, Qt.Key.Key_Return)
        if dialog.isVisible():  # the completer took the first return
            QTest.keyClick(edit, Qt.Key.Key_Return)

    return act


def press(text: str) -> Callable[[Any], None]:
    def act(dialog: Any) -> None:
        assert isinstance(dialog, QMessageBox)
        button = next(b for b in dialog.buttons() if b.text() == text)
        QTest.mouseClick(button, LEFT)

    return act


def pick_cell(window: MainWindow, panel: str, hours: float) -> None:
    cells = window.places[0].cells  # type: ignore[attr-defined]
    row = cells.rows.index(("panel", panel))
    area = cells._rect(row, cells.times.index(hours), cells._tops())
    QTest.mouseClick(cells, LEFT, pos=area.center())


def click_point(window: MainWindow, place: int) -> None:
    """Click a measured point in the plot of the phase."""
    plots = window.places[1].plots  # type: ignore[attr-defined]
    QApplication.processEvents()
    x, y = plots._on_screen(plots.phase)[place]
    QTest.mouseClick(plots.phase.viewport(), LEFT, pos=QPoint(round(x), round(y)))


def go(window: MainWindow, noun: str) -> None:
    button = next(b for b in window.buttons.buttons() if b.text().startswith(noun))
    QTest.mouseClick(button, LEFT)
