"""A line to type a fact in, with its name before it and what is wrong with it after it."""

from __future__ import annotations

from collections.abc import Callable

from PySide6.QtCore import Qt
from PySide6.QtWidgets import QGridLayout, QLineEdit, QWidget

from coatgui.window.places.place import plain_label

NAME_WIDTH, LINE_WIDTH = 190, 150


class Field(QWidget):
    """`take` gets what was typed and carries it out, or raises ValueError with a sentence, which
    then stands under the line until it is put right. With `line_width` None the line takes the
    room there is, and the help stands in it while it is empty."""

    def __init__(
        self,
        name: str,
        help_text: str,
        take: Callable[[str], None],
        *,
        label_width: int = NAME_WIDTH,
        line_width: int | None = LINE_WIDTH,
    ) -> None:
        super().__init__()
        self._take = take
        self._shown = ""
        grid = QGridLayout(self)
        grid.setContentsMargins(0, 0, 0, 0)
        grid.setHorizontalSpacing(8)
        grid.setVerticalSpacing(2)
        label = plain_label()
        label.setText(name)
        label.setFixedWidth(label_width)
        self.line = QLineEdit()
        self.line.setAccessibleName(name)
        self.line.setAccessibleDescription(help_text)
        self.line.setToolTip(help_text)
        self.line.editingFinished.connect(self._finished)
        self.note = plain_label("small")
        self.note.setParent(self)
        self.note.setText(help_text)
        self.wrong = plain_label("wrong")
        self.wrong.hide()
        grid.addWidget(label, 0, 0)
        grid.addWidget(self.line, 0, 1)
        grid.addWidget(self.wrong, 1, 1, 1, 2)
        if line_width is None:
            self.line.setPlaceholderText(help_text)
            self.note.hide()
            grid.setColumnStretch(1, 1)
        else:
            self.line.setFixedWidth(line_width)
            grid.addWidget(self.note, 0, 2, Qt.AlignmentFlag.AlignVCenter)
            grid.setColumnStretch(2, 1)

    def show_text(self, text: str) -> None:
        """Show what is set. What was typed wrongly stays until it, or what is set, is changed."""
        if text != self._shown or self.wrong.isHidden():
            self._shown = text
            self.line.setText(text)
            self._say("")

    def _say(self, sentence: str) -> None:
        self.wrong.setText(f"■  {sentence}" if sentence else "")
        self.wrong.setVisible(bool(sentence))

    def _finished(self) -> None:
        text = self.line.text().strip()
        if text == self._shown:
            self._say("")
            return
        try:
            self._take(text)
        except ValueError as error:
            self._say(str(error))
        else:
            self._say("")
            # What was typed may say the same as what is set, in other words.
            self.line.setText(self._shown)
