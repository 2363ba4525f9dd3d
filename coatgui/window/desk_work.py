"""What the desk has done in the background, one function for each; `progress` is where it reports
and where it is stopped."""

from __future__ import annotations

from importlib import import_module
from pathlib import Path
from typing import Any

from coatgui.campaign import CampaignFile, Change, campaign_from_found, operations
from coatgui.intake import DryRun, Standing, propose_folder
from coatgui.jobs import spread_over_processes
from coatgui.progress import Progress
from coatgui.records import Assessment, Campaign, Found


def judge_campaign(campaign: Campaign, file: CampaignFile, progress: Progress) -> Assessment:
    # Imported when first needed: the window is there sooner.
    from coatgui.assessment import assess

    with spread_over_processes(progress=progress) as spread:
        return assess(campaign, progress=progress, spread=spread, cache=file)


def open_folder(folder: Path, target: Path, progress: Progress) -> CampaignFile | DryRun:
    """The campaign, or what is proposed where a person should look first."""
    run = propose_folder(folder, progress=progress)
    if run.count(Standing.ASKED) or run.count(Standing.DOUBTFUL):
        return run
    return create_campaign(run.found, folder.name, target, progress)


def create_campaign(found: Found, title: str, target: Path, progress: Progress) -> CampaignFile:
    progress.at("Making the campaign", 0, 1)
    return CampaignFile.create(target, campaign_from_found(found, title), found.raw)


def bring_in(file: CampaignFile, found: Found, progress: Progress) -> Change:
    progress.at("Bringing in", 0, 1)
    return file.apply(operations.import_found(file.campaign, found))


def open_file(path: Path, progress: Progress) -> CampaignFile:
    progress.at("Opening the campaign", 0, 1)
    return CampaignFile.open(path)


def walk_to(file: CampaignFile, step: int, progress: Progress) -> Change | None:
    """Undo or redo until an edit is the newest that stands (0: none stands)."""
    progress.at("Going through the history", 0, 1)
    steps = {e.entry_id: e.state for e in file.history(with_changes=False) if e.action == "edit"}
    back = step == 0 or steps.get(step) == "done"
    kinds: set[str] = set()
    name = ""
    while (file.step or 0) != step:
        change = file.undo() if back else file.redo()
        if change is None:
            break
        kinds |= change.kinds
        name = change.name
    return Change(frozenset(kinds), name) if kinds else None


def export_to(write: str, arguments: tuple[Any, ...], path: Path, progress: Progress) -> Path:
    """`write` is the name of a function of `coatgui.output`, which is loaded here: that takes
    longer than the window may wait."""
    progress.at("Writing the file", 0, 1)
    getattr(import_module("coatgui.output"), write)(*arguments, path)
    return path
