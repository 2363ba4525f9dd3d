"""That nothing is lost: who else has the file, copies by the clock, and what a crash left behind.

It says what it has to say in two quiet lines; nothing here stops the work with a dialogue.
"""

from __future__ import annotations

import json
from collections.abc import Callable
from functools import partial
from pathlib import Path

from PySide6.QtCore import QObject, QSettings, QTimer

from coatgui.campaign import CampaignFile, CampaignFileError, Change, Recovered
from coatgui.campaign.copies import copies_of
from coatgui.campaign.crash_report import note_operation
from coatgui.campaign.session import Session, Unfinished, unfinished_sessions
from coatgui.jobs import Job, run_in_background
from coatgui.progress import Progress
from coatgui.window.desk import Desk
from coatgui.window.file_actions import FileActions
from coatgui.window.notice import Notice

# Own choice: work of ten minutes is the most that only one file holds.
COPY_EVERY_MS = 600_000
_LOOK_EVERY_MS = 10_000
_NOTE_AFTER_MS = 300
_POLL_MS = 100
_REMEMBERED = 20


def _keep_copy(file: CampaignFile, folder: Path | None, *, progress: Progress) -> Path | None:
    progress.check()
    return file.keep_copy(folder)


class Keeping(QObject):
    """Watches over the file of one window. `standing` says how the file stands (read only, changed
    by somebody else), `offer` what can be saved or gone on with. `where` gives the noun of the open
    place, `go` goes to one."""

    def __init__(
        self,
        desk: Desk,
        files: FileActions,
        settings: QSettings,
        where: Callable[[], str],
        go: Callable[[str], None],
    ) -> None:
        super().__init__(desk)
        self.desk, self._files, self._settings = desk, files, settings
        self._where, self._go = where, go
        self.standing = Notice("How the file stands")
        self.offer = Notice("What can be saved")
        self.session = Session()
        self._of: CampaignFile | None = None
        self._back_to: tuple[str, str] | None = None  # reading and place to return to
        self._edited = False  # since the newest copy
        self._told = ""  # of the file's standing, once
        self._copying: Job | None = None
        self._clock = self._timer(COPY_EVERY_MS, self.copy_now)
        self._look = self._timer(_LOOK_EVERY_MS, self.look)
        self._poll = self._timer(_POLL_MS, self._copied)
        self._note = self._timer(_NOTE_AFTER_MS, self.note_session)
        self._note.setSingleShot(True)
        desk.edited.connect(self._was_edited)
        desk.campaign_changed.connect(self._followed)
        desk.selected.connect(lambda _id: self._note.start())
        desk.closing.connect(self._put_away)
        desk.broken.connect(self.offer_recovery)
        desk.recovered.connect(self._say_recovered)

    def _timer(self, every_ms: int, call: Callable[[], object]) -> QTimer:
        timer = QTimer(self)
        timer.setInterval(every_ms)
        timer.timeout.connect(call)
        return timer

    # --- following the desk ----------------------------------------------------------------

    def _followed(self) -> None:
        file = self.desk.file
        if file is not self._of:
            self._of = file
            self._edited, self._told = False, ""
            self.standing.hide()
            if file is None:
                self._clock.stop()
                self._look.stop()
            else:
                note_operation("open")
                self._clock.start()
                self._look.start()
                self._return(file)
                self._say_standing(file)
        self._note.start()

    def _was_edited(self, what: str, change: Change) -> None:
        note_operation(what, change)
        self._edited = True

    def _say_standing(self, file: CampaignFile) -> None:
        if file.read_only_because:
            self.standing.say(
                f"■  {file.read_only_because}",
                [("Save a copy…", self._files.save_as), ("Open again", self._again)],
            )
        elif file.left_open is not None:
            self.desk.told.emit(
                f"{file.path.name} was not closed in order by {file.left_open}; every edit that "
                "was made is in it."
            )

    def look(self) -> None:
        """See whether somebody else changed the file, or took it away."""
        file = self.desk.file
        if file is None or self.desk.job is not None or self._copying is not None:
            return
        if not file.path.exists():
            told = f"{file.path.name} is no longer in its place: its disk may have been taken away."
            ways = [("Save elsewhere…", self._files.save_as)]
        else:
            try:
                behind = file.changed_elsewhere()
            except CampaignFileError as error:
                told, ways = str(error), [("Save elsewhere…", self._files.save_as)]
            else:
                told, ways = "", [("Open again", self._again)]
                if behind:
                    told = (
                        f"{file.path.name} was changed by somebody else: what is shown is no "
                        "longer what it holds."
                    )
        if told and told != self._told:
            self.standing.say(f"▲  {told}", ways)
        elif self._told and not told:
            self.standing.hide()
            self._say_standing(file)
        self._told = told

    def _again(self) -> None:
        if self.desk.file is not None:
            path = self.desk.file.path
            self._remember_where()
            self.desk.open(path)

    # --- copies ----------------------------------------------------------------------------

    def copies_folder(self) -> Path | None:
        """Where copies go; None: beside the campaign."""
        name = str(self._settings.value("copies", ""))
        return Path(name) if name else None

    def choose_copies_folder(self) -> None:
        if folder := self._files.ask_folder("The folder for copies of campaigns"):
            self._settings.setValue("copies", str(folder))
            self.desk.told.emit(f"Copies will be kept in {folder.name}.")

    def copies_beside(self) -> None:
        self._settings.remove("copies")
        self.desk.told.emit("Copies will be kept beside each campaign.")

    def copy_now(self) -> None:
        """Make the next rolling copy in the background, where there was an edit since the last."""
        file = self.desk.file
        if file is None or self._copying is not None or not self._edited or not self.desk.is_saved:
            return
        self._edited = False
        self._copying = run_in_background(_keep_copy, file, self.copies_folder())
        self._poll.start()

    def _copied(self) -> None:
        job = self._copying
        if job is None or not job.done:
            return
        self._copying = None
        self._poll.stop()
        if isinstance(job.error, (CampaignFileError, OSError)):
            self._edited = True  # to be tried again
            said = getattr(job.error, "strerror", None) or job.error
            self.desk.told.emit(f"No copy of the campaign could be made: {said}")
        elif job.error is not None:
            raise job.error
        elif job.result is not None:
            self.desk.told.emit(f"A copy was kept: {job.result.name}")

    def _put_away(self) -> None:
        """Before the file is closed: the copy under way ends, and a last one is made."""
        if self._copying is None:
            self.copy_now()
        if self._copying is not None:
            self._copying.wait()
            self._copied()
        self._remember_where()

    # --- where a person stood --------------------------------------------------------------

    def _stood(self) -> dict[str, list[str]]:
        try:
            kept = json.loads(str(self._settings.value("stood", "{}")))
            return {str(k): [str(v[0]), str(v[1])] for k, v in kept.items()}
        except (ValueError, TypeError, AttributeError, IndexError, KeyError, RecursionError):
            return {}

    def _remember_where(self) -> None:
        file = self.desk.file
        if file is None or not self.desk.is_saved:
            return
        stood = self._stood()
        stood.pop(str(file.path), None)
        stood[str(file.path)] = [self.desk.selection, self._where()]
        newest = dict(list(stood.items())[-_REMEMBERED:])
        self._settings.setValue("stood", json.dumps(newest))

    def _return(self, file: CampaignFile) -> None:
        """Go to the reading and the place where a person stood the last time."""
        back, self._back_to = self._back_to, None
        reading, place = back or self._stood().get(str(file.path), ["", ""])
        if any(r.reading_id == reading for r in file.campaign.readings):
            self.desk.selection = reading
        if place:
            self._go(place)

    def note_session(self) -> None:
        file = self.desk.file
        self.session.note(
            None if file is None else file.path,
            is_unsaved=not self.desk.is_saved,
            reading_id=self.desk.selection,
            place=self._where(),
        )

    def offer_unfinished(self) -> None:
        """Offer to go on where a crash ended a session, the newest first."""
        for one in unfinished_sessions():
            kept = "was never saved" if one.is_unsaved else "holds every edit"
            self.offer.say(
                f"The program was not closed in order while {one.campaign.stem} was open; it "
                f"{kept}.",
                [("Go on where it stopped", partial(self.restore, one))],
                dismiss="Not this time",
                dismissed=one.forget,
            )
            return

    def restore(self, one: Unfinished) -> None:
        """Open what an unfinished session had open, and go to where it stood."""
        if not self._files.may_leave():
            return
        one.forget()
        self._back_to = (one.reading_id, one.place)
        self.desk.open(one.campaign, unsaved=one.is_unsaved)

    # --- damage ----------------------------------------------------------------------------

    def offer_recovery(self, path: Path, sentence: str) -> None:
        """Say that a file is damaged, and what can be done."""
        note_operation("damaged")
        ways: list[tuple[str, Callable[[], object]]] = [
            ("Recover what can be read…", lambda: self._recover(path))
        ]
        for made, copy in copies_of(path, self.copies_folder())[:1]:
            ways.append(
                (
                    f"Open the copy of {made.astimezone():%Y-%m-%d %H:%M}",
                    partial(self._files.open_path, copy),
                )
            )
        self.offer.say(f"■  {sentence.replace('This campaign file', path.name)}", ways)

    def _recover(self, path: Path) -> None:
        suggested = path.with_name(f"{path.stem} recovered{path.suffix}")
        target = self._files.campaign_to_write("The recovered campaign", suggested)
        if target is None or not self._files.may_leave():
            return
        if self.desk.file is not None and self.desk.file.path == path:
            self.desk.close()
            self.desk.campaign_changed.emit()
        self.desk.recover(path, target)

    def _say_recovered(self, found: Recovered, name: str) -> None:
        note_operation("recover")
        readings = "1 reading" if found.readings == 1 else f"{found.readings} readings"
        ways: list[tuple[str, Callable[[], object]]] = []
        if found.to_read_again:
            files = len(found.to_read_again)
            what = "1 file" if files == 1 else f"{files} files"
            ways.append(
                (
                    f"Read {what} again",
                    partial(self._files.incoming.bring_in_bytes, found.to_read_again),
                )
            )
        self.offer.say(
            f"Recovered {readings} from {name}. The damaged file is as it was; this is missing:",
            ways,
            found.lost,
        )

    def close(self) -> None:
        """The window is closed in order."""
        self._note.stop()
        self.session.end()
