"""How the program is called: the words of the command line, and what ends it."""

from __future__ import annotations

import argparse
import sys
from pathlib import Path

from coatgui import __version__

DONE, SOME_REFUSED, NOTHING = 0, 1, 2
ENDING = ".coatgui"
FIELDS = {
    "laboratory": "who tested",
    "customer": "for whom",
    "order": "the order's number",
    "author": "who wrote the summary",
    "reviewer": "who reviews it",
    "date": "the date of the summary",
    "standards": "the standards agreed on",
}


class Stop(Exception):
    """Ends the program with one sentence on stderr and exit status 2."""


def say(text: str) -> None:
    print(f"coatgui: {text}", file=sys.stderr)


class _Parser(argparse.ArgumentParser):
    def error(self, message: str) -> None:  # type: ignore[override]
        raise Stop(f"{message}; see coatgui --help.")


def window_parser() -> argparse.ArgumentParser:
    parser = _Parser(
        prog="coatgui",
        description="Judges coated test panels from impedance spectra.",
        epilog="Without one of the words 'assess', 'add', 'check', the window opens.",
    )
    parser.add_argument("--version", action="version", version=f"coatgui {__version__}")
    parser.add_argument(
        "target", nargs="?", help="a campaign file, a folder, 'assess', 'add' or 'check'"
    )
    return parser


def assess_parser() -> argparse.ArgumentParser:
    parser = _Parser(prog="coatgui assess", description="Assess a campaign without a window.")
    parser.add_argument("source", type=Path, help="a campaign file or a folder of spectra")
    parser.add_argument("--campaign", type=Path, metavar=f"OUT{ENDING}", help="keep the campaign")
    parser.add_argument(
        "--json", type=Path, metavar="OUT.json", help="write the assessment as data"
    )
    parser.add_argument("--workbook", type=Path, metavar="OUT.xlsx", help="write the workbook")
    parser.add_argument(
        "--spectra",
        action="store_true",
        help="put every spectrum into the workbook, however many there are",
    )
    parser.add_argument(
        "--summary",
        type=Path,
        metavar="OUT.pdf",
        help="write the inspection summary, as .pdf (needs Qt) or .html",
    )
    parser.add_argument(
        "--figures", type=Path, metavar="FOLDER", help="write every figure into a folder"
    )
    parser.add_argument(
        "--figure-format",
        choices=("svg", "pdf", "png"),
        default="svg",
        help="of the figures; pdf and png need Qt (default: svg)",
    )
    parser.add_argument(
        "--tables", type=Path, metavar="FOLDER", help="write CSV tables and what they hold"
    )
    for field, what in FIELDS.items():
        parser.add_argument(
            f"--{field}",
            default="",
            metavar="TEXT",
            help=what if field == "date" else f"{what}, for the summary, if not as in the campaign",
        )
    parser.add_argument("--workers", type=int, metavar="N", help="processes to share the work")
    parser.add_argument("--quiet", action="store_true", help="print no table and no progress")
    _say_of_folder(parser)
    return parser


def add_parser() -> argparse.ArgumentParser:
    parser = _Parser(
        prog="coatgui add", description="Add a folder's readings to a campaign, as one edit."
    )
    parser.add_argument("campaign", type=Path, help="a campaign file")
    parser.add_argument("source", type=Path, help="a folder of spectra")
    _say_of_folder(parser)
    return parser


def _say_of_folder(parser: argparse.ArgumentParser) -> None:
    """What can be said of a folder's files before they are taken."""
    parser.add_argument(
        "--dry-run", action="store_true", help="only say what each file of a folder would become"
    )
    parser.add_argument(
        "--proposals",
        type=Path,
        metavar="OUT.csv",
        help="with --dry-run: write what each file would become as a table to be corrected",
    )
    parser.add_argument(
        "--corrections",
        type=Path,
        metavar="FILE.csv",
        help="take what such a table says of panel, time, columns, and what to leave out",
    )
    parser.add_argument(
        "--names",
        metavar="EXAMPLE",
        help="where panel and time stand in files' names, marked in one of them, like "
        "'week 3/{panel:B-07} t{time:168}h.txt'; {date:20260308} where a date says the time",
    )
    parser.add_argument(
        "--time-unit", default="h", metavar="UNIT", help="of times in names that have none"
    )
    parser.add_argument(
        "--started",
        action="append",
        default=[],
        metavar="[PANEL=]DATE",
        help="when exposure started, of one panel or of all, like 2026-03-01; may come again",
    )


def check_parser() -> argparse.ArgumentParser:
    parser = _Parser(prog="coatgui check", description="Verify a campaign file.")
    parser.add_argument("file", type=Path, help="a campaign file")
    return parser
