"""The command line. See `coatgui --help`; what scripts rely on does not change."""

from __future__ import annotations

import argparse
import os
import sys
from collections.abc import Sequence
from pathlib import Path
from typing import TYPE_CHECKING

from coatgui import __version__

if TYPE_CHECKING:
    from coatgui.campaign import CampaignFile
    from coatgui.intake import DryRun
    from coatgui.progress import Progress
    from coatgui.records import Campaign, Found

DONE, SOME_REFUSED, NOTHING = 0, 1, 2
ENDING = ".coatgui"
_SUMMARIES = (".pdf", ".html", ".htm")


_FIELDS = {
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


def _say(text: str) -> None:
    print(f"coatgui: {text}", file=sys.stderr)


class _Parser(argparse.ArgumentParser):
    def error(self, message: str) -> None:  # type: ignore[override]
        raise Stop(f"{message}; see coatgui --help.")


def _parser() -> argparse.ArgumentParser:
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


def _assess_parser() -> argparse.ArgumentParser:
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
    for field, what in _FIELDS.items():
        parser.add_argument(
            f"--{field}",
            default="",
            metavar="TEXT",
            help=what if field == "date" else f"{what}, for the summary, if not as in the campaign",
        )
    parser.add_argument("--workers", type=int, metavar="N", help="processes to share the work")
    parser.add_argument("--quiet", action="store_true", help="print no table and no progress")
    parser.add_argument(
        "--dry-run", action="store_true", help="only say what each file of a folder would become"
    )
    return parser


def _add_parser() -> argparse.ArgumentParser:
    parser = _Parser(
        prog="coatgui add", description="Add a folder's readings to a campaign, as one edit."
    )
    parser.add_argument("campaign", type=Path, help="a campaign file")
    parser.add_argument("source", type=Path, help="a folder of spectra")
    parser.add_argument(
        "--dry-run", action="store_true", help="only say what each file would become"
    )
    return parser


def _check_parser() -> argparse.ArgumentParser:
    parser = _Parser(prog="coatgui check", description="Verify a campaign file.")
    parser.add_argument("file", type=Path, help="a campaign file")
    return parser


def main(argv: Sequence[str] | None = None) -> int:
    """Run the program; returns the exit status and never shows a traceback, unless the
    environment variable COATGUI_DEBUG is set."""
    arguments = list(sys.argv[1:] if argv is None else argv)
    # One thread for linear algebra: the matrices are small, and several processes would fight.
    for name in ("OPENBLAS_NUM_THREADS", "OMP_NUM_THREADS", "MKL_NUM_THREADS"):
        os.environ.setdefault(name, "1")
    try:
        if arguments[:1] == ["assess"]:
            return _assess(_assess_parser().parse_args(arguments[1:]))
        if arguments[:1] == ["add"]:
            return _add(_add_parser().parse_args(arguments[1:]))
        if arguments[:1] == ["check"]:
            return _check(_check_parser().parse_args(arguments[1:]).file)
        target = _parser().parse_args(arguments).target
        return _window(None if target is None else Path(target))
    except Stop as stop:
        _say(str(stop))
    except KeyboardInterrupt:
        _say("stopped; nothing was half-written.")
    except Exception as error:
        if os.environ.get("COATGUI_DEBUG"):
            raise
        _say(f"something went wrong that should not ({type(error).__name__}: {error}).")
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
        _say(problem)
    if problems:
        return NOTHING
    print(f"{file}: sound")
    return DONE


def _propose(folder: Path, areas_cm2: dict[str, float] | None = None) -> DryRun:
    """What each file of a folder would become. Raises Stop."""
    from coatgui.intake import Told, UnreadableFolder, propose_folder

    try:
        return propose_folder(folder, told=Told(areas_cm2=areas_cm2 or {}))
    except UnreadableFolder as error:
        raise Stop(str(error)) from None


def _print_table(run: DryRun) -> None:
    from coatgui.output.text import one_line

    for line in run.table().splitlines():
        indent = len(line) - len(line.lstrip())
        print(f"{'':{indent}}{one_line(line)}")


def _standing(run: DryRun) -> int:
    if not run.found.readings:
        return NOTHING
    return SOME_REFUSED if run.found.refused else DONE


def _add(options: argparse.Namespace) -> int:
    """Add a folder to a campaign file in one undoable edit."""
    from coatgui.campaign import CampaignFile, CampaignFileError, OperationRefused, operations
    from coatgui.output.text import one_line

    try:
        with CampaignFile.open(options.campaign) as file:
            areas = {p.name: p.area_cm2 for p in file.campaign.panels if p.area_cm2 is not None}
            run = _propose(options.source, areas)
            operation = operations.import_found(file.campaign, run.found)
            if options.dry_run:
                _print_table(run)
                print(f"Would be done: {one_line(operation.name)}.")
            else:
                file.apply(operation)
                print(f"{one_line(operation.name)}.")
    except (CampaignFileError, OperationRefused) as error:
        raise Stop(str(error)) from None
    for refusal in run.found.refused:
        _say(f"refused {refusal.file}: {refusal.reason}")
    return _standing(run)


def _outputs(options: argparse.Namespace) -> None:
    """Find wrong output paths before the work begins. Raises Stop."""
    seen: dict[Path, str] = {}
    for name in ("campaign", "json", "workbook", "summary"):
        path: Path | None = getattr(options, name)
        if path is None:
            continue
        if not path.parent.is_dir():
            raise Stop(f"--{name}: there is no folder '{path.parent}'; make it first.")
        if path.is_dir():
            raise Stop(f"--{name}: '{path}' is a folder; give a file's name.")
        if not os.access(path.parent, os.W_OK):
            raise Stop(f"--{name}: the folder '{path.parent}' cannot be written to.")
        place = path.resolve()
        if place in seen:
            raise Stop(f"--{name} and --{seen[place]} name the same file.")
        if place == options.source.resolve():
            raise Stop(f"--{name} would overwrite the source.")
        seen[place] = name
    if options.campaign is not None and options.campaign.suffix != ENDING:
        raise Stop(f"--campaign: a campaign file's name ends in {ENDING}.")
    if options.summary is not None and options.summary.suffix.lower() not in _SUMMARIES:
        raise Stop("--summary: the file's name ends in .pdf or .html.")
    for name in ("figures", "tables"):
        folder: Path | None = getattr(options, name)
        if folder is not None and folder.exists() and not folder.is_dir():
            raise Stop(f"--{name}: '{folder}' is a file; give a folder's name.")
        if folder is not None and not folder.parent.is_dir():
            raise Stop(f"--{name}: there is no folder '{folder.parent}'; make it first.")
    _qt_if_needed(options)
    if options.workers is not None and options.workers < 1:
        raise Stop("--workers: at least 1.")


def _qt_if_needed(options: argparse.Namespace) -> None:
    """Find out before the work begins whether pages can be painted. Raises Stop."""
    pages = options.summary is not None and options.summary.suffix.lower() == ".pdf"
    if pages or (options.figures is not None and options.figure_format != "svg"):
        from coatgui.output import PagesUnavailable, require_qt

        try:
            require_qt()
        except PagesUnavailable as error:
            raise Stop(str(error)) from None


class _Shown:
    """Progress on one line of the terminal; silent elsewhere."""

    def __init__(self, quiet: bool) -> None:
        self.on = not quiet and sys.stderr.isatty()

    def __call__(self, stage: str, done: int, total: int) -> None:
        if self.on:
            print(f"\r{stage}: {done} of {total}\x1b[K", end="", file=sys.stderr, flush=True)

    def end(self) -> None:
        if self.on:
            print("\r\x1b[K", end="", file=sys.stderr, flush=True)


def _assess(options: argparse.Namespace) -> int:
    from coatgui.campaign import CampaignFile, CampaignFileError, campaign_from_found
    from coatgui.intake import UnreadableFolder, read_folder
    from coatgui.progress import Progress

    _outputs(options)
    source: Path = options.source
    if not source.exists():
        raise Stop(f"there is no '{source}': check the path.")
    if options.dry_run:
        run = _propose(source)
        _print_table(run)
        return _standing(run)
    shown = _Shown(options.quiet)
    progress = Progress(shown)
    try:
        if source.is_dir():
            found = read_folder(source, progress=progress)
            campaign = campaign_from_found(found, source.resolve().name)
            return _finish(options, campaign, None, found, progress, shown)
        with CampaignFile.open(source) as file:
            return _finish(options, file.campaign, file, None, progress, shown)
    except (UnreadableFolder, CampaignFileError) as error:
        raise Stop(str(error)) from None
    except OSError as error:
        raise Stop(f"a file could not be read or written: {error}.") from None
    finally:
        shown.end()


def _finish(
    options: argparse.Namespace,
    campaign: Campaign,
    cache: CampaignFile | None,
    found: Found | None,
    progress: Progress,
    shown: _Shown,
) -> int:
    from coatgui.assessment import assess
    from coatgui.campaign import CampaignFile
    from coatgui.jobs import spread_over_processes
    from coatgui.output import (
        Identification,
        terminal_table,
        write_figures,
        write_json,
        write_summary,
        write_tables,
        write_workbook,
    )

    refused = campaign.refused
    if not campaign.readings:
        for refusal in refused:
            _say(f"refused {refusal.file}: {refusal.reason}")
        raise Stop(f"nothing usable in '{options.source}'.")
    with spread_over_processes(options.workers) as spread:
        assessment = assess(campaign, progress=progress, spread=spread, cache=cache)
    shown.end()
    if options.campaign is not None:
        if found is not None:
            CampaignFile.create(options.campaign, campaign, found.raw, replace=True).close()
        elif cache is not None:
            cache.save_copy(options.campaign, replace=True)
    if options.json is not None:
        write_json(assessment, options.json)
    if options.workbook is not None:
        write_workbook(
            assessment, campaign, options.workbook, spectra=True if options.spectra else None
        )
    if options.summary is not None:
        told = {field: getattr(options, field) for field in _FIELDS}
        identification = Identification.of(campaign, **told)
        write_summary(assessment, campaign, options.summary, identification)
    if options.figures is not None:
        write_figures(assessment, campaign, options.figures, options.figure_format)
    if options.tables is not None:
        write_tables(assessment, campaign, options.tables)
    if not options.quiet:
        print(terminal_table(assessment))
    for refusal in refused:
        _say(f"refused {refusal.file}: {refusal.reason}")
    return SOME_REFUSED if refused else DONE
