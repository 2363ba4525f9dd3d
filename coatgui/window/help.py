"""Help: method notes and the glossary, one key away and opened where they are wanted; cautions."""

from __future__ import annotations

from collections.abc import Callable
from html import escape

from PySide6.QtCore import Qt
from PySide6.QtGui import QKeySequence, QShortcut
from PySide6.QtWidgets import (
    QDialog,
    QHBoxLayout,
    QLineEdit,
    QSplitter,
    QTextBrowser,
    QTreeWidget,
    QTreeWidgetItem,
    QVBoxLayout,
    QWidget,
)

from coatgui.notes import KINDS, Note, Term, glossary, method_notes, note_about
from coatgui.window.asking import say_plainly

_PARTS = (
    ("Formula", "formula"),
    ("Assumes", "assumes"),
    ("When not to use it", "avoid"),
    ("Source", "source"),
)
_TERMS = "Terms of the trade"


def page(entry: Note | Term) -> str:
    """A note or a term as a page of rich text; every word of it is escaped."""
    if isinstance(entry, Term):
        also = f"<p>Also: {escape(', '.join(entry.also))}</p>" if entry.also else ""
        return f"<h2>{escape(entry.name)}</h2><p>{escape(entry.meaning)}</p>{also}"
    parts = "".join(
        f"<h4>{name}</h4><p>{escape(getattr(entry, field))}</p>" for name, field in _PARTS
    )
    return f"<h2>{escape(entry.title)}</h2><p>{escape(entry.meaning)}</p>{parts}"


def words(entry: Note | Term) -> str:
    """All that a search looks through."""
    if isinstance(entry, Term):
        return " ".join((entry.name, *entry.also, entry.meaning)).casefold()
    fields = (entry.title, entry.meaning, entry.formula, entry.assumes, entry.avoid, entry.source)
    return " ".join((*fields, *(code.replace("_", " ") for code in entry.covers))).casefold()


class NotesWindow(QDialog):
    """The notes beside the main window: a list with a search at left, the page at right."""

    def __init__(self, parent: QWidget | None) -> None:
        super().__init__(parent)
        self.setWindowTitle("Method notes")
        self.resize(880, 600)
        self.search = QLineEdit()
        self.search.setPlaceholderText("Find a word, a symbol or a code")
        self.search.setAccessibleName("Find in the method notes")
        self.search.setClearButtonEnabled(True)
        self.search.textChanged.connect(self._filter)
        self.list = QTreeWidget()
        self.list.setHeaderHidden(True)
        self.list.setAccessibleName("Method notes and terms")
        self.list.setAccessibleDescription("Up and down pick a page")
        self.list.currentItemChanged.connect(lambda item, _before: self._show(item))
        self.text = QTextBrowser()
        self.text.setOpenLinks(False)
        self.text.setAccessibleName("The picked note")
        left = QWidget()
        column = QVBoxLayout(left)
        column.setContentsMargins(0, 0, 0, 0)
        column.addWidget(self.search)
        column.addWidget(self.list, 1)
        halves = QSplitter()
        halves.setHandleWidth(8)
        halves.addWidget(left)
        halves.addWidget(self.text)
        halves.setSizes([320, 560])
        halves.setStretchFactor(1, 1)
        QHBoxLayout(self).addWidget(halves)
        QShortcut(QKeySequence.StandardKey.Find, self, self.search.setFocus)
        self._entries: list[tuple[QTreeWidgetItem, Note | Term]] = []
        for kind, name in KINDS.items():
            self._branch(name, [note for note in method_notes() if note.kind == kind])
        self._branch(_TERMS, list(glossary()))
        self.list.setCurrentItem(self._entries[0][0])

    def _branch(self, name: str, entries: list[Note] | list[Term]) -> None:
        branch = QTreeWidgetItem(self.list, [name])
        branch.setFlags(Qt.ItemFlag.ItemIsEnabled)
        for entry in entries:
            title = entry.name if isinstance(entry, Term) else entry.title
            self._entries.append((QTreeWidgetItem(branch, [title]), entry))
        branch.setExpanded(name != _TERMS)

    def open_at(self, code: str) -> None:
        """Open the page that covers a code; the page that was open stays if none does."""
        note = note_about(code)
        self.search.clear()
        for item, entry in self._entries:
            if entry is note:
                self.list.setCurrentItem(item)
                self.list.scrollToItem(item)
        self.show()
        self.raise_()
        self.activateWindow()
        self.list.setFocus()

    def _filter(self, text: str) -> None:
        wanted = text.casefold().split()
        shown = []
        for item, entry in self._entries:
            found = words(entry)
            item.setHidden(not all(word in found for word in wanted))
            if not item.isHidden():
                shown.append(item)
        for place in range(self.list.topLevelItemCount()):
            branch = self.list.topLevelItem(place)
            if branch is not None:
                children = [branch.child(i) for i in range(branch.childCount())]
                branch.setHidden(all(child is None or child.isHidden() for child in children))
                branch.setExpanded(bool(wanted) or branch.text(0) != _TERMS)
        current = self.list.currentItem()
        if not shown:
            self.text.setPlainText(f"No note and no term has “{text.strip()}” in it.")
        elif current is None or current.isHidden():
            self.list.setCurrentItem(shown[0])
        else:
            self._show(current)

    def _show(self, picked: QTreeWidgetItem | None) -> None:
        for item, entry in self._entries:
            if item is picked:
                self.text.setHtml(page(entry))


class Help:
    """What the menu of that name does; `topic` says what the person is looking at."""

    def __init__(self, window: QWidget, topic: Callable[[], str]) -> None:
        self.window, self.topic = window, topic
        self.notes: NotesWindow | None = None

    def show_notes(self) -> None:
        if self.notes is None:
            self.notes = NotesWindow(self.window)
        self.notes.open_at(self.topic())

    def show_cautions(self) -> None:
        from coatgui.assessment.cautions import cautions  # late: it brings all of assessment

        say_plainly(self.window, "Cautions", "What the results do not say", "\n\n".join(cautions()))
