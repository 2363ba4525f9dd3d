"""A quiet line above the work that says something lasting, with what can be done about it."""

from __future__ import annotations

from collections.abc import Callable, Sequence

from PySide6.QtWidgets import QFrame, QHBoxLayout, QListWidget, QPushButton, QVBoxLayout

from coatgui.window.places.place import plain_label

_MOST_ROWS = 5
_ROW = 20


class Notice(QFrame):
    """One sentence, buttons for what can be done, and a list of particulars where there are any. It
    stays until something is chosen, or it is dismissed, or withdrawn."""

    def __init__(self, name: str) -> None:
        super().__init__()
        self.setObjectName("side")
        self.setAccessibleName(name)
        column = QVBoxLayout(self)
        column.setContentsMargins(12, 4, 8, 4)
        column.setSpacing(4)
        row = QHBoxLayout()
        self.words = plain_label()
        row.addWidget(self.words, 1)
        self._buttons = QHBoxLayout()
        row.addLayout(self._buttons)
        self.dismiss = QPushButton("Dismiss")
        self.dismiss.setAccessibleDescription("Take this line away")
        self.dismiss.clicked.connect(self.hide)
        row.addWidget(self.dismiss)
        column.addLayout(row)
        self.particulars = QListWidget()
        self.particulars.setAccessibleName(f"{name}: particulars")
        self.particulars.setAccessibleDescription("What the sentence above is about, one by one")
        self.particulars.setWordWrap(True)
        column.addWidget(self.particulars)
        self.ways: list[QPushButton] = []
        self.hide()

    def say(
        self,
        sentence: str,
        ways: Sequence[tuple[str, Callable[[], object]]] = (),
        particulars: Sequence[str] = (),
        *,
        dismiss: str = "Dismiss",
        dismissed: Callable[[], object] | None = None,
    ) -> None:
        """`ways` are buttons with what they do; the line goes away before it is done."""
        self.words.setText(sentence)
        self.setAccessibleDescription(sentence)
        for button in self.ways:
            self._buttons.removeWidget(button)
            button.deleteLater()
        self.ways = []
        for text, call in ways:
            button = QPushButton(text)
            button.setAccessibleDescription(f"{sentence} {text.rstrip('…')}")
            button.clicked.connect(lambda _checked=False, do=call: self._do(do))
            self._buttons.addWidget(button)
            button.show()  # here and now, not when the event loop comes to it
            self.ways.append(button)
        self.dismiss.setText(dismiss)
        self.dismiss.clicked.disconnect()
        self.dismiss.clicked.connect(lambda _checked=False: self._do(dismissed or (lambda: None)))
        self.particulars.clear()
        self.particulars.addItems(list(particulars))
        self.particulars.setVisible(bool(particulars))
        self.particulars.setFixedHeight(_ROW * min(len(particulars), _MOST_ROWS) + 12)
        self.show()

    def _do(self, call: Callable[[], object]) -> None:
        self.hide()
        call()
