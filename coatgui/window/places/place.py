"""What every place has: a question, a sentence where it is empty, and a way to show the desk."""

from __future__ import annotations

from html import escape

from PySide6.QtCore import Qt
from PySide6.QtWidgets import QLabel, QVBoxLayout, QWidget

from coatgui.window.desk import Desk
from coatgui.window.palette import Colours


def plain_label(name: str = "") -> QLabel:
    """A label that shows text as it is: what comes from files is never taken for markup."""
    label = QLabel()
    label.setTextFormat(Qt.TextFormat.PlainText)
    label.setWordWrap(True)
    label.setObjectName(name)
    label.setTextInteractionFlags(Qt.TextInteractionFlag.TextSelectableByMouse)
    return label


def plain_tip(text: str) -> str:
    """A tip that shows text as it is, line by line."""
    return f"<qt>{escape(text).replace(chr(10), '<br>')}</qt>"


class Place(QWidget):
    """A place shows what the desk holds. `show_campaign` follows edits and new assessments,
    `show_selection` another reading, `paint_in` another palette. `leaves_facts` says that the
    facts of the selection stand beside it, `has_strip` that the exposure times stand under it, and
    `note` is the code of the method note that belongs to it."""

    noun = ""
    question = ""
    note = ""
    leaves_facts = False
    has_strip = True

    def __init__(self, desk: Desk, tone: Colours) -> None:
        super().__init__()
        self.desk, self.tone = desk, tone
        self.setAccessibleName(f"{self.noun}: {self.question}")
        self.column = QVBoxLayout(self)
        self.column.setContentsMargins(12, 12, 12, 8)
        self.column.setSpacing(8)
        heading = plain_label("question")
        heading.setText(self.question)
        self.column.addWidget(heading)

    def show_campaign(self) -> None:
        raise NotImplementedError

    def show_selection(self) -> None:
        """Another reading was picked."""

    def topic(self) -> str:
        """The code of the method note about what is looked at."""
        return self.note

    def figure(self) -> list[QWidget]:
        """The plots that make a picture of this place; none where there is nothing to show."""
        return []

    def caption(self) -> str:
        """What stands over the picture."""
        return ""

    def data_rows(self) -> list[list[object]]:
        """The data behind the picture, the headings first."""
        return []

    def paint_in(self, tone: Colours) -> None:
        self.tone = tone
        self.show_campaign()
