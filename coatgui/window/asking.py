"""The few questions that need an answer before the work can go on."""

from __future__ import annotations

from enum import Enum
from pathlib import Path

from PySide6.QtCore import Qt
from PySide6.QtWidgets import QFileDialog, QMessageBox, QWidget


class Leave(Enum):
    """What shall happen to a campaign that was edited and never saved."""

    SAVE = "Save as…"
    LOSE = "Close without saving"
    STAY = "Go back"


def file_to_write(parent: QWidget, title: str, kinds: str, suggested: Path) -> Path | None:
    """The name of a file to write, with the suggestion's ending where it has none that is among the
    `kinds`; asks before overwriting one."""
    dialog = QFileDialog(parent, title, str(suggested.parent), kinds)
    dialog.setAcceptMode(QFileDialog.AcceptMode.AcceptSave)
    dialog.setDefaultSuffix(suggested.suffix.removeprefix("."))
    dialog.selectFile(suggested.name)
    chosen = dialog.selectedFiles() if dialog.exec() else []
    dialog.deleteLater()
    if not chosen:
        return None
    # A name such as walk.v2 is kept whole: the ending is added, never put in place of another.
    path = Path(chosen[0])
    known = path.suffix and f"*{path.suffix.lower()}" in kinds
    return path if known else path.with_name(path.name + suggested.suffix)


def how_to_leave(parent: QWidget, title: str) -> Leave:
    """Ask what shall happen to the unsaved campaign `title`."""
    box = QMessageBox(parent)
    box.setWindowTitle("Not saved")
    box.setTextFormat(Qt.TextFormat.PlainText)
    box.setText(f"{title} was edited and is not saved.")
    box.setInformativeText(
        "Without saving, the edits are lost; the imported files stay as they are."
    )
    roles = QMessageBox.ButtonRole
    buttons = {
        box.addButton(Leave.SAVE.value, roles.AcceptRole): Leave.SAVE,
        box.addButton(Leave.LOSE.value, roles.DestructiveRole): Leave.LOSE,
        box.addButton(Leave.STAY.value, roles.RejectRole): Leave.STAY,
    }
    box.setDefaultButton(next(iter(buttons)))
    box.exec()
    clicked = box.clickedButton()
    answer = next((a for button, a in buttons.items() if button is clicked), Leave.STAY)
    box.deleteLater()
    return answer


def say_plainly(parent: QWidget, title: str, headline: str, words: str) -> None:
    """Show a text to read."""
    box = QMessageBox(parent)
    box.setWindowTitle(title)
    box.setTextFormat(Qt.TextFormat.PlainText)
    box.setText(headline)
    box.setInformativeText(words)
    box.exec()
    box.deleteLater()
