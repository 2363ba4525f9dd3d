"""The main window: it wires the desk to the views, and does nothing else."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path
from typing import TYPE_CHECKING

from PySide6.QtCore import QByteArray, QEvent, QSettings, Qt, QTimer
from PySide6.QtGui import QAction, QCloseEvent, QDragEnterEvent, QDropEvent, QKeySequence
from PySide6.QtWidgets import (
    QApplication,
    QButtonGroup,
    QHBoxLayout,
    QMainWindow,
    QMenu,
    QPushButton,
    QSplitter,
    QStackedWidget,
    QVBoxLayout,
    QWidget,
)

from coatgui.campaign import CampaignFile
from coatgui.window import palette
from coatgui.window.actions import ACTIONS, Entry
from coatgui.window.arrivals import PROPOSALS, WELCOME, WORK, Arrivals
from coatgui.window.desk import Desk
from coatgui.window.exposure_strip import ExposureStrip
from coatgui.window.figure_actions import FigureActions
from coatgui.window.file_actions import FileActions
from coatgui.window.help import Help
from coatgui.window.incoming import Incoming
from coatgui.window.keeping import Keeping
from coatgui.window.places.in_order import NOUNS, ORDER, Places
from coatgui.window.places.place import Place
from coatgui.window.project_tree import ProjectTree
from coatgui.window.side_column import SideColumn
from coatgui.window.welcome import Trouble, Welcome
from coatgui.window.work_status import WorkStatus

if TYPE_CHECKING:
    from coatgui.window.dry_run_page import DryRunPage

_UNSAVED = "not saved yet"
_MANY = 2000  # readings, beyond which following an edit is cut into parts


class MainWindow(QMainWindow):
    def __init__(self, settings: QSettings, dark: bool) -> None:
        super().__init__()
        self.settings = settings
        self.tone = palette.colours(dark)
        self.desk = Desk(self)
        self.setWindowTitle("coatgui")
        self.setAcceptDrops(True)
        self.resize(1280, 800)
        geometry = settings.value("geometry")
        if isinstance(geometry, QByteArray):
            self.restoreGeometry(geometry)
        self._actions: list[tuple[Entry, QAction]] = []
        self._shown: CampaignFile | None = None
        # Places that do not show what the desk holds: all of it (True), or only the selection.
        self._behind: dict[int, bool] = {}
        self._parts: list[Callable[[], None]] = []  # of following the desk, still to be done
        self.trouble = Trouble()
        self.incoming = Incoming(self.desk, self)
        self.files = FileActions(self, self.desk, self.incoming, settings, self.trouble)
        self.figures = FigureActions(self.desk, self.files, self.trouble, self.open_place)
        self.help = Help(self, lambda: self.open_place().topic())
        self.pages = QStackedWidget()
        middle = QWidget()
        column = QVBoxLayout(middle)
        column.setContentsMargins(0, 0, 0, 0)
        column.setSpacing(0)
        self.setCentralWidget(middle)
        self.welcome = Welcome(
            [
                ("Open a folder of spectra…", self.files.open_folder),
                ("Open a campaign…", self.files.open_campaign),
                ("Try the sample campaign", self.files.open_sample),
            ]
        )
        self.welcome.picked.connect(lambda name: self.open_path(Path(name)))
        self.pages.addWidget(self.welcome)
        self.pages.addWidget(self._work())
        self.arrivals = Arrivals(
            self.desk, self.incoming, self.files, settings, self.tone, self.pages
        )
        self.watching = self.arrivals.watching
        self.keeping = Keeping(
            self.desk, self.files, settings, lambda: self.open_place().noun, self.go_to
        )
        for line in (
            self.trouble,
            self.keeping.standing,
            self.keeping.offer,
            self.arrivals.waiting,
            self.arrivals.arrived,
        ):
            column.addWidget(line)
        column.addWidget(self.pages, 1)
        self._build_menus()
        self.status = WorkStatus(self.statusBar(), self.desk.stop)
        self.desk.campaign_changed.connect(self._campaign_changed)
        self.desk.assessed.connect(self._campaign_changed)
        self.desk.selected.connect(self._selected)
        self.desk.worked.connect(self._worked)
        self.desk.told.connect(self._told)
        self.desk.failed.connect(self.trouble.say)
        self.desk.unkept.connect(self.trouble.say_unkept)
        self.trouble.elsewhere.clicked.connect(lambda _checked=False: self.files.save_as())
        self._campaign_changed()

    # --- building --------------------------------------------------------------------------

    def _build_menus(self) -> None:
        menus: dict[str, QMenu] = {}
        holders = (
            self,
            self.files,
            self.figures,
            self.arrivals,
            self.side,
            self.help,
            self.keeping,
        )
        for entry in ACTIONS:
            menu = menus.get(entry.menu)
            if menu is None:
                menu = menus[entry.menu] = self.menuBar().addMenu(f"&{entry.menu}")
            action = QAction(entry.name, self)
            action.setToolTip(entry.tip)
            action.setStatusTip(entry.tip)
            if entry.shortcut:
                action.setShortcut(QKeySequence(entry.shortcut))
            holder = next(h for h in holders if hasattr(h, entry.method))
            method: Callable[..., object] = getattr(holder, entry.method)
            about = (entry.about,) if entry.about else ()
            action.triggered.connect(lambda _checked=False, call=method, a=about: call(*a))
            menu.addAction(action)
            self._actions.append((entry, action))
        self.recent = QMenu("Recent campaigns", self)
        self.recent.aboutToShow.connect(lambda: self.files.fill_recent(self.recent))
        menus["Campaign"].insertMenu(menus["Campaign"].actions()[3], self.recent)

    def _work(self) -> QWidget:
        splitter = QSplitter()
        splitter.setHandleWidth(1)
        self.project = ProjectTree(self.desk, self.tone)
        self.project.setMinimumWidth(190)
        splitter.addWidget(self.project)
        middle = QWidget()
        column = QVBoxLayout(middle)
        column.setContentsMargins(0, 0, 0, 0)
        column.setSpacing(0)
        bar = QHBoxLayout()
        bar.setSpacing(0)
        bar.setAlignment(Qt.AlignmentFlag.AlignLeft)
        self.stack = QStackedWidget()
        self.places = Places(self._make_place)
        self.buttons = QButtonGroup(self)
        for i, (noun, question, _) in enumerate(ORDER):
            button = QPushButton(noun)
            button.setObjectName("place")
            button.setCheckable(True)
            button.setAccessibleDescription(question)
            button.setToolTip(question)
            self.buttons.addButton(button, i)
            bar.addWidget(button)
            self.stack.addWidget(self.places.holders[i])
        self.buttons.idClicked.connect(self.go)
        column.addLayout(bar)
        column.addWidget(self.stack, 1)
        self.strip = ExposureStrip(self.desk, self.tone)
        self.strip.picked.connect(self.desk.select)
        column.addWidget(self.strip)
        splitter.addWidget(middle)
        self.side = SideColumn(self.desk, self.tone)
        self.facts = self.side.facts
        splitter.addWidget(self.side)
        splitter.setSizes([210, 820, 250])
        splitter.setStretchFactor(1, 1)
        self.go(0)
        return splitter

    def _make_place(self, kind: type[Place]) -> Place:
        place = kind(self.desk, self.tone)
        match place.noun:
            case "Map":
                place.cells.opened.connect(lambda: self.go_to("Reading"))  # type: ignore[attr-defined]
            case "Doubts":
                place.opened.connect(lambda: self.go_to("Reading"))  # type: ignore[attr-defined]
            case "Summary":
                place.wanted.connect(self.files.write_summary)  # type: ignore[attr-defined]
        return place

    # --- following the desk ----------------------------------------------------------------

    def _campaign_changed(self) -> None:
        file = self.desk.file
        if self.pages.currentIndex() != PROPOSALS:
            self.pages.setCurrentIndex(WELCOME if file is None else WORK)
        if file is not self._shown:
            self._shown = file
            self.arrivals.set_aside()
        title = "coatgui"
        if file is not None:
            title = f"{file.campaign.title} · coatgui"
            self.status.kept.setText(self._how_kept(file))
            if self.desk.is_saved:
                self.files.remember(file.path)
        else:
            self.status.kept.setText("")
            self.welcome.show_recent(self.files.recent_names())
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
        self._behind = dict.fromkeys(range(len(ORDER)), True)
        parts = (self.project.refresh, self._refresh_places, self._show_facts)
        self._parts = []
        if file is None or len(file.campaign.readings) < _MANY:
            for part in parts:
                part()
        else:
            # One after another, with a look at keys and mouse between them.
            self._parts = list(parts)
            QTimer.singleShot(0, self, self._next_part)

    def _next_part(self) -> None:
        if self._parts:
            self._parts.pop(0)()
            QTimer.singleShot(0, self, self._next_part)

    def _refresh_places(self) -> None:
        """Doubts are counted beside their place's noun; other places follow when they are seen."""
        self._catch_up(self.stack.currentIndex())
        doubts = NOUNS.index("Doubts")
        if self.desk.has_doubts() or self.places.is_built(doubts):
            self._catch_up(doubts)
            found = self.places[doubts].doubts  # type: ignore[attr-defined]
            self.buttons.button(doubts).setText(f"Doubts  {len(found)}" if found else "Doubts")

    def _how_kept(self, file: CampaignFile) -> str:
        if file.read_only_because:
            return f"{file.path.name}: read only"
        return f"kept in {file.path.name}" if self.desk.is_saved else _UNSAVED

    def _catch_up(self, number: int) -> None:
        """Show in a place what it has missed: a campaign, or another selection only."""
        whole = self._behind.pop(number, None)
        if whole:
            self.places[number].show_campaign()
        elif whole is not None:
            self.places[number].show_selection()

    def _selected(self) -> None:
        self.project.mark(self.desk.selection)
        for number in range(len(ORDER)):
            self._behind.setdefault(number, False)
        self._catch_up(self.stack.currentIndex())
        self._show_facts()

    def _show_facts(self) -> None:
        self.side.refresh()
        self.strip.refresh()

    def _worked(self, stage: str, done: int, total: int) -> None:
        for entry, action in self._actions:
            if entry.needs == "work":
                action.setEnabled(bool(stage))
        self.status.worked(stage, done, total)

    def _told(self, sentence: str) -> None:
        self.statusBar().showMessage(sentence, 20_000)

    # --- actions ---------------------------------------------------------------------------

    def open_path(self, path: Path) -> None:
        self.files.open_path(path)

    def judge_again(self) -> None:
        self.desk.judge()

    def halt_work(self) -> None:
        self.desk.stop()

    @property
    def dry_run(self) -> DryRunPage:
        return self.arrivals.page

    def open_place(self) -> Place:
        return self.places[self.stack.currentIndex()]

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
        shown = self.places[place]  # built before it is seen
        self.stack.setCurrentIndex(place)
        self._catch_up(place)
        self.buttons.button(place).setChecked(True)
        policy = Qt.FocusPolicy
        for button in self.buttons.buttons():
            # Tab comes to the open place's button; left and right go on to the others.
            button.setFocusPolicy(policy.StrongFocus if button.isChecked() else policy.ClickFocus)
        # The reading's own place shows the facts where they lie in the coating, and the doubts show
        # their evidence.
        self.side.make_room(not shown.leaves_facts)
        self.strip.setVisible(shown.has_strip)

    def go_to(self, noun: str) -> None:
        self.go(NOUNS.index(noun))

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
        for place in self.places.built:
            place.paint_in(self.tone)
        self.project.paint_in(self.tone)
        self.arrivals.paint_in(self.tone)
        self.side.paint_in(self.tone)
        self.strip.tone = self.tone
        self.strip.update()

    # --- drops, closing --------------------------------------------------------------------

    def dragEnterEvent(self, event: QDragEnterEvent) -> None:
        if event.mimeData().hasUrls():
            event.acceptProposedAction()

    def dropEvent(self, event: QDropEvent) -> None:
        paths = [Path(url.toLocalFile()) for url in event.mimeData().urls() if url.isLocalFile()]
        alone = paths[0] if len(paths) == 1 else Path()
        if alone.suffix == ".coatgui" or (
            self.desk.file is None and len(paths) == 1 and alone.is_dir()
        ):
            self.open_path(alone)
        elif paths:
            self.incoming.bring_in(paths)

    def closeEvent(self, event: QCloseEvent) -> None:
        if not self.files.may_leave():
            event.ignore()
            return
        self.hide()
        self.settings.setValue("geometry", self.saveGeometry())
        self.arrivals.close()
        self.desk.close()
        self.keeping.close()
        event.accept()

    def changeEvent(self, event: QEvent) -> None:
        super().changeEvent(event)
        there = hasattr(self, "keeping")  # events come before the window is built
        if event.type() == QEvent.Type.ActivationChange and there and self.isActiveWindow():
            self.keeping.look()
