"""What every place has: a question, a sentence where it is empty, and a way to show the desk."""

from __future__ import annotations

from collections.abc import Callable
from html import escape

from PySide6.QtCore import Qt
from PySide6.QtWidgets import (
    QHBoxLayout,
    QLabel,
    QPushButton,
    QStackedWidget,
    QVBoxLayout,
    QWidget,
)

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


class EmptyPage(QWidget):
    """One sentence, and one button for what can be done about it."""

    def __init__(self) -> None:
        super().__init__()
        column = QVBoxLayout(self)
        column.addStretch(2)
        self.words = plain_label("empty")
        self.words.setAlignment(Qt.AlignmentFlag.AlignHCenter)
        column.addWidget(self.words)
        row = QHBoxLayout()
        row.addStretch(1)
        self.button = QPushButton()
        self.button.setObjectName("first")
        self.button.clicked.connect(lambda _checked=False: self._call and self._call())
        row.addWidget(self.button)
        row.addStretch(1)
        column.addSpacing(8)
        column.addLayout(row)
        column.addStretch(3)
        self._call: Callable[[], object] | None = None

    def say(self, sentence: str, button: str, call: Callable[[], object] | None) -> None:
        self.words.setText(sentence.strip())
        self._call = call
        self.button.setText(button)
        self.button.setAccessibleDescription(sentence.strip())
        self.button.setVisible(bool(button))


class Place(QWidget):
    """A place shows what the desk holds. `show_campaign` follows edits and new assessments,
    `show_selection` another reading, `paint_in` another palette. `leaves_facts` says that the
    facts of the selection stand beside it, `has_strip` that the exposure times stand under it, and
    `note` is the code of the method note that belongs to it. `needs` is what must be there
    ("", readings or assessment), else `promise` says what would be here."""

    noun = ""
    question = ""
    note = ""
    leaves_facts = False
    has_strip = True
    needs = ""
    promise = ""

    def __init__(self, desk: Desk, tone: Colours) -> None:
        super().__init__()
        self.desk, self.tone = desk, tone
        self.setAccessibleName(f"{self.noun}: {self.question}")
        whole = QVBoxLayout(self)
        whole.setContentsMargins(12, 12, 12, 8)
        whole.setSpacing(8)
        heading = plain_label("question")
        heading.setText(self.question)
        whole.addWidget(heading)
        self._pages = QStackedWidget()
        whole.addWidget(self._pages, 1)
        content = QWidget()
        self.column = QVBoxLayout(content)
        self.column.setContentsMargins(0, 0, 0, 0)
        self.column.setSpacing(8)
        self._pages.addWidget(content)
        self.empty = EmptyPage()
        self._pages.addWidget(self.empty)
        # Connected before the window is: what is lacking is known when the place is shown.
        desk.campaign_changed.connect(self.settle)
        desk.assessed.connect(self.settle)
        self.settle()

    def settle(self) -> None:
        """Show the place's own content, or one sentence and one button where what it needs is not
        there."""
        campaign = self.desk.campaign
        if self.needs and (campaign is None or not campaign.readings):
            self.lack_files()
        elif self.needs == "assessment" and self.desk.assessment is None:
            self.lack_judging()
        else:
            self.show_content()

    def show_content(self) -> None:
        self._pages.setCurrentIndex(0)

    def show_empty(self, sentence: str, button: str, call: Callable[[], object] | None) -> None:
        self._pages.setCurrentIndex(1)
        self.empty.say(sentence, button, call)

    def lack_files(self) -> None:
        self.show_empty(
            f"{self.promise} Bring in files with spectra, or drop them on the window.",
            "Bring in files…",
            self.desk.files_wanted.emit,
        )

    def lack_judging(self) -> None:
        words = self.desk.unjudged_words()
        if self.desk.is_halted:
            self.show_empty(words, "Judge the readings", self.desk.judge)
        else:
            self.show_empty(f"{self.promise} {words}", "", None)

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
