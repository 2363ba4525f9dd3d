"""The main window: it wires the desk to the views, and does nothing else."""

from __future__ import annotations

import time
from collections.abc import Callable
from pathlib import Path

from PySide6.QtCore import QSettings, Qt
from PySide6.QtGui import QAction, QCloseEvent, QDragEnterEvent, QDropEvent, QKeySequence
from PySide6.QtWidgets import (
    QApplication,
    QButtonGroup,
    QFileDialog,
    QHBoxLayout,
    QLabel,
    QMainWindow,
    QMenu,
    QProgressBar,
    QPushButton,
    QSplitter,
    QStackedWidget,
    QVBoxLayout,
    QWidget,
)

from coatgui.assessment.cautions import cautions
from coatgui.shipped import sample_panels
from coatgui.window import palette
from coatgui.window.actions import ACTIONS, Entry
from coatgui.window.asking import Leave, file_to_write, how_to_leave, say_plainly
from coatgui.window.desk import Desk
from coatgui.window.exposure_strip import ExposureStrip
from coatgui.window.facts import FactsView, facts
from coatgui.window.figure import as_text, on_white, picture, save
from coatgui.window.places.comparison_place import ComparisonPlace
from coatgui.window.places.course_place import CoursePlace
from coatgui.window.places.doubts_place import DoubtsPlace
from coatgui.window.places.map_place import MapPlace
from coatgui.window.places.place import Place
from coatgui.window.places.reading_place import ReadingPlace
from coatgui.window.places.settings_place import SettingsPlace
from coatgui.window.places.water_place import WaterPlace
from coatgui.window.project_tree import ProjectTree
from coatgui.window.welcome import Trouble, Welcome

_FILES = "Spectra and lists (*.csv *.txt *.dat *.tsv *.xlsx)"
_CAMPAIGNS = "Campaigns (*.coatgui)"
_RECENT = 8
_UNSAVED = "not saved yet"


class MainWindow(QMainWindow):
    def __init__(self, settings: QSettings, dark: bool) -> None:
        super().__init__()
        self.settings = settings
        self.tone = palette.colours(dark)
        self.desk = Desk(self)
        self.setWindowTitle("coatgui")
        self.setAcceptDrops(True)
        self.resize(1280, 800)
        self._actions: list[tuple[Entry, QAction]] = []
        self._began = 0.0
        self._build_menus()
        self.pages = QStackedWidget()
        self.trouble = Trouble()
        middle = QWidget()
        column = QVBoxLayout(middle)
        column.setContentsMargins(0, 0, 0, 0)
        column.setSpacing(0)
        column.addWidget(self.trouble)
        column.addWidget(self.pages, 1)
        self.setCentralWidget(middle)
        self.welcome = Welcome(
            [
                ("Open a folder of spectra…", self.open_folder),
                ("Open a campaign…", self.open_campaign),
                ("Try the sample campaign", self.open_sample),
            ]
        )
        self.welcome.picked.connect(lambda name: self.open_path(Path(name)))
        self.pages.addWidget(self.welcome)
        self.pages.addWidget(self._work())
        self._build_status()
        self.desk.campaign_changed.connect(self._campaign_changed)
        self.desk.assessed.connect(self._campaign_changed)
        self.desk.selected.connect(self._selected)
        self.desk.worked.connect(self._worked)
        self.desk.told.connect(self._told)
        self.desk.failed.connect(self.trouble.say)
        self._campaign_changed()

    # --- building --------------------------------------------------------------------------

    def _build_menus(self) -> None:
        menus: dict[str, QMenu] = {}
        for entry in ACTIONS:
            menu = menus.get(entry.menu)
            if menu is None:
                menu = menus[entry.menu] = self.menuBar().addMenu(f"&{entry.menu}")
            action = QAction(entry.name, self)
            action.setToolTip(entry.tip)
            action.setStatusTip(entry.tip)
            if entry.shortcut:
                action.setShortcut(QKeySequence(entry.shortcut))
            method: Callable[[], object] = getattr(self, entry.method)
            action.triggered.connect(lambda _checked=False, call=method: call())
            menu.addAction(action)
            self._actions.append((entry, action))
        self.recent = QMenu("Recent campaigns", self)
        self.recent.aboutToShow.connect(self._fill_recent)
        menus["Campaign"].insertMenu(menus["Campaign"].actions()[3], self.recent)

    def _work(self) -> QWidget:
        splitter = QSplitter()
        splitter.setHandleWidth(1)
        self.project = ProjectTree(self.desk, self.tone)
        splitter.addWidget(self.project)
        middle = QWidget()
        column = QVBoxLayout(middle)
        column.setContentsMargins(0, 0, 0, 0)
        column.setSpacing(0)
        bar = QHBoxLayout()
        bar.setSpacing(0)
        bar.setAlignment(Qt.AlignmentFlag.AlignLeft)
        self.stack = QStackedWidget()
        self.places: list[Place] = [
            kind(self.desk, self.tone)
            for kind in (
                MapPlace,
                ReadingPlace,
                CoursePlace,
                DoubtsPlace,
                WaterPlace,
                ComparisonPlace,
                SettingsPlace,
            )
        ]
        for place in self.places:
            if isinstance(place, MapPlace):
                place.cells.opened.connect(self.go_reading)
            elif isinstance(place, DoubtsPlace):
                place.opened.connect(self.go_reading)
        self.buttons = QButtonGroup(self)
        for i, place in enumerate(self.places):
            button = QPushButton(place.noun)
            button.setObjectName("place")
            button.setCheckable(True)
            button.setAccessibleDescription(place.question)
            button.setToolTip(place.question)
            self.buttons.addButton(button, i)
            bar.addWidget(button)
            self.stack.addWidget(place)
        self.buttons.idClicked.connect(self.go)
        column.addLayout(bar)
        column.addWidget(self.stack, 1)
        self.strip = ExposureStrip(self.desk, self.tone)
        self.strip.picked.connect(self.desk.select)
        column.addWidget(self.strip)
        splitter.addWidget(middle)
        self.facts = FactsView()
        splitter.addWidget(self.facts)
        splitter.setSizes([210, 820, 250])
        splitter.setStretchFactor(1, 1)
        self.go(0)
        return splitter

    def _build_status(self) -> None:
        self.doing = QLabel()
        self.bar = QProgressBar()
        self.bar.setFixedWidth(180)
        self.bar.setTextVisible(False)
        self.bar.setAccessibleName("Progress of the work under way")
        self.halt = QPushButton("Stop")
        self.halt.setAccessibleDescription("Give up the work under way (Esc)")
        self.halt.clicked.connect(self.desk.stop)
        self.kept = QLabel()
        for widget in (self.doing, self.bar, self.halt):
            self.statusBar().addPermanentWidget(widget)
            widget.hide()
        self.statusBar().addPermanentWidget(self.kept)

    # --- following the desk ----------------------------------------------------------------

    def _campaign_changed(self) -> None:
        file = self.desk.file
        self.pages.setCurrentIndex(0 if file is None else 1)
        title = "coatgui"
        if file is not None:
            title = f"{file.campaign.title} · coatgui"
            self.kept.setText(f"kept in {file.path.name}" if self.desk.is_saved else _UNSAVED)
            if self.desk.is_saved:
                self._remember(file.path)
        else:
            self.kept.setText("")
            self.welcome.show_recent(self._recent_names())
        self.setWindowTitle(title)
        for entry, action in self._actions:
            name = None
            if entry.needs in ("undo", "redo"):
                name = getattr(file, f"{entry.needs}_name", None)
                action.setText(f"{entry.name}: {name}" if name else entry.name)
            there = {
                "": True,
                "campaign": file is not None,
                "work": self.desk.job is not None,
            }.get(entry.needs, name is not None)
            action.setEnabled(there)
        self.project.refresh()
        for place in self.places:
            place.show_campaign()
        self._count_doubts()
        self._show_facts()

    def _count_doubts(self) -> None:
        """How many wait for an eye stands beside the place's noun."""
        for number, place in enumerate(self.places):
            if isinstance(place, DoubtsPlace):
                count = f"  {len(place.doubts)}" if place.doubts else ""
                self.buttons.button(number).setText(f"{place.noun}{count}")

    def _selected(self) -> None:
        self.project.mark(self.desk.selection)
        for place in self.places:
            place.show_selection()
        self._show_facts()

    def _show_facts(self) -> None:
        self.facts.show_facts(facts(self.desk.reading_assessment(), self.desk.assessment))
        self.strip.refresh()

    def _worked(self, stage: str, done: int, total: int) -> None:
        for widget in (self.doing, self.bar, self.halt):
            widget.setVisible(bool(stage))
        for entry, action in self._actions:
            if entry.needs == "work":
                action.setEnabled(bool(stage))
        if not stage:
            self._began = 0.0
            return
        now = time.monotonic()
        self._began = self._began or now
        left = ""
        if total and 0 < done < total and now - self._began > 2.0:
            # An estimate from what is done so far, never to the second.
            left = f", about {(now - self._began) / done * (total - done):.0f} s left"
        self.doing.setText(f"{stage} {done} of {total}{left}" if total > 1 else stage)
        self.bar.setMaximum(max(total, 0) if total > 1 else 0)
        self.bar.setValue(done)

    def _told(self, sentence: str) -> None:
        self.statusBar().showMessage(sentence, 20_000)

    # --- actions ---------------------------------------------------------------------------

    def _may_leave(self) -> bool:
        """Whether the campaign may be put away: asks where edits would be lost."""
        file = self.desk.file
        if file is None or self.desk.is_saved or not file.undo_name:
            return True
        answer = how_to_leave(self, file.campaign.title)
        if answer is Leave.SAVE:
            self.save_as()
            return self.desk.is_saved
        return answer is Leave.LOSE

    def open_path(self, path: Path) -> None:
        """Open a campaign file or a folder, asking first where edits would be lost."""
        if self._may_leave():
            self.trouble.hide()
            self.settings.setValue("folder", str(path.parent))
            self.desk.open(path)

    def open_folder(self) -> None:
        name = QFileDialog.getExistingDirectory(self, "A folder of spectra", self._folder())
        if name:
            self.open_path(Path(name))

    def open_campaign(self) -> None:
        name, _ = QFileDialog.getOpenFileName(self, "A campaign", self._folder(), _CAMPAIGNS)
        if name:
            self.open_path(Path(name))

    def open_sample(self) -> None:
        if self._may_leave():
            self.trouble.hide()
            self.desk.open(sample_panels())

    def bring_in(self) -> None:
        names, _ = QFileDialog.getOpenFileNames(self, "Spectra to bring in", self._folder(), _FILES)
        if names:
            self.desk.bring_in([Path(name) for name in names])

    def _folder(self) -> str:
        """Where the last file was opened or written."""
        return str(self.settings.value("folder", ""))

    def _to_write(self, title: str, kinds: str, ending: str) -> Path | None:
        file = self.desk.file
        name = "campaign" if file is None else file.campaign.title.replace("/", "-")
        path = file_to_write(self, title, kinds, Path(self._folder()) / f"{name}{ending}")
        if path is not None:
            self.settings.setValue("folder", str(path.parent))
        return path

    def save_as(self) -> None:
        if path := self._to_write("Keep the campaign as", _CAMPAIGNS, ".coatgui"):
            self.desk.save_as(path)

    def write_workbook(self) -> None:
        if path := self._to_write("Workbook", "Workbooks (*.xlsx)", ".xlsx"):
            self.desk.export(path)

    def write_data(self) -> None:
        if path := self._to_write("Data", "JSON (*.json)", ".json"):
            self.desk.export(path)

    def close_campaign(self) -> None:
        if self._may_leave():
            self.desk.close()
            self._campaign_changed()

    def judge_again(self) -> None:
        self.desk.judge()

    def halt_work(self) -> None:
        self.desk.stop()

    def _on_paper(self, then: Callable[[list[QWidget], str], None]) -> None:
        """Hand on the open place's plots while they wear the colours of paper."""
        place = self.places[self.stack.currentIndex()]
        if not place.figure():
            self.trouble.say("There is no plot here to copy or save: go to Map, Reading or Course.")
            return
        place.paint_in(on_white())
        try:
            then(place.figure(), place.caption())
        finally:
            place.paint_in(self.tone)

    def copy_picture(self) -> None:
        def copy(widgets: list[QWidget], caption: str) -> None:
            QApplication.clipboard().setImage(picture(widgets, caption))
            self._told("The picture is on the clipboard.")

        self._on_paper(copy)

    def save_picture(self) -> None:
        path = self._to_write("Picture", "Drawing (*.svg);;Picture (*.png)", ".svg")
        if path is None:
            return

        def write(widgets: list[QWidget], caption: str) -> None:
            try:
                save(widgets, caption, path)
            except OSError as error:
                self.trouble.say(f"{path.name} could not be written: {error.strerror}.")
            else:
                self._told(f"Written: {path.name}")

        self._on_paper(write)

    def copy_table(self) -> None:
        rows = self.places[self.stack.currentIndex()].data_rows()
        if len(rows) < 2:
            self.trouble.say("There are no data here to copy: go to Map, Reading or Course.")
            return
        QApplication.clipboard().setText(as_text(rows))
        self._told(f"{len(rows) - 1} rows are on the clipboard, for a spreadsheet.")

    def undo(self) -> None:
        self.desk.undo()

    def redo(self) -> None:
        self.desk.redo()

    def rename(self) -> None:
        self.project.rename()

    def remove(self) -> None:
        self.project.remove()

    def add_formulation(self) -> None:
        self.project.add_formulation()

    def go(self, place: int) -> None:
        self.stack.setCurrentIndex(place)
        self.buttons.button(place).setChecked(True)
        policy = Qt.FocusPolicy
        for button in self.buttons.buttons():
            # Tab comes to the open place's button; left and right go on to the others.
            button.setFocusPolicy(policy.StrongFocus if button.isChecked() else policy.ClickFocus)
        # The reading's own place shows the same values where they lie in the coating, and the
        # doubts show their evidence.
        self.facts.setVisible(isinstance(self.places[place], (MapPlace, CoursePlace)))
        self.strip.setVisible(
            not isinstance(self.places[place], (DoubtsPlace, ComparisonPlace, SettingsPlace))
        )

    def go_map(self) -> None:
        self.go(0)

    def go_reading(self) -> None:
        self.go(1)

    def go_course(self) -> None:
        self.go(2)

    def go_doubts(self) -> None:
        self.go(3)

    def go_water(self) -> None:
        self.go_to(WaterPlace)

    def go_comparison(self) -> None:
        self.go_to(ComparisonPlace)

    def go_settings(self) -> None:
        self.go_to(SettingsPlace)

    def go_to(self, kind: type[Place]) -> None:
        self.go(next(i for i, place in enumerate(self.places) if isinstance(place, kind)))

    def later(self) -> None:
        self.desk.step(1)

    def earlier(self) -> None:
        self.desk.step(-1)

    def turn_tone(self) -> None:
        self.tone = palette.colours(not self.tone.dark)
        self.settings.setValue("dark", self.tone.dark)
        application = QApplication.instance()
        if isinstance(application, QApplication):
            palette.apply(application, self.tone)
        for place in self.places:
            place.paint_in(self.tone)
        self.project.paint_in(self.tone)
        self.strip.tone = self.tone
        self.strip.update()

    def show_cautions(self) -> None:
        say_plainly(self, "Cautions", "What the results do not say", "\n\n".join(cautions()))

    # --- recent campaigns, drops, closing --------------------------------------------------

    def _recent_names(self) -> list[str]:
        names = self.settings.value("recent", [])
        return [str(name) for name in names] if isinstance(names, list) else [str(names)]

    def _remember(self, path: Path) -> None:
        names = [str(path), *(n for n in self._recent_names() if n and n != str(path))]
        self.settings.setValue("recent", names[:_RECENT])

    def _fill_recent(self) -> None:
        self.recent.clear()
        for name in filter(None, self._recent_names()):
            action = self.recent.addAction(Path(name).name.replace("&", "&&"))
            action.setToolTip(name)
            action.triggered.connect(lambda _c=False, path=name: self.open_path(Path(path)))
        if self.recent.isEmpty():
            self.recent.addAction("none yet").setEnabled(False)

    def dragEnterEvent(self, event: QDragEnterEvent) -> None:
        if event.mimeData().hasUrls():
            event.acceptProposedAction()

    def dropEvent(self, event: QDropEvent) -> None:
        paths = [Path(url.toLocalFile()) for url in event.mimeData().urls() if url.isLocalFile()]
        is_campaign = len(paths) == 1 and paths[0].suffix == ".coatgui"
        if is_campaign or (len(paths) == 1 and self.desk.file is None):
            self.open_path(paths[0])
        elif paths:
            self.desk.bring_in(paths)

    def closeEvent(self, event: QCloseEvent) -> None:
        if not self._may_leave():
            event.ignore()
            return
        self.desk.close()
        event.accept()
