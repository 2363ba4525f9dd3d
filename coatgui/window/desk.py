"""The desk: what is being worked on. It holds the campaign file, the assessment and the selection,
starts background work, and tells the views what changed. No view owns any of it."""

from __future__ import annotations

import shutil
import tempfile
from collections.abc import Callable, Sequence
from pathlib import Path
from typing import Any

from PySide6.QtCore import QObject, QTimer, Signal

from coatgui.assessment import assess
from coatgui.campaign import (
    CampaignFile,
    CampaignFileError,
    Operation,
    campaign_from_found,
    operations,
)
from coatgui.intake import UnreadableFolder, read_files, read_folder
from coatgui.jobs import Job, run_in_background, spread_over_processes
from coatgui.output import write_json, write_workbook
from coatgui.progress import Cancelled, Progress
from coatgui.records import Assessment, Campaign, Found, Reading, ReadingAssessment

_POLL_MS = 60


def _assess(campaign: Campaign, file: CampaignFile, progress: Progress) -> Assessment:
    with spread_over_processes(progress=progress) as spread:
        return assess(campaign, progress=progress, spread=spread, cache=file)


def _open_folder(folder: Path, target: Path, progress: Progress) -> CampaignFile:
    found = read_folder(folder, progress=progress)
    return CampaignFile.create(target, campaign_from_found(found, folder.name), found.raw)


def _open_file(path: Path, progress: Progress) -> CampaignFile:
    progress.at("Opening the campaign", 0, 1)
    return CampaignFile.open(path)


def _read(paths: Sequence[Path], progress: Progress) -> list[Found]:
    folders = [path for path in paths if path.is_dir()]
    files = [path for path in paths if not path.is_dir()]
    found = [read_folder(folder, progress=progress) for folder in folders]
    return [*found, read_files(files, progress=progress)] if files else found


def _export(
    write: Callable[..., None], arguments: tuple[Any, ...], path: Path, progress: Progress
) -> Path:
    progress.at("Writing the file", 0, 1)
    write(*arguments, path)
    return path


class Desk(QObject):
    """Signals: `campaign_changed` when the campaign is another or was edited, `assessed` when a
    new assessment is there, `selected` with a reading's id, `worked` with what a job is doing
    ("" when idle), `told` with a sentence for the status line."""

    campaign_changed = Signal()
    assessed = Signal()
    selected = Signal(str)
    worked = Signal(str, int, int)
    told = Signal(str)

    def __init__(self, parent: QObject | None = None) -> None:
        super().__init__(parent)
        self.file: CampaignFile | None = None
        self.assessment: Assessment | None = None
        self.selection = ""
        self.unsaved_folder: Path | None = None
        self.job: Job | None = None
        self._then: Callable[[Any], None] | None = None
        self._again = False
        self._timer = QTimer(self)
        self._timer.setInterval(_POLL_MS)
        self._timer.timeout.connect(self._poll)

    @property
    def campaign(self) -> Campaign | None:
        return None if self.file is None else self.file.campaign

    @property
    def is_saved(self) -> bool:
        return self.file is None or self.unsaved_folder is None

    def reading(self) -> Reading | None:
        campaign = self.campaign
        if campaign is None:
            return None
        return next((r for r in campaign.readings if r.reading_id == self.selection), None)

    def reading_assessment(self) -> ReadingAssessment | None:
        return None if self.assessment is None else self.assessment.reading(self.selection)

    # --- background work -------------------------------------------------------------------

    def _start(self, then: Callable[[Any], None], function: Callable[..., Any], *a: Any) -> None:
        if self.job is not None:
            self.job.cancel()
            self.job.wait(30.0)
        self._then = then
        self.job = run_in_background(function, *a)
        self._timer.start()

    def _poll(self) -> None:
        job = self.job
        if job is None:
            self._timer.stop()
            return
        standing = job.progress
        self.worked.emit(standing.stage, standing.done, standing.total)
        if not job.done:
            return
        self._timer.stop()
        self.job = None
        self.worked.emit("", 0, 0)
        error = job.error
        if job.cancelled or isinstance(error, Cancelled):
            self.told.emit("Stopped; nothing was half-written.")
        elif isinstance(error, (UnreadableFolder, CampaignFileError, OSError)):
            self.told.emit(str(error))
        elif error is not None:
            self.told.emit(f"That went wrong in a way it should not: {error}")
        elif self._then is not None:
            self._then(job.result)

    def stop(self) -> None:
        """Give up the work under way."""
        if self.job is not None:
            self.job.cancel()

    # --- campaigns -------------------------------------------------------------------------

    def open(self, path: Path) -> None:
        """Open a campaign file, or a folder as a new campaign that is not saved yet."""
        if path.is_dir():
            folder = Path(tempfile.mkdtemp(prefix="coatgui-"))

            def opened(file: CampaignFile) -> None:
                self._take(file, folder)

            self._start(opened, _open_folder, path, folder / f"{path.name or 'campaign'}.coatgui")
        else:
            self._start(lambda file: self._take(file, None), _open_file, path)

    def _take(self, file: CampaignFile, folder: Path | None) -> None:
        self.close()
        self.file, self.unsaved_folder = file, folder
        readings = file.campaign.readings
        first = min(readings, key=lambda r: r.exposure_h, default=None)
        self.selection = "" if first is None else first.reading_id
        self.campaign_changed.emit()
        refused = len(file.campaign.refused)
        if refused:
            files = "1 file was" if refused == 1 else f"{refused} files were"
            self.told.emit(f"{files} refused; Doubts says which and why.")
        self.judge()

    def save_as(self, path: Path) -> None:
        """Keep the campaign under another name and go on with that file."""
        if self.file is None:
            return
        self.stop()
        if self.job is not None:
            self.job.wait(30.0)
        try:
            self.file.save_copy(path, replace=True)
            file = CampaignFile.open(path)
        except (CampaignFileError, OSError) as error:
            self.told.emit(str(error))
            return
        selection, assessment = self.selection, self.assessment
        self.close()
        self.file, self.selection, self.assessment = file, selection, assessment
        self.campaign_changed.emit()
        if assessment is not None:
            self.assessed.emit()
        self.told.emit(f"Saved as {path.name}.")

    def close(self) -> None:
        """Put the campaign away; what was never saved is deleted."""
        if self.job is not None:
            self.job.cancel()
            self.job.wait(30.0)
            self.job = None
        self._timer.stop()
        if self.file is not None:
            self.file.close()
        if self.unsaved_folder is not None:
            shutil.rmtree(self.unsaved_folder, ignore_errors=True)
        self.file, self.assessment, self.unsaved_folder, self.selection = None, None, None, ""

    def judge(self) -> None:
        """Assess the campaign in the background."""
        if self.file is not None and self.file.campaign.readings:
            self._start(self._judged, _assess, self.file.campaign, self.file)

    def _judged(self, assessment: Assessment) -> None:
        self.assessment = assessment
        self.assessed.emit()

    # --- edits -----------------------------------------------------------------------------

    def edit(self, make: Callable[..., Operation], *arguments: Any, **keywords: Any) -> None:
        """Carry out one named operation and judge anew."""
        if self.file is None:
            return
        try:
            change = self.file.apply(make(self.file.campaign, *arguments, **keywords))
        except CampaignFileError as error:
            self.told.emit(str(error))
            return
        self._changed(change.name)

    def undo(self) -> None:
        if self.file is not None and (change := self.file.undo()) is not None:
            self._changed(f"Undone: {change.name}")

    def redo(self) -> None:
        if self.file is not None and (change := self.file.redo()) is not None:
            self._changed(f"Done again: {change.name}")

    def _changed(self, words: str) -> None:
        self.campaign_changed.emit()
        self.told.emit(words)
        self.judge()

    def bring_in(self, paths: Sequence[Path]) -> None:
        """Add files and folders to the campaign, or start one from them where there is none."""
        if self.file is None and len(paths) == 1:
            self.open(paths[0])
            return
        if self.file is None:
            self.told.emit("Open a folder or a campaign first, then drop files onto it.")
            return

        def read(found: list[Found]) -> None:
            for each in found:
                self.edit(operations.import_found, each)

        self._start(read, _read, list(paths))

    # --- selection and output --------------------------------------------------------------

    def select(self, reading_id: str) -> None:
        if reading_id and reading_id != self.selection:
            self.selection = reading_id
            self.selected.emit(reading_id)

    def step(self, by: int) -> None:
        """Go to the panel's next or previous inspection."""
        campaign, reading = self.campaign, self.reading()
        if campaign is None or reading is None:
            return
        own = [r for r in campaign.readings if r.panel_id == reading.panel_id]
        own.sort(key=lambda r: r.exposure_h)
        place = own.index(reading) + by
        if 0 <= place < len(own):
            self.select(own[place].reading_id)

    def export(self, path: Path) -> None:
        """Write the workbook or the JSON, by the ending of the name."""
        if self.assessment is None or self.campaign is None:
            self.told.emit("There is nothing to write yet: wait for the assessment.")
            return

        def written(where: Path) -> None:
            self.told.emit(f"Written: {where.name}")

        if path.suffix == ".json":
            self._start(written, _export, write_json, (self.assessment,), path)
        else:
            self._start(written, _export, write_workbook, (self.assessment, self.campaign), path)
