"""Words that change often, in a room that does not: nothing around them is laid out anew."""

from __future__ import annotations

import math

from PySide6.QtCore import Qt
from PySide6.QtGui import QFontMetricsF, QResizeEvent
from PySide6.QtWidgets import QLabel, QSizePolicy, QWidget


class Still(QWidget):
    """Holds a label at the height of some lines, and of more only where its words need them."""

    def __init__(self, label: QLabel, lines: int) -> None:
        super().__init__()
        self.label, self._lines = label, lines
        label.setParent(self)
        label.setAlignment(Qt.AlignmentFlag.AlignTop)
        self.setSizePolicy(QSizePolicy.Policy.Expanding, QSizePolicy.Policy.Fixed)
        self.fit()

    def say(self, text: str) -> None:
        if text != self.label.text():
            self.label.setText(text)
            self.fit()

    def fit(self) -> None:
        self.label.ensurePolished()
        metrics = QFontMetricsF(self.label.font())
        least = math.ceil(self._lines * metrics.lineSpacing()) + 2
        width = max(self.width(), 200)
        # Laying out the words takes long; mostly it is plain that they fit.
        if metrics.horizontalAdvance(self.label.text()) <= (self._lines - 0.15) * width:
            self.setFixedHeight(least)
        else:
            self.setFixedHeight(max(least, self.label.heightForWidth(width)))

    def resizeEvent(self, event: QResizeEvent) -> None:
        super().resizeEvent(event)
        self.label.setGeometry(self.rect())
        if event.size().width() != event.oldSize().width():
            self.fit()
