"""The column beside the places: facts of the selection, what was seen, origins, history."""

from __future__ import annotations

from PySide6.QtCore import Qt
from PySide6.QtWidgets import (
    QButtonGroup,
    QHBoxLayout,
    QPushButton,
    QStackedWidget,
    QVBoxLayout,
    QWidget,
)

from coatgui.window.desk import Desk
from coatgui.window.facts import Fact, FactsView, facts, seen_facts
from coatgui.window.history import HistoryView
from coatgui.window.origin_view import OriginView
from coatgui.window.palette import Colours
from coatgui.window.seen import SeenView

FACTS, SEEN, ORIGIN, HISTORY = range(4)


class SideColumn(QWidget):
    """One of four at a time; only the one that is open is kept up to date."""

    def __init__(self, desk: Desk, tone: Colours) -> None:
        super().__init__()
        self.desk = desk
        column = QVBoxLayout(self)
        column.setContentsMargins(0, 0, 0, 0)
        column.setSpacing(0)
        bar = QHBoxLayout()
        bar.setContentsMargins(4, 4, 4, 0)
        bar.setSpacing(0)
        self.facts = FactsView()
        self.seen = SeenView(desk, tone)
        self.origin = OriginView(desk)
        self.history = HistoryView(desk, tone)
        self.stack = QStackedWidget()
        self.buttons = QButtonGroup(self)
        for number, (noun, question, view) in enumerate(
            (
                ("Facts", "What is known of the picked reading?", self.facts),
                ("Seen", "What was seen on this panel? Ratings and photographs", self.seen),
                ("Origin", "Where does this number come from?", self.origin),
                ("History", "What was done, by whom and when?", self.history),
            )
        ):
            button = QPushButton(noun)
            button.setObjectName("link")
            button.setCheckable(True)
            button.setToolTip(question)
            button.setAccessibleDescription(question)
            self.buttons.addButton(button, number)
            bar.addWidget(button)
            self.stack.addWidget(view)
        bar.addStretch(1)
        self.buttons.idClicked.connect(self.open)
        self.facts.asked.connect(self.ask)
        column.addLayout(bar)
        column.addWidget(self.stack, 1)
        self.open(FACTS)

    def open(self, number: int) -> None:
        self.buttons.button(number).setChecked(True)
        self.stack.setCurrentIndex(number)
        for each in range(self.stack.count()):
            button = self.buttons.button(each)
            font = button.font()
            font.setUnderline(each == number)
            button.setFont(font)
            policy = Qt.FocusPolicy
            button.setFocusPolicy(policy.StrongFocus if each == number else policy.ClickFocus)
        if number != FACTS:
            self.show()
        self.refresh()

    def make_room(self, wanted: bool) -> None:
        """Stand aside where a place shows the facts itself; origin and history stay if open."""
        self.setVisible(not wanted or self.stack.currentIndex() != FACTS)
        self.refresh()

    def ask(self, code: str) -> None:
        """Show where a number comes from."""
        self.open(ORIGIN)
        self.origin.ask(code)

    def show_origin(self) -> None:
        self.open(ORIGIN)

    def show_seen(self) -> None:
        self.open(SEEN)

    def show_history(self) -> None:
        self.open(HISTORY)

    def refresh(self) -> None:
        """Follow the desk, where it is seen."""
        if self.isHidden():
            return
        campaign, reading = self.desk.campaign, self.desk.reading()
        shown = facts(self.desk.reading_assessment(), self.desk.assessment)
        if campaign is not None and reading is not None:
            shown += seen_facts(campaign, reading)
        if not shown:
            shown = [Fact("note", "What is known of a reading stands here once one is picked.")]
        self.facts.show_facts(shown)
        if self.stack.currentIndex() == ORIGIN:
            self.origin.refresh()
        elif self.stack.currentIndex() == SEEN:
            self.seen.refresh()
        elif self.stack.currentIndex() == HISTORY:
            self.history.refresh()

    def paint_in(self, tone: Colours) -> None:
        self.history.paint_in(tone)
