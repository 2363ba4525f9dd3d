"""The command line. See `coatgui --help`; what scripts rely on does not change."""

from __future__ import annotations

import os
import sys
from collections.abc import Sequence
from pathlib import Path

from coatgui.cli.calls import (
    DONE,
    NOTHING,
    Stop,
    add_parser,
    assess_parser,
    check_parser,
    say,
    window_parser,
)

__all__ = ["main"]


def main(argv: Sequence[str] | None = None) -> int:
    """Run the program; returns the exit status and never shows a traceback, unless the
    environment variable COATGUI_DEBUG is set."""
    arguments = list(sys.argv[1:] if argv is None else argv)
    # One thread for linear algebra: the matrices are small, and several processes would fight.
    for name in ("OPENBLAS_NUM_THREADS", "OMP_NUM_THREADS", "MKL_NUM_THREADS"):
        os.environ.setdefault(name, "1")
    try:
        if arguments[:1] == ["assess"]:
            from coatgui.cli.assessing import assess

            return assess(assess_parser().parse_args(arguments[1:]))
        if arguments[:1] == ["add"]:
            from coatgui.cli.folders import add

            return add(add_parser().parse_args(arguments[1:]))
        if arguments[:1] == ["check"]:
            return _check(check_parser().parse_args(arguments[1:]).file)
        target = window_parser().parse_args(arguments).target
        return _window(None if target is None else Path(target))
    except Stop as stop:
        say(str(stop))
    except KeyboardInterrupt:
        say("stopped; nothing was half-written.")
    except Exception as error:
        if os.environ.get("COATGUI_DEBUG"):
            raise
        say(f"something went wrong that should not ({type(error).__name__}: {error}).")
    return NOTHING


def _window(target: Path | None) -> int:
    if target is not None and not target.exists():
        raise Stop(f"there is no '{target}': check the path.")
    try:
        from coatgui.window import run
    except ImportError as error:
        raise Stop(
            f"the window cannot be opened ({error}); 'coatgui assess' works without it."
        ) from None
    status: int = run(target)
    return status


def _check(file: Path) -> int:
    from coatgui.campaign import CampaignFileError, check_file

    try:
        problems = check_file(file)
    except CampaignFileError as error:
        raise Stop(str(error)) from None
    for problem in problems:
        say(problem)
    if problems:
        return NOTHING
    print(f"{file}: sound")
    return DONE
