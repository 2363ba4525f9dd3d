"""What is done with whole files: opening, bringing in, keeping and writing, each after its question
where one is needed."""

from __future__ import annotations

from pathlib import Path

from PySide6.QtCore import QSettings
from PySide6.QtWidgets import QApplication, QFileDialog, QMainWindow, QMenu

from coatgui.shipped import sample_panels
from coatgui.window.asking import Leave, file_to_write, how_to_leave
from coatgui.window.desk import Desk
from coatgui.window.incoming import Incoming
from coatgui.window.welcome import Trouble

_FILES = "Spectra and lists (*.csv *.txt *.dat *.tsv *.xlsx)"
_CAMPAIGNS = "Campaigns (*.coatgui)"
_RECENT = 8


class FileActions:
    """The actions on files, for one window."""

    def __init__(
        self,
        window: QMainWindow,
        desk: Desk,
        incoming: Incoming,
        settings: QSettings,
        trouble: Trouble,
    ) -> None:
        self._window, self.desk, self.incoming = window, desk, incoming
        self.settings, self.trouble = settings, trouble
        desk.files_wanted.connect(self.bring_in)

    def may_leave(self) -> bool:
        """Whether the campaign may be put away: asks where edits would be lost."""
        file = self.desk.file
        if file is None or self.desk.is_saved or not file.undo_name:
            return True
        answer = how_to_leave(self._window, file.campaign.title)
        if answer is Leave.SAVE:
            self.save_as()
            self.desk.wait()
            return self.desk.is_saved
        return answer is Leave.LOSE

    def open_path(self, path: Path) -> None:
        """Open a campaign file or a folder, asking first where edits would be lost."""
        if self.may_leave():
            self.trouble.hide()
            self.settings.setValue("folder", str(path.parent))
            self.desk.open(path)

    def ask_folder(self, title: str) -> Path | None:
        name = QFileDialog.getExistingDirectory(self._window, title, self._folder())
        return Path(name) if name else None

    def open_folder(self) -> None:
        if folder := self.ask_folder("A folder of spectra"):
            self.open_path(folder)

    def open_campaign(self) -> None:
        name, _ = QFileDialog.getOpenFileName(
            self._window, "A campaign", self._folder(), _CAMPAIGNS
        )
        if name:
            self.open_path(Path(name))

    def open_sample(self) -> None:
        if self.may_leave():
            self.trouble.hide()
            self.desk.open(sample_panels())

    def bring_in(self) -> None:
        names, _ = QFileDialog.getOpenFileNames(
            self._window, "Spectra to bring in", self._folder(), _FILES
        )
        if names:
            self.incoming.bring_in([Path(name) for name in names])

    def paste_table(self) -> None:
        self.incoming.paste(QApplication.clipboard().text())

    def _folder(self) -> str:
        """Where the last file was opened or written."""
        return str(self.settings.value("folder", ""))

    def to_write(self, title: str, kinds: str, ending: str) -> Path | None:
        """The name for a file to write, suggested after the campaign; None where none was given."""
        file = self.desk.file
        name = "campaign" if file is None else file.campaign.title.replace("/", "-")
        path = file_to_write(self._window, title, kinds, Path(self._folder()) / f"{name}{ending}")
        if path is not None:
            self.settings.setValue("folder", str(path.parent))
        return path

    def campaign_to_write(self, title: str, suggested: Path) -> Path | None:
        return file_to_write(self._window, title, _CAMPAIGNS, suggested)

    def save_as(self) -> None:
        if path := self.to_write("Keep the campaign as", _CAMPAIGNS, ".coatgui"):
            self.desk.save_as(path)

    def write_workbook(self) -> None:
        if path := self.to_write("Workbook", "Workbooks (*.xlsx)", ".xlsx"):
            self.desk.export(path)

    def write_summary(self, ending: str = ".pdf") -> None:
        kinds = ["Pages (*.pdf)", "Web pages (*.html)"]
        if ending != ".pdf":
            kinds.reverse()
        if path := self.to_write("Inspection summary", ";;".join(kinds), ending):
            self.desk.export(path)

    def write_data(self) -> None:
        if path := self.to_write("Data", "JSON (*.json)", ".json"):
            self.desk.export(path)

    def close_campaign(self) -> None:
        if self.may_leave():
            self.desk.close()
            self.desk.campaign_changed.emit()

    def recent_names(self) -> list[str]:
        names = self.settings.value("recent", [])
        return [str(name) for name in names] if isinstance(names, list) else [str(names)]

    def remember(self, path: Path) -> None:
        """Put a campaign first among those worked on lately."""
        names = [str(path), *(n for n in self.recent_names() if n and n != str(path))]
        self.settings.setValue("recent", names[:_RECENT])

    def fill_recent(self, menu: QMenu) -> None:
        menu.clear()
        for name in filter(None, self.recent_names()):
            action = menu.addAction(Path(name).name.replace("&", "&&"))
            action.setToolTip(name)
            action.triggered.connect(lambda _c=False, path=name: self.open_path(Path(path)))
        if menu.isEmpty():
            menu.addAction("none yet").setEnabled(False)
