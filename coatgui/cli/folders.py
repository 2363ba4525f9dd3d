"""Files of a folder on their way into a campaign: what is said of them, and the dry run."""

from __future__ import annotations

import argparse
from collections.abc import Callable
from pathlib import Path
from typing import TYPE_CHECKING

from coatgui.cli.calls import DONE, NOTHING, SOME_REFUSED, Stop, say

if TYPE_CHECKING:
    from datetime import datetime

    from coatgui.intake import DryRun, Told


def told_of(options: argparse.Namespace, areas_cm2: dict[str, float] | None = None) -> Told:
    """What the call says of a folder's files. Raises Stop."""
    from coatgui.intake import NamePattern, Told

    pattern = None
    if options.names:
        try:
            pattern = NamePattern.marked(options.names, options.time_unit)
        except ValueError as error:
            raise Stop(f"--names: {error}") from None
    told = Told(pattern=pattern, started=_started(options.started), areas_cm2=areas_cm2 or {})
    if options.corrections is not None:
        told = _with_corrections(options, told)
    return told


def _started(given: list[str]) -> dict[str, datetime]:
    from coatgui.intake.labels import moment_in

    started = {}
    for text in given:
        panel, _, date = text.rpartition("=")
        moment, unsure = moment_in(date)
        if moment is None or unsure:
            raise Stop(f"--started: '{date}' is no date; write it like 2026-03-01.")
        started[panel.strip()] = moment
    return started


def _with_corrections(options: argparse.Namespace, told: Told) -> Told:
    from dataclasses import replace

    from coatgui.intake import Unreadable, read_corrections

    run = propose(options.source, told)
    areas = {p.panel: p.area_cm2 for p in run.found.panels if p.area_cm2 is not None}
    try:
        data = options.corrections.read_bytes()
        said = read_corrections(data, run, _bytes_of(options.source), {**told.areas_cm2, **areas})
    except OSError as error:
        raise Stop(f"--corrections: the file cannot be opened: {error.strerror}.") from None
    except Unreadable as problem:
        raise Stop(f"--corrections: {problem}") from None
    return replace(told, corrections=said)


def _bytes_of(folder: Path) -> Callable[[str], bytes]:
    return lambda name: (folder / name).read_bytes()


def propose(folder: Path, told: Told) -> DryRun:
    """What each file of a folder would become. Raises Stop."""
    from coatgui.intake import UnreadableFolder, propose_folder

    try:
        return propose_folder(folder, told=told)
    except UnreadableFolder as error:
        raise Stop(str(error)) from None


def show(run: DryRun, options: argparse.Namespace) -> None:
    """Print the dry run, and write it as a table where that is wanted. Raises Stop."""
    from coatgui.intake import corrections_table
    from coatgui.output.text import one_line
    from coatgui.output.whole import write_whole

    for line in run.table().splitlines():
        indent = len(line) - len(line.lstrip())
        print(f"{'':{indent}}{one_line(line)}")
    if options.proposals is None:
        return
    content = corrections_table(run, _bytes_of(options.source))
    try:
        write_whole(options.proposals, lambda file: file.write(content))
    except OSError as error:
        raise Stop(f"--proposals: the file cannot be written: {error.strerror}.") from None


def standing(run: DryRun) -> int:
    """The exit status of a dry run."""
    if not run.found.readings:
        return NOTHING
    return SOME_REFUSED if run.found.refused else DONE


def add(options: argparse.Namespace) -> int:
    """Add a folder to a campaign file in one undoable edit. Raises Stop."""
    from coatgui.campaign import CampaignFile, CampaignFileError, OperationRefused, operations
    from coatgui.output.text import one_line

    refuse_mixture(options)
    try:
        with CampaignFile.open(options.campaign) as file:
            areas = {p.name: p.area_cm2 for p in file.campaign.panels if p.area_cm2 is not None}
            run = propose(options.source, told_of(options, areas))
            operation = operations.import_found(file.campaign, run.found)
            if options.dry_run:
                show(run, options)
                print(f"Would be done: {one_line(operation.name)}.")
            else:
                file.apply(operation)
                print(f"{one_line(operation.name)}.")
    except (CampaignFileError, OperationRefused) as error:
        raise Stop(str(error)) from None
    for refusal in run.found.refused:
        say(f"refused {refusal.file}: {refusal.reason}")
    return standing(run)


def refuse_mixture(options: argparse.Namespace) -> None:
    """What is said of a folder's files makes no sense of a campaign's. Raises Stop."""
    if options.proposals is not None and not options.dry_run:
        raise Stop("--proposals goes with --dry-run.")
    said = options.names or options.corrections or options.started or options.dry_run
    if said and options.source.is_file():
        raise Stop("--dry-run, --names, --started and --corrections are for a folder.")
