"""The desk: what is being worked on. It holds the campaign file, the assessment and the selection,
starts background work, and tells the views what changed. No view owns any of it."""

from __future__ import annotations

import shutil
import tempfile
from collections.abc import Callable
from pathlib import Path
from typing import Any

from PySide6.QtCore import QObject, QTimer, Signal

from coatgui.campaign import CampaignFile, CampaignFileError, Change, Operation
from coatgui.intake import DryRun, UnreadableFolder
from coatgui.jobs import Job, run_in_background
from coatgui.progress import Cancelled
from coatgui.records import Assessment, Campaign, Found, Reading, ReadingAssessment, Severity
from coatgui.window import desk_work as work

_POLL_MS = 60


class Desk(QObject):
    """Signals: `campaign_changed` when the campaign is another or was edited, `assessed` when a
    new assessment is there, `selected` with a reading's id, `worked` with what a job is doing
    ("" when idle), `offered` with a folder to be opened and what is proposed, where something in it
    is doubtful, `told` with a sentence for the status line, `failed` with one that a person must
    see: something that was asked for was not done."""

    campaign_changed = Signal()
    assessed = Signal()
    selected = Signal(str)
    worked = Signal(str, int, int)
    offered = Signal(Path, object)
    told = Signal(str)
    failed = Signal(str)

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
        self._importing = function in (work.bring_in, work.walk_to)
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
        if isinstance(error, (UnreadableFolder, CampaignFileError, OSError)):
            self.failed.emit(str(error))
        elif error is not None:
            self.failed.emit(f"That went wrong in a way it should not: {error}")
            # What fails beyond explanation would fail again.
            self._stale = False
        elif self._then is not None:
            self._then(job.result)
        if self.job is None and self._stale:
            self.judge()  # the work just done had put the judging aside
        while self.job is None and self._waiting:
            self._waiting.pop(0)()

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

    def open(self, path: Path) -> None:
        """Open a campaign file, or a folder as a new campaign that is not saved yet."""
        if path.is_dir():
            folder = Path(tempfile.mkdtemp(prefix="coatgui-"))

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
            self._start(lambda file: self._take(file, None), work.open_file, path)

    def create(self, found: Found, title: str, origin: Path | None) -> None:
        """Make a new campaign, not saved yet, of what was found (in the folder `origin`)."""
        folder = Path(tempfile.mkdtemp(prefix="coatgui-"))
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
        self._put_aside()
        try:
            self.file.save_copy(path, replace=True)
            file = CampaignFile.open(path)
        except (CampaignFileError, OSError) as error:
            self.failed.emit(str(error))
        else:
            selection, assessment, stale = self.selection, self.assessment, self._stale
            self.close()
            self.file, self.selection, self.assessment = file, selection, assessment
            self._stale = stale
            self.campaign_changed.emit()
            self.told.emit(f"Saved as {path.name}.")
        if self._stale:
            self.judge()

    def close(self) -> None:
        """Put the campaign away; what was never saved is deleted."""
        self._put_aside()
        self._waiting.clear()
        self._stale = self._halted = False
        if self.file is not None:
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
        self._change(lambda: file.apply(make(file.campaign, *arguments, **keywords)), "{}")

    def undo(self) -> None:
        if self.file is not None:
            self._change(self.file.undo, "Undone: {}")

    def redo(self) -> None:
        if self.file is not None:
            self._change(self.file.redo, "Done again: {}")

    def go_to(self, step: int) -> None:
        """Go back or forward to a step of the history (0: before the first edit)."""
        if self.file is None or step == (self.file.step or 0) or self._must_wait():
            return

        def gone(change: Change | None) -> None:
            if change is not None:
                self._changed("The campaign is as it was at that step; redo goes forward again.")

        self._start(gone, work.walk_to, self.file, step)

    def _change(self, make: Callable[[], Change | None], words: str) -> None:
        if self._must_wait():
            return
        try:
            change = make()
        except CampaignFileError as error:
            self.failed.emit(str(error))
            return
        if change is not None and change.kinds:
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

        assessment, campaign = self.assessment, self.campaign
        ways: dict[str, tuple[str, tuple[Any, ...]]] = {
            ".json": ("write_json", (assessment,)),
            ".pdf": ("write_summary", (assessment, campaign)),
            ".html": ("write_summary", (assessment, campaign)),
        }
        write, arguments = ways.get(path.suffix.lower(), ("write_workbook", (assessment, campaign)))
        self._start(written, work.export_to, write, arguments, path)
