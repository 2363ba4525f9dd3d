"""Files on their way into a campaign: looked at in the background, shown as proposals, corrected,
and only then taken, in one step that can be undone."""

from __future__ import annotations

import shutil
import tempfile
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, replace
from datetime import datetime
from pathlib import Path

from PySide6.QtCore import QObject, QTimer, Signal

from coatgui.intake import (
    Correction,
    DryRun,
    NamePattern,
    Proposal,
    Standing,
    Told,
    UnreadableFolder,
    propose_files,
    propose_folder,
)
from coatgui.jobs import Job, run_in_background
from coatgui.progress import Cancelled, Progress
from coatgui.records import Campaign, Found
from coatgui.window.desk import Desk

_POLL_MS = 40
QUESTIONABLE = (Standing.ASKED, Standing.DOUBTFUL)


@dataclass(frozen=True)
class Batch:
    """A folder, or files, of a folder perhaps, that were handed over together, and what was said
    about them. Names are those of the batch: two folders may hold files of one name."""

    folder: Path | None
    files: tuple[Path, ...]
    told: Told

    def path(self, file: str) -> Path:
        if self.folder is not None:
            return self.folder / file
        return next((path for path in self.files if path.name == file), Path(file))

    def looked_at(self, progress: Progress) -> DryRun:
        if self.folder is not None and not self.files:
            return propose_folder(self.folder, told=self.told, progress=progress)
        return propose_files(self.files, below=self.folder, told=self.told, progress=progress)


@dataclass(frozen=True)
class Row:
    """A proposal and the number of its batch."""

    batch: int
    proposal: Proposal

    @property
    def key(self) -> tuple[int, str, str]:
        return self.batch, self.proposal.file, self.proposal.part


def look(batches: Sequence[Batch], progress: Progress) -> list[DryRun]:
    """What every batch would become. Raises UnreadableFolder."""
    return [batch.looked_at(progress) for batch in batches]


def together(runs: Iterable[DryRun]) -> Found:
    """All finds as one, so that taking them is one operation."""
    found = [run.found for run in runs]
    return Found(
        tuple(panel for each in found for panel in each.panels),
        tuple(reading for each in found for reading in each.readings),
        next((each.open_lead for each in found if each.open_lead is not None), None),
        tuple(refusal for each in found for refusal in each.refused),
        {sha256: data for each in found for sha256, data in each.raw.items()},
    )


def areas_of(campaign: Campaign | None) -> dict[str, float]:
    """The areas in cm² that a campaign knows, by the names of its panels."""
    panels = () if campaign is None else campaign.panels
    return {p.name: p.area_cm2 for p in panels if p.area_cm2 is not None}


class Incoming(QObject):
    """Signals: `changed` when there are other proposals or none any more, `looking` with whether
    files are being looked at. It works beside the desk and never keeps the desk waiting."""

    changed = Signal()
    looking = Signal(bool)

    def __init__(self, desk: Desk, parent: QObject | None = None) -> None:
        super().__init__(parent)
        self.desk = desk
        self.batches: list[Batch] = []
        self.runs: list[DryRun] = []
        self.title = ""  # of the campaign to be made; "" where files are added to one
        self._pasted: Path | None = None
        self._folders: list[Path] = []  # made for what waits, and removed with it
        self._job: Job | None = None
        self._wanted: list[Batch] = []
        self._new_title = ""
        self._timer = QTimer(self)
        self._timer.setInterval(_POLL_MS)
        self._timer.timeout.connect(self._poll)
        self._campaign_id = ""
        desk.offered.connect(self._offered)
        desk.campaign_changed.connect(self._campaign_changed)

    # --- what is there ---------------------------------------------------------------------

    @property
    def is_there(self) -> bool:
        return bool(self.runs)

    @property
    def busy(self) -> bool:
        return self._job is not None

    def rows(self) -> list[Row]:
        """Every proposal, those that need a person first."""
        order = (Standing.ASKED, Standing.DOUBTFUL, Standing.REFUSED)
        found = [Row(i, p) for i, run in enumerate(self.runs) for p in run.proposals]
        found.sort(
            key=lambda row: (
                order.index(row.proposal.standing) if row.proposal.standing in order else len(order)
            )
        )
        return found

    def summary(self) -> str:
        """How many files of each standing, in one line."""
        counts = [(s, sum(run.count(s) for run in self.runs)) for s in Standing]
        return ", ".join(f"{count} {standing}" for standing, count in counts if count)

    def correction(self, row: Row) -> Correction:
        """What was said of a file, or of a part of one, so far."""
        return self.batches[row.batch].told.about(row.proposal.file, row.proposal.part)

    # --- beginning -------------------------------------------------------------------------

    def bring_in(self, paths: Sequence[Path], below: Path | None = None) -> None:
        """Look at files and folders: for the campaign that is open, or for a new one. Files in a
        folder `below` which they are chosen keep the folders between in their names."""
        areas = Told(areas_cm2=areas_of(self.desk.campaign))
        batches = [Batch(path, (), areas) for path in paths if path.is_dir()]
        files = tuple(path for path in paths if not path.is_dir())
        if files:
            batches.append(Batch(below, files, areas))
        # What waits already is not lost when more comes.
        title = ""
        if self.desk.file is None:
            title = paths[0].stem if len(paths) == 1 else paths[0].parent.name
        self._look([*self.batches, *batches], title)

    def paste(self, text: str) -> None:
        """Look at a table from the clipboard as if it were a file."""
        if not text.strip():
            self.desk.failed.emit("The clipboard holds no text: copy a table of numbers first.")
            return
        if self._pasted is None:
            self._pasted = Path(tempfile.mkdtemp(prefix="coatgui-pasted-"))
            self._folders.append(self._pasted)
        number = len(list(self._pasted.iterdir())) + 1
        path = self._pasted / f"pasted {datetime.now():%Y-%m-%d %H.%M.%S} no {number}.txt"
        path.write_text(text, encoding="utf-8", newline="")
        self.bring_in([path])

    def bring_in_bytes(self, files: Mapping[str, bytes]) -> None:
        """Look at files that are no longer where they came from, by their names."""
        folder = Path(tempfile.mkdtemp(prefix="coatgui-again-"))
        self._folders.append(folder)
        for name, content in files.items():
            path = folder / (Path(name.replace("\\", "/")).name or "file")
            path.write_bytes(content)
        self.bring_in(sorted(folder.iterdir()))

    def _campaign_changed(self) -> None:
        """What was to go into one campaign does not go into another."""
        campaign = self.desk.campaign
        now = "" if campaign is None else campaign.campaign_id
        before, self._campaign_id = self._campaign_id, now
        if now != before and (self.is_there or self.busy) and not (self.title or self._new_title):
            self.give_up()

    def _offered(self, folder: Path, run: DryRun) -> None:
        """The desk found something doubtful in a folder that it was to open."""
        self.give_up()
        self.batches, self.runs = [Batch(folder, (), Told())], [run]
        self.title = folder.name or "campaign"
        self.changed.emit()

    # --- corrections -----------------------------------------------------------------------

    def correct(self, said: Sequence[tuple[Row, Correction]]) -> None:
        """Take a person's word about files, or parts of files, and look at them anew."""
        batches = list(self._wanted or self.batches)
        for row, correction in said:
            told = batches[row.batch].told
            corrections = dict(told.corrections)
            corrections[row.proposal.file, row.proposal.part] = correction
            batches[row.batch] = replace(
                batches[row.batch], told=replace(told, corrections=corrections)
            )
        self._look(batches, self.title)

    def name_by(self, pattern: NamePattern | None) -> None:
        """Take panel and exposure time from the names by a pattern."""
        self._look(
            [
                replace(batch, told=replace(batch.told, pattern=pattern))
                for batch in self._wanted or self.batches
            ],
            self.title,
        )

    # --- looking ---------------------------------------------------------------------------

    def _look(self, batches: list[Batch], title: str) -> None:
        self._stop()
        self._wanted, self._new_title = batches, title
        self._job = run_in_background(look, batches)
        self._timer.start()
        self.looking.emit(True)

    def _stop(self) -> None:
        if self._job is not None:
            self._job.cancel()
            self._job = None
        self._timer.stop()

    def _poll(self) -> None:
        job = self._job
        if job is None or not job.done:
            return
        self._stop()
        batches, self._wanted = self._wanted, []
        if isinstance(job.error, (UnreadableFolder, OSError)):
            self.desk.failed.emit(str(job.error))
        elif job.error is not None:
            if not isinstance(job.error, Cancelled):
                self.desk.failed.emit(f"That went wrong in a way it should not: {job.error}")
        else:
            self.batches, self.runs, self.title = batches, job.result, self._new_title
            self._settle()
        self.looking.emit(False)

    def _settle(self) -> None:
        """Nothing new needs no look; all else is shown."""
        campaign = self.desk.campaign
        if campaign is not None and not self.title:
            there = {(r.source.sha256, r.source.part) for r in campaign.readings}
            found = together(self.runs)
            asked = any(run.count(s) for run in self.runs for s in (*QUESTIONABLE, Standing.LIST))
            new = [r for r in found.readings if (r.source.sha256, r.source.part) not in there]
            if not new and not asked and not found.refused and found.readings:
                self.take()
                return
        self.changed.emit()

    # --- the end ---------------------------------------------------------------------------

    def take(self) -> None:
        """Bring in what is ready or doubtful; what was asked or refused goes on the campaign's
        list of refusals."""
        if self.busy or not self.runs:
            return
        found, title, first = together(self.runs), self.title, self.batches[0].folder
        origin = first if len(self.batches) == 1 else None
        self.give_up()
        if title:
            self.desk.create(found, title, origin)
        else:
            self.desk.import_found(found)

    def give_up(self) -> None:
        """Forget the proposals; nothing was taken."""
        self._stop()
        self.batches, self.runs, self.title, self._wanted = [], [], "", []
        for folder in self._folders:
            shutil.rmtree(folder, ignore_errors=True)
        self._folders, self._pasted = [], None
        self.looking.emit(False)
        self.changed.emit()
