"""How files on their way are told of in the window: a page with the proposals, and quiet lines
above whatever else is open."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

from PySide6.QtCore import QObject, QSettings
from PySide6.QtWidgets import QStackedWidget

from coatgui.window.desk import Desk
from coatgui.window.file_actions import FileActions
from coatgui.window.incoming import Incoming
from coatgui.window.palette import Colours
from coatgui.window.watching import Watching
from coatgui.window.welcome import Waiting

if TYPE_CHECKING:
    from coatgui.window.dry_run_page import DryRunPage

WELCOME, WORK, PROPOSALS = range(3)


class Arrivals(QObject):
    """Proposals and watched files of one window. `pages` are the window's: the welcome page, the
    work, and third the proposals, which are added here."""

    def __init__(
        self,
        desk: Desk,
        incoming: Incoming,
        files: FileActions,
        settings: QSettings,
        tone: Colours,
        pages: QStackedWidget,
    ) -> None:
        super().__init__(pages)
        self.desk, self.incoming, self.pages = desk, incoming, pages
        self._files = files
        self.waiting, self.arrived = Waiting(), Waiting()
        self._tone = tone
        self._page: DryRunPage | None = None
        self.waiting.look.connect(self.show_proposals)
        incoming.changed.connect(self.show_proposals)
        self.watching = Watching(desk, settings, self)
        self.watching.arrived.connect(self._tell_arrived)
        self.arrived.look.connect(self._look_at_arrived)

    @property
    def page(self) -> DryRunPage:
        """The page with the proposals, built when it is first wanted."""
        if self._page is None:
            from coatgui.window.dry_run_page import DryRunPage

            self._page = DryRunPage(self.incoming, self._tone)
            self.pages.addWidget(self._page)
            self._page.taken.connect(self.take)
            self._page.left.connect(self.set_aside)
            self._page.refresh()
        return self._page

    def paint_in(self, tone: Colours) -> None:
        self._tone = tone
        if self._page is not None:
            self._page.paint_in(tone)

    def show_proposals(self) -> None:
        """Show what the files on their way would become, or what is open where there are none."""
        if self.incoming.is_there:
            self.waiting.hide()
            self.pages.setCurrentWidget(self.page)
        else:
            self.set_aside()

    def take(self) -> None:
        """Bring in what is proposed; where that makes another campaign, ask first."""
        if not self.incoming.title or self._files.may_leave():
            self.incoming.take()

    def set_aside(self) -> None:
        """Go back to the campaign; proposals stay, and a quiet line says so."""
        self.pages.setCurrentIndex(WELCOME if self.desk.file is None else WORK)
        self.waiting.setVisible(self.incoming.is_there)
        if self.incoming.is_there:
            self.waiting.say(f"Files wait to be brought in: {self.incoming.summary()}.", "Look")

    def _tell_arrived(self, files: list[Path]) -> None:
        self.arrived.setVisible(bool(files))
        if files:
            self.arrived.say(self.watching.sentence(), "Look at them")

    def _look_at_arrived(self) -> None:
        self.arrived.hide()
        if files := self.watching.seen():
            self.incoming.bring_in(files, self.watching.folder)

    def watch_folder(self) -> None:
        """Ask for a folder, and watch it."""
        if folder := self._files.ask_folder("The folder that new spectra arrive in"):
            self.watching.begin(folder)
            self.desk.told.emit(f"New files in {folder.name} will be told, never taken unasked.")

    def stop_watching(self) -> None:
        self.watching.end()

    def close(self) -> None:
        self.incoming.give_up()
        self.watching.stop()
