"""Summary: what is handed over, as it will print, with the fields that a person fills in."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

from PySide6.QtCore import Qt, Signal
from PySide6.QtGui import QHideEvent, QShowEvent
from PySide6.QtWidgets import (
    QHBoxLayout,
    QListWidget,
    QListWidgetItem,
    QPushButton,
    QVBoxLayout,
    QWidget,
)

from coatgui.campaign import CampaignFileError, operations
from coatgui.output import inspection_summary
from coatgui.output.document import Block, Document, Heading, Listing, Paragraph, Table
from coatgui.output.pages import page_height
from coatgui.records import Assessment, Campaign, Identification
from coatgui.window.desk import Desk
from coatgui.window.field import Field
from coatgui.window.palette import Colours
from coatgui.window.places.place import Place, plain_label
from coatgui.window.printed_pages import PagesView, Printing

_SIDE = 300
_FIELDS = {
    "laboratory": ("Laboratory", "who tested"),
    "customer": ("Customer", "for whom"),
    "order": ("Order", "its number"),
    "author": ("Author", "who wrote the summary"),
    "reviewer": ("Reviewer", "who reviews it"),
    "standards": ("Standards", "agreed on; several parted by semicolons"),
}
_PAGE_POINTS = 595.276  # the width of A4, in which headings are placed


class SummaryPlace(Place):
    """`wanted` asks for the summary as a file, with the ending of its name."""

    noun, question = "Summary", "What do we hand over?"
    needs = "assessment"
    promise = "Here the inspection summary will stand as it prints, with fields to fill in."
    has_strip = False
    wanted = Signal(str)

    def __init__(self, desk: Desk, tone: Colours) -> None:
        super().__init__(desk, tone)
        self.printing = Printing(self)
        self.printing.came.connect(self._came)
        self.printing.finished.connect(self._contents)
        self._shown: tuple[Campaign, Assessment, int] | None = None
        self.standing = plain_label("small")
        self.column.addWidget(self.standing)
        row = QHBoxLayout()
        row.setSpacing(12)
        self.column.addLayout(row, 1)
        self.pages = PagesView(tone)
        self.pages.widened.connect(self._print)
        self.pages.moved.connect(self._mark)
        row.addWidget(self.pages, 1)
        row.addWidget(self._side())

    def _side(self) -> QWidget:
        side = QWidget()
        side.setFixedWidth(_SIDE)
        column = QVBoxLayout(side)
        column.setContentsMargins(0, 0, 0, 0)
        column.setSpacing(6)
        self.fields = {
            name: Field(label, help_text, self._taker(name), label_width=76, line_width=None)
            for name, (label, help_text) in _FIELDS.items()
        }
        for each in self.fields.values():
            column.addWidget(each)
        buttons = QHBoxLayout()
        for ending, text in ((".pdf", "Write PDF…"), (".html", "Write HTML…")):
            button = QPushButton(text)
            button.setAccessibleDescription(f"Write the summary as a {ending[1:].upper()} file")
            button.clicked.connect(lambda _checked=False, e=ending: self.wanted.emit(e))
            buttons.addWidget(button)
        column.addLayout(buttons)
        heading = plain_label("fact_name")
        heading.setText("Contents")
        heading.setContentsMargins(0, 8, 0, 0)
        column.addWidget(heading)
        self.contents = QListWidget()
        self.contents.setAccessibleName("Contents of the summary")
        self.contents.setAccessibleDescription("Up and down turn to a section")
        self.contents.setHorizontalScrollBarPolicy(Qt.ScrollBarPolicy.ScrollBarAlwaysOff)
        self.contents.currentRowChanged.connect(self._turn_to)
        column.addWidget(self.contents, 1)
        return side

    # --- the fields ------------------------------------------------------------------------

    def _taker(self, name: str) -> Callable[[str], None]:
        def take(text: str) -> None:
            value: Any = text
            if name == "standards":
                value = tuple(part.strip() for part in text.split(";") if part.strip())
            campaign = self.desk.campaign
            if campaign is None:
                return
            try:
                operations.identify(campaign, **{name: value})
            except CampaignFileError as error:
                raise ValueError(str(error)) from error
            self.desk.edit(operations.identify, **{name: value})

        return take

    def show_campaign(self) -> None:
        campaign = self.desk.campaign
        kept = Identification() if campaign is None else campaign.identification
        for name, each in self.fields.items():
            value = getattr(kept, name)
            each.show_text("; ".join(value) if isinstance(value, tuple) else value)
        self._print()

    # --- the pages -------------------------------------------------------------------------

    def _print(self) -> None:
        """Have the pages painted anew where they are not of this campaign, or not so wide."""
        campaign, assessment = self.desk.campaign, self.desk.assessment
        if campaign is None or assessment is None:
            self._shown = None
            self.printing.forget()
            self._came()
            self._contents()
            return
        if not self.isVisible():
            self._shown = None
            return
        wanted = (campaign, assessment, self.pages.pixels())
        before = self._shown
        if before and before[0] is campaign and before[1] is assessment and before[2] == wanted[2]:
            return
        self._shown = wanted
        seen = self.desk.photographs()
        self.printing.begin(
            lambda: inspection_summary(assessment, campaign, photographs=seen), wanted[2]
        )
        self._came()

    def _came(self) -> None:
        self.pages.show_pages(self.printing.pages)
        number = len(self.printing.pages)
        if self.desk.assessment is None or self.desk.campaign is None:
            words = self.desk.unjudged_words()
        elif self.printing.trouble:
            words = self.printing.trouble
        elif self.printing.busy:
            words = self.printing.standing or "The summary is being written …"
        else:
            pages = "1 page" if number == 1 else f"{number} pages"
            words = f"{pages}, as they will print. Ctrl+Shift+T copies the text and tables."
        self.standing.setText(words)

    def _contents(self) -> None:
        row = self.contents.currentRow()
        self.contents.blockSignals(True)
        self.contents.clear()
        for heading in self.printing.headings:
            item = QListWidgetItem(f"{'   ' * (heading.level - 1)}{heading.text}")
            item.setToolTip(f"page {heading.page + 1}")
            self.contents.addItem(item)
        self.contents.setCurrentRow(min(max(row, 0), self.contents.count() - 1))
        self.contents.blockSignals(False)
        self.pages.setAccessibleDescription(
            "; ".join(f"{h.text}, page {h.page + 1}" for h in self.printing.headings)
        )

    def _turn_to(self, row: int) -> None:
        if 0 <= row < len(self.printing.headings):
            heading = self.printing.headings[row]
            share = max(heading.y - 30.0, 0.0) / page_height(_PAGE_POINTS)
            self.pages.blockSignals(True)
            self.pages.go_to(heading.page, share)
            self.pages.blockSignals(False)

    def _mark(self, page: int) -> None:
        """The section that the page in sight belongs to is picked in the contents."""
        rows = [i for i, h in enumerate(self.printing.headings) if h.page <= page]
        self.contents.blockSignals(True)
        self.contents.setCurrentRow(rows[-1] if rows else -1)
        self.contents.blockSignals(False)

    def showEvent(self, event: QShowEvent) -> None:
        super().showEvent(event)
        self._print()

    def hideEvent(self, event: QHideEvent) -> None:
        if self.printing.busy:
            self._shown = None
        self.printing.stop()
        super().hideEvent(event)

    # --- in words --------------------------------------------------------------------------

    def data_rows(self) -> list[list[object]]:
        document = self.printing.document
        return [] if document is None else in_rows(document)

    def paint_in(self, tone: Colours) -> None:
        self.pages.tone = tone
        self.pages.viewport().update()
        super().paint_in(tone)


def in_rows(document: Document) -> list[list[object]]:
    """A document as rows of text; a picture is its description."""
    rows: list[list[object]] = [[document.title]]
    for block, number in document.numbered():
        rows += _block(block, number)
    return rows


def _block(block: Block, number: str) -> list[list[object]]:
    match block:
        case Heading():
            return [[], [f"{number} {block.text}"]]
        case Paragraph():
            return [[block.text]]
        case Listing():
            return [[item] for item in block.items]
        case Table():
            rows: list[list[object]] = [list(row) for row in block.rows]
            return [[f"{number}. {block.caption}"], list(block.headings), *rows]
    return [[f"{number}. {block.caption}"], [block.alternative]]
