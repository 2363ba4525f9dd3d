"""The folder that spectra of a campaign arrive in, watched while the campaign is open. What is new
is told, never taken."""

from __future__ import annotations

from pathlib import Path

from PySide6.QtCore import QObject, QSettings, QTimer, Signal

from coatgui.intake import FolderWatch
from coatgui.intake.folder import SPECTRUM_ENDINGS
from coatgui.intake.watch import QUIET_S
from coatgui.jobs import Job, run_in_background
from coatgui.progress import Progress
from coatgui.window.desk import Desk

_LOOK_MS = 2000
_NAMED = 3


def _look(watch: FolderWatch, progress: Progress) -> tuple[Path, ...]:
    progress.check()
    return watch.settled()


class Watching(QObject):
    """`arrived` carries the new files that no one has looked at yet, all of them each time. The
    folder is remembered for each campaign that is saved."""

    arrived = Signal(list)

    def __init__(self, desk: Desk, settings: QSettings, parent: QObject | None = None) -> None:
        super().__init__(parent)
        self.desk, self.settings = desk, settings
        self.folder: Path | None = None
        self.new: dict[Path, None] = {}
        self._watch: FolderWatch | None = None
        self._is_first = True
        self._job: Job | None = None
        self._campaign_id = ""
        self._timer = QTimer(self)
        self._timer.setInterval(_LOOK_MS)
        self._timer.timeout.connect(self.look)
        desk.campaign_changed.connect(self._follow)

    def begin(self, folder: Path, quiet_s: float = QUIET_S) -> None:
        """Watch a folder from now on; files that the campaign does not hold are new already."""
        self.stop()
        self.folder = folder
        self._watch = FolderWatch(folder, known_now=False, quiet_s=quiet_s)
        self._is_first = True
        self._remember(str(folder))
        self._timer.start()

    def end(self) -> None:
        """Watch no longer, and forget the folder."""
        self.stop()
        self._remember("")

    def stop(self) -> None:
        self._timer.stop()
        self._watch, self.folder = None, None
        self._job = None
        if self.new:
            self.new = {}
            self.arrived.emit([])

    def seen(self) -> list[Path]:
        """The new files, which count as looked at from now on."""
        files = [path for path in self.new if path.is_file()]
        self.new = {}
        return files

    def sentence(self) -> str:
        """What arrived, in a line."""
        names = [path.name for path in self.new]
        more = f" and {len(names) - _NAMED} more" if len(names) > _NAMED else ""
        count = "1 new file" if len(names) == 1 else f"{len(names)} new files"
        where = self.folder.name if self.folder is not None else ""
        return f"{count} in {where}: {', '.join(names[:_NAMED])}{more}."

    def look(self) -> None:
        """Look at the folder, in the background; what the look before found is told first."""
        job, watch = self._job, self._watch
        if job is not None and job.done:
            self._job = None
            self._tell(job)
        if self._job is None and watch is not None:
            self._job = run_in_background(_look, watch)

    def _tell(self, job: Job) -> None:
        if job.error is not None or not job.result:
            return
        files = job.result
        if self._is_first:
            self._is_first = False
            # Beside the spectra a folder holds notes and the like, which were there all along.
            known = self._known()
            files = [
                path
                for path in files
                if path.suffix.casefold() in SPECTRUM_ENDINGS and self._name(path) not in known
            ]
        self.new.update(dict.fromkeys(files))
        if files:
            self.arrived.emit(list(self.new))

    def _name(self, path: Path) -> str:
        assert self.folder is not None
        return path.relative_to(self.folder).as_posix()

    def _known(self) -> set[str]:
        """Names that the campaign was made of: readings, refusals, the open lead and lists."""
        campaign = self.desk.campaign
        if campaign is None:
            return set()
        known = {r.source.file for r in campaign.readings}
        known |= {r.file for r in campaign.refused}
        known |= {Path(name).name for name in known}
        lead = campaign.open_lead_source
        return known | {"panels.csv", "readings.csv", lead.file if lead is not None else ""}

    def _remember(self, folder: str) -> None:
        campaign = self.desk.campaign
        if campaign is not None and self.desk.is_saved:
            self.settings.setValue(f"watched/{campaign.campaign_id}", folder)

    def _follow(self) -> None:
        """Another campaign has another folder: the one it was opened from, else the one that was
        watched when it was open last."""
        campaign = self.desk.campaign
        now = "" if campaign is None else campaign.campaign_id
        if now == self._campaign_id:
            if self.folder is not None:
                self._remember(str(self.folder))
            return
        self._campaign_id = now
        self.stop()
        named = str(self.settings.value(f"watched/{now}", "")) if now else ""
        folder = self.desk.origin or (Path(named) if named else None)
        if folder is not None and folder.is_dir():
            self.begin(folder)
