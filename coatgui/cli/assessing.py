"""Assessing a campaign or a folder, and writing all that is asked for."""

from __future__ import annotations

import argparse
import os
import sys
from pathlib import Path
from typing import TYPE_CHECKING

from coatgui.cli.calls import DONE, ENDING, FIELDS, SOME_REFUSED, Stop, say
from coatgui.cli.folders import propose, refuse_mixture, show, standing, told_of

if TYPE_CHECKING:
    from coatgui.campaign import CampaignFile
    from coatgui.progress import Progress
    from coatgui.records import Campaign, Found

_SUMMARIES = (".pdf", ".html", ".htm")


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


def assess(options: argparse.Namespace) -> int:
    """Raises Stop."""
    from coatgui.campaign import CampaignFile, CampaignFileError, campaign_from_found
    from coatgui.intake import UnreadableFolder, read_folder
    from coatgui.progress import Progress

    _outputs(options)
    source: Path = options.source
    if not source.exists():
        raise Stop(f"there is no '{source}': check the path.")
    refuse_mixture(options)
    if options.dry_run:
        run = propose(source, told_of(options))
        show(run, options)
        return standing(run)
    shown = _Shown(options.quiet)
    progress = Progress(shown)
    try:
        if source.is_dir():
            found = read_folder(source, told=told_of(options), progress=progress)
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
    from coatgui.assessment import assess as assessed
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
            say(f"refused {refusal.file}: {refusal.reason}")
        raise Stop(f"nothing usable in '{options.source}'.")
    with spread_over_processes(options.workers) as spread:
        assessment = assessed(campaign, progress=progress, spread=spread, cache=cache)
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
        told = {field: getattr(options, field) for field in FIELDS}
        identification = Identification.of(campaign, **told)
        kept = {} if cache is None else cache.photographs()
        write_summary(assessment, campaign, options.summary, identification, kept)
    if options.figures is not None:
        write_figures(assessment, campaign, options.figures, options.figure_format)
    if options.tables is not None:
        write_tables(assessment, campaign, options.tables)
    if not options.quiet:
        print(terminal_table(assessment))
    for refusal in refused:
        say(f"refused {refusal.file}: {refusal.reason}")
    return SOME_REFUSED if refused else DONE
