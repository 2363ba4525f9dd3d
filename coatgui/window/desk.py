"""The desk: what is being worked on. It holds the campaign file, the assessment and the selection,
starts background work, and tells the views what changed. No view owns any of it."""

from __future__ import annotations

import shutil
import tempfile
from collections.abc import Callable
from pathlib import Path
from typing import Any

from PySide6.QtCore import QEventLoop, QObject, QTimer, Signal

from coatgui.campaign import (
    CampaignDamaged,
    CampaignFile,
    CampaignFileError,
    Change,
    Operation,
    Recovered,
    StorageFailed,
)
from coatgui.intake import DryRun, UnreadableFolder
from coatgui.jobs import Job, run_in_background
from coatgui.progress import Cancelled
from coatgui.records import Assessment, Campaign, Found, Reading, ReadingAssessment, Severity
from coatgui.window import desk_work as work
from coatgui.window.unforeseen import went_wrong

_POLL_MS = 60
_TEMPORARY = "coatgui-"


class Desk(QObject):
    """Signals: `campaign_changed` when the campaign is another or was edited, `assessed` when a
    new assessment is there, `selected` with a reading's id, `worked` with what a job is doing
    ("" when idle), `offered` with a folder to be opened and what is proposed, where something in it
    is doubtful, `told` with a sentence for the status line, `failed` with one that a person must
    see: something that was asked for was not done. `edited` says what was done and what it changed,
    `closing` that the file is about to be put away, `unkept` that a disk failed, `broken` that a
    campaign file is damaged, `recovered` what was saved from the file of that name,
    `files_wanted` that a person wants to bring in files."""

    campaign_changed = Signal()
    assessed = Signal()
    selected = Signal(str)
    worked = Signal(str, int, int)
    offered = Signal(Path, object)
    told = Signal(str)
    failed = Signal(str)
    edited = Signal(str, object)
    closing = Signal()
    unkept = Signal(str)
    broken = Signal(Path, str)
    recovered = Signal(object, str)
    files_wanted = Signal()

    def __init__(self, parent: QObject | None = None) -> None:
        super().__init__(parent)
        self.file: CampaignFile | None = None
        self.assessment: Assessment | None = None
        self._inspections_of: tuple[Reading, ...] = ()  # in which the panels' readings are these
        self._inspections: dict[str, list[Reading]] = {}
        self._judged_of: Assessment | None = None
        self._known: dict[str, ReadingAssessment] = {}
        self.selection = ""
        self.unsaved_folder: Path | None = None
        self.origin: Path | None = None  # the folder that the campaign was made of just now
        self.job: Job | None = None
        self._opening: Path | None = None  # the file that was asked for last
        self._then: Callable[[Any], None] | None = None
        self._stale = False  # the assessment is not of the campaign as it is now
        self._halted = False  # a person stopped the judging
        self._importing = False  # the campaign is being changed: not to be put aside
        self._waiting: list[Callable[[], None]] = []
        self._timer = QTimer(self)
        self._timer.setInterval(_POLL_MS)
        self._timer.timeout.connect(self._poll)

    @property
    def campaign(self) -> Campaign | None:
        return None if self.file is None else self.file.campaign

    @property
    def is_saved(self) -> bool:
        return self.file is None or self.unsaved_folder is None

    @property
    def is_halted(self) -> bool:
        """Whether a person stopped the judging."""
        return self._halted

    def reading(self) -> Reading | None:
        """The picked reading."""
        campaign = self.campaign
        if campaign is None:
            return None
        return campaign.reading(self.selection)

    def reading_assessment(self) -> ReadingAssessment | None:
        """What is known of the picked reading."""
        return self.judged(self.selection)

    def judged(self, reading_id: str) -> ReadingAssessment | None:
        """What is known of a reading, without going through all of them."""
        if self.assessment is None:
            return None
        if self._judged_of is not self.assessment:
            self._judged_of = self.assessment
            self._known = {r.reading_id: r for r in self.assessment.readings}
        return self._known.get(reading_id)

    def has_doubts(self) -> bool:
        """Whether anything waits for a person's eye."""
        if self.campaign is not None and self.campaign.refused:
            return True
        readings = () if self.assessment is None else self.assessment.readings
        return any(f.severity is not Severity.NOTE for r in readings for f in r.findings)

    def inspections(self, panel_id: str) -> list[Reading]:
        """The readings of a panel by exposure time, without going through all of them."""
        campaign = self.campaign
        if campaign is None:
            return []
        if self._inspections_of is not campaign.readings:
            self._inspections_of, self._inspections = campaign.readings, {}
            for reading in sorted(campaign.readings, key=lambda r: r.exposure_h):
                self._inspections.setdefault(reading.panel_id, []).append(reading)
        return self._inspections.get(panel_id, [])

    def unjudged_words(self) -> str:
        """What stands where an assessment is missing."""
        if self._halted:
            return "The readings have not been judged: F5 judges them."
        if self.campaign is not None and not self.campaign.readings:
            return "No readings yet: bring in files with spectra, or drop them here."
        return "The readings are being judged …"

    # --- background work -------------------------------------------------------------------

    def _start(self, then: Callable[[Any], None], function: Callable[..., Any], *a: Any) -> None:
        self._put_aside()
        self._importing = function in (work.bring_in, work.walk_to, work.save_to)
        self._then = then
        self.job = run_in_background(function, *a)
        self._timer.start()
        self.worked.emit("Beginning", 0, 0)

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
        self.job, self._importing = None, False
        self.worked.emit("", 0, 0)
        error = job.error
        if job.cancelled or isinstance(error, Cancelled):
            self._waiting.clear()
            self._halted = True
            self.told.emit("Stopped; nothing was half-written.")
            self.campaign_changed.emit()
            return
        if error is not None:
            self._say(error)
            self._opening = None
            if self.file is None:
                self.campaign_changed.emit()  # what was open has been put away
            if not isinstance(error, (UnreadableFolder, CampaignFileError, OSError)):
                # What fails beyond explanation would fail again.
                self._stale = False
        elif self._then is not None:
            self._then(job.result)
        if self.job is None and self._stale:
            self.judge()  # the work just done had put the judging aside
        while self.job is None and self._waiting:
            self._waiting.pop(0)()

    def _say(self, error: BaseException) -> None:
        """Tell a person what went wrong, and what can be done about it."""
        if isinstance(error, CampaignDamaged):
            self.broken.emit(self._opening or (self.file.path if self.file else Path()), str(error))
        elif isinstance(error, StorageFailed) and self.file is not None:
            self.unkept.emit(str(error))
        elif isinstance(error, OSError):
            what = f"{Path(error.filename).name}: " if error.filename else ""
            self.failed.emit(f"That could not be done ({what}{error.strerror or error}).")
        elif isinstance(error, (UnreadableFolder, CampaignFileError)):
            self.failed.emit(str(error))
        else:
            self.failed.emit(went_wrong(error))

    def stop(self) -> None:
        """Give up the work under way."""
        if self.job is not None:
            self.job.cancel()

    def _must_wait(self) -> bool:
        """Whether the campaign is being changed in the background; says so."""
        if self._importing:
            self.failed.emit("The campaign is being changed: try again when that is done.")
        return self._importing

    def _put_aside(self) -> bool:
        """End the work under way at once, without a word; True where there was any."""
        if self.job is None:
            return False
        self.job.cancel()
        self.job.wait(30.0)
        self.job, self._importing = None, False
        self._timer.stop()
        self.worked.emit("", 0, 0)
        return True

    # --- campaigns -------------------------------------------------------------------------

    def open(self, path: Path, *, unsaved: bool = False) -> None:
        """Open a campaign file, or a folder as a new campaign that is not saved yet. `unsaved`: the
        file lies in a temporary folder of the program's own, since it was never saved."""
        self._opening = path
        if path.is_dir():
            folder = Path(tempfile.mkdtemp(prefix=_TEMPORARY))

            def opened(found: CampaignFile | DryRun) -> None:
                if isinstance(found, CampaignFile):
                    self._take(found, folder, path)
                else:
                    shutil.rmtree(folder, ignore_errors=True)
                    self.offered.emit(path, found)

            self._start(
                opened, work.open_folder, path, folder / f"{path.name or 'campaign'}.coatgui"
            )
        else:
            # Only a folder that the program made itself is removed with what it holds.
            own = unsaved and path.parent.name.startswith(_TEMPORARY)
            kept_in = path.parent if own else None
            if self.file is not None and self.file.path == path.absolute():
                self.close()  # or it would be found in use, by this window
            self._start(lambda file: self._take(file, kept_in), work.open_file, path)

    def create(self, found: Found, title: str, origin: Path | None) -> None:
        """Make a new campaign, not saved yet, of what was found (in the folder `origin`)."""
        folder = Path(tempfile.mkdtemp(prefix=_TEMPORARY))
        target = folder / f"{title.replace('/', '-')}.coatgui"
        self._start(
            lambda file: self._take(file, folder, origin),
            work.create_campaign,
            found,
            title,
            target,
        )

    def _take(self, file: CampaignFile, folder: Path | None, origin: Path | None = None) -> None:
        self.close()
        self._opening = None
        self.file, self.unsaved_folder, self.origin = file, folder, origin
        self._pick_first()
        self.campaign_changed.emit()
        refused = len(file.campaign.refused)
        if refused:
            files = "1 file was" if refused == 1 else f"{refused} files were"
            self.told.emit(f"{files} refused; Doubts says which and why.")
        self.judge()

    def _pick_first(self) -> None:
        readings = () if self.campaign is None else self.campaign.readings
        first = min(readings, key=lambda r: r.exposure_h, default=None)
        self.selection = "" if first is None else first.reading_id

    def save_as(self, path: Path) -> None:
        """Keep the campaign under another name and go on with that file."""
        if self.file is None or self._must_wait():
            return
        if self.is_saved and self.file.path == path.absolute():
            self.told.emit(f"{path.name} holds every edit already.")
            return

        def saved(result: tuple[CampaignFile, tuple[str, ...]]) -> None:
            file, missing = result
            selection, assessment, stale = self.selection, self.assessment, self._stale
            self.close()
            self.file, self.selection, self.assessment = file, selection, assessment
            self._stale = stale
            self.campaign_changed.emit()
            self.told.emit(f"Saved as {path.name}.")
            if missing:
                self.failed.emit(f"Saved as {path.name}. {' '.join(missing)}")

        self._start(saved, work.save_to, self.file, path)

    def wait(self) -> None:
        """Until the work under way is done; the window goes on living."""
        loop = QEventLoop()

        def look(stage: str, _done: int, _total: int) -> None:
            if not stage:
                loop.quit()

        if self.job is not None:
            self.worked.connect(look)
            loop.exec()
            self.worked.disconnect(look)

    def recover(self, path: Path, target: Path) -> None:
        """Save what can be read of a damaged file to another, and go on with that."""
        self._opening = path

        def done(result: tuple[CampaignFile, Recovered]) -> None:
            file, found = result
            self._take(file, None)
            self.recovered.emit(found, path.name)

        self._start(done, work.recover_to, path, target)

    def close(self) -> None:
        """Put the campaign away; what was never saved is deleted."""
        self._put_aside()
        self._waiting.clear()
        self._stale = self._halted = False
        if self.file is not None:
            self.closing.emit()
            self.file.close()
        if self.unsaved_folder is not None:
            shutil.rmtree(self.unsaved_folder, ignore_errors=True)
        self.file, self.assessment, self.unsaved_folder, self.selection = None, None, None, ""
        self.origin = None

    def judge(self) -> None:
        """Assess the campaign in the background."""
        if self._importing:
            return  # judging follows by itself
        if self.file is not None and self.file.campaign.readings:
            self._stale, self._halted = True, False
            self._start(self._judged, work.judge_campaign, self.file.campaign, self.file)
        elif self.file is not None:
            self._put_aside()
            self.assessment, self._stale = None, False
            self.assessed.emit()

    def _judged(self, assessment: Assessment) -> None:
        self.assessment, self._stale = assessment, False
        self.assessed.emit()

    # --- edits -----------------------------------------------------------------------------

    def edit(self, make: Callable[..., Operation], *arguments: Any, **keywords: Any) -> None:
        """Carry out one named operation and judge anew."""
        if self.file is None:
            return
        file = self.file
        self._change(
            make.__name__, lambda: file.apply(make(file.campaign, *arguments, **keywords)), "{}"
        )

    def undo(self) -> None:
        if self.file is not None:
            self._change("undo", self.file.undo, "Undone: {}")

    def redo(self) -> None:
        if self.file is not None:
            self._change("redo", self.file.redo, "Done again: {}")

    def go_to(self, step: int) -> None:
        """Go back or forward to a step of the history (0: before the first edit)."""
        if self.file is None or step == (self.file.step or 0) or self._must_wait():
            return

        def gone(change: Change | None) -> None:
            if change is not None:
                self.edited.emit("walk", change)
                self._changed("The campaign is as it was at that step; redo goes forward again.")

        self._start(gone, work.walk_to, self.file, step)

    def _change(self, what: str, make: Callable[[], Change | None], words: str) -> None:
        if self._must_wait():
            return
        try:
            change = make()
        except CampaignFileError as error:
            self._say(error)
            return
        if change is not None and change.kinds:
            self.edited.emit(what, change)
            self._changed(words.format(change.name))
        elif change is not None:
            self.told.emit(change.name)

    def _changed(self, words: str) -> None:
        self._stale = True
        if self.reading() is None:
            self._pick_first()
        self.campaign_changed.emit()
        self.told.emit(words)
        self.judge()

    def import_found(self, found: Found) -> None:
        """Add what was found to the campaign, in the background, as one operation."""
        if self.file is None or self._must_wait():
            return

        def done(change: Change) -> None:
            if change.kinds:
                self.edited.emit("import", change)
                self._changed(change.name)
            else:
                self.told.emit(change.name)

        self._start(done, work.bring_in, self.file, found)

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
        """Write the workbook, the inspection summary (PDF, HTML) or the JSON, by the ending of the
        name."""
        if self.job is not None:
            self._waiting.append(lambda: self.export(path))
            self.told.emit(f"{path.name} will be written when the work under way is done.")
            return
        if self.assessment is None or self.campaign is None or self._stale:
            self.failed.emit("There is nothing to write: the readings have not been judged.")
            return

        def written(where: Path) -> None:
            self.told.emit(f"Written: {where.name}")

        judged = (self.assessment, self.campaign, self.photographs())
        self._start(written, work.export_to, *judged, path)

    def photographs(self) -> dict[str, bytes]:
        """The bytes of the campaign's photographs by their SHA-256; where the file no longer gives
        them, that is said."""
        try:
            return {} if self.file is None else self.file.photographs()
        except CampaignFileError as error:
            self.failed.emit(str(error))
            return {}
