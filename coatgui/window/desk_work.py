"""What the desk has done in the background, one function for each; `progress` is where it reports
and where it is stopped."""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path

from coatgui.campaign import (
    CampaignFile,
    Change,
    Recovered,
    campaign_from_found,
    operations,
    recover,
)
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


def save_to(
    file: CampaignFile, path: Path, progress: Progress
) -> tuple[CampaignFile, tuple[str, ...]]:
    """The copy, opened, and what is missing in it."""
    progress.at("Saving the campaign", 0, 1)
    missing = file.save_copy(path, replace=True)
    return CampaignFile.open(path), missing


def recover_to(path: Path, target: Path, progress: Progress) -> tuple[CampaignFile, Recovered]:
    progress.at("Recovering the campaign", 0, 1)
    found = recover(path, target, replace_target=True)
    return CampaignFile.open(target), found


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


def export_to(
    assessment: Assessment,
    campaign: Campaign,
    photographs: Mapping[str, bytes],
    path: Path,
    progress: Progress,
) -> Path:
    """Write the workbook, the inspection summary (PDF, HTML) or the JSON, by the ending."""
    # Late, as above.
    from coatgui.output import write_json, write_summary, write_workbook

    progress.at("Writing the file", 0, 1)
    match path.suffix.lower():
        case ".json":
            write_json(assessment, path)
        case ".pdf" | ".html":
            write_summary(assessment, campaign, path, None, photographs)
        case _:
            write_workbook(assessment, campaign, path)
    return path
