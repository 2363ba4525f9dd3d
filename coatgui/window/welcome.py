"""The page that stands where no campaign is open, and the line that says what went wrong."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

from PySide6.QtCore import QFileInfo, Qt, Signal
from PySide6.QtWidgets import QFrame, QHBoxLayout, QPushButton, QVBoxLayout, QWidget

from coatgui.window.places.place import plain_label

_SHOWN = 5


class Welcome(QWidget):
    """One sentence, the ways to begin, and the campaigns worked on lately (`picked`)."""

    picked = Signal(str)

    def __init__(self, ways: list[tuple[str, Callable[[], None]]]) -> None:
        super().__init__()
        self.setAccessibleName("Welcome")
        across = QHBoxLayout(self)
        column = QVBoxLayout()
        across.addStretch(2)
        across.addLayout(column)
        across.addStretch(3)
        column.addStretch(2)
        column.setSpacing(12)
        headline = plain_label("headline")
        headline.setText("Coated panels, judged from their impedance spectra.")
        words = plain_label()
        words.setText(
            "Open a folder of spectra, or drop it here: every reading is checked, fitted and "
            "bounded, and the panels are followed over exposure time."
        )
        words.setFixedWidth(600)
        words.setMinimumHeight(40)
        column.addWidget(headline)
        column.addWidget(words)
        row = QHBoxLayout()
        row.setSpacing(8)
        for place, (text, call) in enumerate(ways):
            button = QPushButton(text)
            if place == 0:
                button.setObjectName("first")
            button.setAccessibleDescription(text.rstrip("…"))
            button.clicked.connect(lambda _checked=False, do=call: do())
            row.addWidget(button)
        row.addStretch(1)
        column.addLayout(row)
        column.addSpacing(16)
        self.heading = plain_label("small")
        self.heading.setText("Lately worked on")
        column.addWidget(self.heading)
        self.links = [QPushButton() for _ in range(_SHOWN)]
        for link in self.links:
            link.setObjectName("link")
            link.setAccessibleName("Campaign worked on lately")
            link.setCursor(Qt.CursorShape.PointingHandCursor)
            link.clicked.connect(lambda _checked=False, of=link: self.picked.emit(of.toolTip()))
            column.addWidget(link)
        column.addStretch(3)

    def show_recent(self, names: list[str]) -> None:
        """Offer campaign files by their paths, those that are still there."""
        there = [name for name in names if QFileInfo.exists(name)][:_SHOWN]
        self.heading.setVisible(bool(there))
        for number, link in enumerate(self.links):
            link.setVisible(number < len(there))
            if number < len(there):
                path = Path(there[number])
                link.setText(f"{path.stem}   ({path.parent})".replace("&", "&&"))
                link.setToolTip(there[number])
                link.setAccessibleDescription(f"Open the campaign {path.stem}")


class Trouble(QFrame):
    """Says in one sentence what could not be done, until it is dismissed or something works."""

    def __init__(self) -> None:
        super().__init__()
        self.setObjectName("trouble")
        self.setAccessibleName("What went wrong")
        row = QHBoxLayout(self)
        row.setContentsMargins(12, 6, 8, 6)
        self.words = plain_label()
        self.elsewhere = QPushButton("Save elsewhere…")
        self.elsewhere.setAccessibleDescription("Keep the campaign under another name or disk")
        self.dismiss = QPushButton("Dismiss")
        self.dismiss.setAccessibleDescription("Take this message away")
        self.dismiss.clicked.connect(self.hide)
        row.addWidget(self.words, 1)
        row.addWidget(self.elsewhere)
        row.addWidget(self.dismiss)
        self.hide()

    def say_unkept(self, sentence: str) -> None:
        """The same, of a campaign that can no longer be kept where it is."""
        self.say(sentence)
        self.elsewhere.show()

    def say(self, sentence: str) -> None:
        self.elsewhere.hide()
        self.words.setText(f"■  {sentence}")
        self.setAccessibleDescription(sentence)
        self.show()


class Waiting(QFrame):
    """Says quietly that something waits, with one button to look at it (`look`)."""

    look = Signal()

    def __init__(self) -> None:
        super().__init__()
        self.setObjectName("side")
        self.setAccessibleName("What waits")
        row = QHBoxLayout(self)
        row.setContentsMargins(12, 4, 8, 4)
        self.words = plain_label()
        self.button = QPushButton("Look")
        self.button.setAccessibleDescription("Show what waits")
        self.button.clicked.connect(self.look)
        self.dismiss = QPushButton("Not now")
        self.dismiss.setAccessibleDescription("Take this line away")
        self.dismiss.clicked.connect(self.hide)
        row.addWidget(self.words, 1)
        row.addWidget(self.button)
        row.addWidget(self.dismiss)
        self.hide()

    def say(self, sentence: str, button: str) -> None:
        self.words.setText(sentence)
        self.button.setText(button)
        self.setAccessibleDescription(sentence)
        self.show()
