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
        least = math.ceil(self._lines * QFontMetricsF(self.label.font()).lineSpacing()) + 2
        self.setFixedHeight(max(least, self.label.heightForWidth(max(self.width(), 200))))

    def resizeEvent(self, event: QResizeEvent) -> None:
        super().resizeEvent(event)
        self.label.setGeometry(self.rect())
        if event.size().width() != event.oldSize().width():
            self.fit()
