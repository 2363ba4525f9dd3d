"""The status line: the work under way with its progress and a way to stop it, and what is kept."""

from __future__ import annotations

import time
from collections.abc import Callable

from PySide6.QtWidgets import QLabel, QProgressBar, QPushButton, QStatusBar

from coatgui.window.places.place import plain_label


class WorkStatus:
    """The permanent widgets at the right of a status bar."""

    def __init__(self, bar: QStatusBar, stop: Callable[[], None]) -> None:
        self.doing = QLabel()
        self.bar = QProgressBar()
        self.bar.setFixedWidth(180)
        self.bar.setTextVisible(False)
        self.bar.setAccessibleName("Progress of the work under way")
        self.halt = QPushButton("Stop")
        self.halt.setAccessibleDescription("Give up the work under way (Esc)")
        self.halt.clicked.connect(lambda _checked=False: stop())
        self.kept = plain_label()
        self.kept.setWordWrap(False)
        self._began = 0.0
        for widget in (self.doing, self.bar, self.halt):
            bar.addPermanentWidget(widget)
            widget.hide()
        bar.addPermanentWidget(self.kept)

    def worked(self, stage: str, done: int, total: int) -> None:
        """Show where the work stands; an empty stage says that there is none."""
        for widget in (self.doing, self.bar, self.halt):
            widget.setVisible(bool(stage))
        if not stage:
            self._began = 0.0
            return
        now = time.monotonic()
        self._began = self._began or now
        left = ""
        if total and 0 < done < total and now - self._began > 2.0:
            # An estimate from what is done so far, never to the second.
            left = f", about {(now - self._began) / done * (total - done):.0f} s left"
        self.doing.setText(f"{stage} {done} of {total}{left}" if total > 1 else stage)
        self.bar.setMaximum(max(total, 0) if total > 1 else 0)
        self.bar.setValue(done)
