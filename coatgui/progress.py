"""How long work reports where it stands, learns that it is no longer wanted, and is shared out.

Rooms that compute know only these three things; threads, processes and windows are the business of
`jobs` and of `window`.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator
from typing import Any, Protocol


class Cancelled(Exception):
    """Raised inside a computation whose result is no longer wanted. Nothing is half-written."""


class Progress:
    """A place to report to. `report(stage, done, total)` is called with a few words and two counts;
    `cancelled()` is asked at every step and True raises Cancelled there."""

    def __init__(
        self,
        report: Callable[[str, int, int], None] | None = None,
        cancelled: Callable[[], bool] | None = None,
    ) -> None:
        self._report = report
        self._cancelled = cancelled

    def check(self) -> None:
        """Only ask whether the work is still wanted. Raises Cancelled."""
        if self._cancelled is not None and self._cancelled():
            raise Cancelled

    def at(self, stage: str, done: int, total: int) -> None:
        """Say that `done` of `total` steps of `stage` are done. Raises Cancelled."""
        self.check()
        if self._report is not None:
            self._report(stage, done, total)


class Spread(Protocol):
    """Applies a module-level function to every item, perhaps in other processes, and yields the
    results in the order of the items."""

    def __call__(
        self, function: Callable[[Any], Any], items: Iterable[Any], /
    ) -> Iterator[Any]: ...


def one_after_another(function: Callable[[Any], Any], items: Iterable[Any], /) -> Iterator[Any]:
    """The plain `Spread`: here, in this thread."""
    return map(function, items)
