"""How long the window's thread is kept busy at a stretch, and by what.

The measure is the processor time of that thread between beats of a timer that fires whenever the
events at hand have been dealt with. What several calls took between two beats counts as one, so it
reports too much rather than too little; that other work slows the machine counts for nothing. A
second thread looks on and keeps the stack that ran when a stretch grew too long.
"""

from __future__ import annotations

import sys
import threading
import time
import traceback
from collections.abc import Callable
from types import FrameType

from PySide6.QtCore import QTimer
from PySide6.QtWidgets import QApplication

_LOOK_S = 0.003


class Watchdog:
    """`longest_s` is the longest stretch, `stacks` what ran in stretches beyond `limit_s`: the
    innermost calls of the program as it was when the stretch was found too long."""

    def __init__(self, limit_s: float = 0.05) -> None:
        self.limit_s = limit_s
        self.longest_s = 0.0
        self.stacks: dict[str, float] = {}
        self._last = 0.0
        self._caught = ""
        self._main = threading.get_ident()
        self._clock = time.pthread_getcpuclockid(self._main)
        self._timer = QTimer()
        self._timer.setInterval(0)
        self._timer.timeout.connect(self._beat)

    def _beat(self) -> None:
        now = time.thread_time()
        took = now - self._last
        self.longest_s = max(self.longest_s, took)
        if took > self.limit_s:
            where = self._caught or "(it was over before it was seen)"
            self.stacks[where] = max(self.stacks.get(where, 0.0), took)
        self._caught = ""
        self._last = now

    def _look_on(self, ended: threading.Event) -> None:
        while not ended.wait(_LOOK_S):
            if time.clock_gettime(self._clock) - self._last > self.limit_s and not self._caught:
                self._caught = _said(sys._current_frames()[self._main])

    def over(
        self, begin: Callable[[], object], there: Callable[[], bool], most_s: float = 300.0
    ) -> float:
        """Seconds at most, from `begin` until what it started is there. Raises TimeoutError."""
        application = QApplication.instance()
        assert application is not None
        self.longest_s, self.stacks = 0.0, {}
        self._last = time.thread_time()
        ended = threading.Event()
        watcher = threading.Thread(target=self._look_on, args=(ended,))
        watcher.start()
        self._timer.start()
        try:
            begin()
            end = time.monotonic() + most_s
            while not there():
                application.processEvents()
                time.sleep(0.001)
                if time.monotonic() > end:
                    raise TimeoutError
            application.processEvents()
            self._beat()
        finally:
            self._timer.stop()
            ended.set()
            watcher.join()
        return self.longest_s

    def report(self) -> str:
        """What was too long, longest first."""
        told = sorted(self.stacks.items(), key=lambda item: -item[1])
        return "\n".join(f"        {1e3 * took:.0f} ms: {where}" for where, took in told)


def _said(frame: FrameType) -> str:
    """The calls of the program in a stack, outermost first."""
    stack = traceback.extract_stack(frame)
    own = [call for call in stack if "/coatgui/" in call.filename] or stack[-3:]
    return " > ".join(
        f"{call.filename.rpartition('coatgui/')[2] or call.filename}:{call.lineno} {call.name}"
        for call in own[-6:]
    )


def reference_s() -> float:
    """Processor time of a fixed piece of work on this thread: what the machine is worth now."""
    began = time.thread_time()
    total = 0
    for number in range(200_000):
        total += number % 7
    return time.thread_time() - began
