"""What happens when something goes wrong in a way it should not: a report is written, and said."""

from __future__ import annotations

import faulthandler
import sys
import threading
from collections.abc import Callable
from types import TracebackType
from typing import IO

from coatgui.campaign.crash_report import start_log, write_crash_report
from coatgui.campaign.user_data import user_data_folder

_fatal: list[IO[str]] = []  # kept open for as long as the program runs


def went_wrong(error: BaseException) -> str:
    """Write a report of an error, and say so in a sentence."""
    report = write_crash_report(error)
    where = f" A report without any measurement data is in {report}." if report else ""
    return f"That went wrong in a way it should not ({type(error).__name__}).{where}"


def watch(say: Callable[[str], object]) -> Callable[[], None]:
    """From now on `say` is given a sentence about every error that nothing else takes care of, and
    a report of it is written; the window goes on. The log begins, too. Returns what ends it."""
    start_log()
    before, threads_before = sys.excepthook, threading.excepthook

    def hook(kind: type[BaseException], error: BaseException, trace: TracebackType | None) -> None:
        if issubclass(kind, KeyboardInterrupt):
            before(kind, error, trace)
        else:
            say(went_wrong(error))

    def in_a_thread(told: threading.ExceptHookArgs) -> None:
        # The window may only be spoken to from its own thread: the report must do.
        if told.exc_value is not None and not issubclass(told.exc_type, SystemExit):
            write_crash_report(told.exc_value)

    sys.excepthook, threading.excepthook = hook, in_a_thread

    def end() -> None:
        sys.excepthook, threading.excepthook = before, threads_before

    return end


def watch_for_fatal_errors() -> None:
    """Where the program is ended by the system, the places in the code go to a file of their own.
    Nothing of what is worked on is in it."""
    try:
        folder = user_data_folder() / "reports"
        folder.mkdir(parents=True, exist_ok=True)
        file = (folder / "fatal.txt").open("a", encoding="utf-8")
    except OSError:
        return
    _fatal.append(file)
    faulthandler.enable(file)
