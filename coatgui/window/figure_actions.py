"""The open place's plots and data, taken along: as a picture, a drawing or a table."""

from __future__ import annotations

from collections.abc import Callable

from PySide6.QtWidgets import QApplication, QInputDialog, QWidget

from coatgui.window.data_table import DataTable
from coatgui.window.desk import Desk
from coatgui.window.figure import LEAST_MM, MOST_MM, as_text, on_white, picture, save
from coatgui.window.file_actions import FileActions
from coatgui.window.places.place import Place
from coatgui.window.typed import typed
from coatgui.window.welcome import Trouble


class FigureActions:
    """The actions on the plots of the place that `open_place` gives."""

    def __init__(
        self, desk: Desk, files: FileActions, trouble: Trouble, open_place: Callable[[], Place]
    ) -> None:
        self.desk, self.files, self.trouble = desk, files, trouble
        self._open_place = open_place

    def _on_paper(self, then: Callable[[list[QWidget], str], None]) -> None:
        """Hand on the open place's plots while they wear the colours of paper."""
        place = self._open_place()
        if not place.figure():
            self.trouble.say("There is no plot here to copy or save: go to Map, Reading or Course.")
            return
        tone = place.tone
        place.paint_in(on_white())
        try:
            then(place.figure(), place.caption())
        finally:
            place.paint_in(tone)

    def _width_mm(self) -> float | None:
        """How wide the picture shall be: asked, with the last answer suggested."""
        last = str(self.files.settings.value("picture_mm", "160"))
        told = last
        while True:
            told, given = QInputDialog.getText(
                self._open_place(),
                "Width of the picture",
                f"Width in mm, from {LEAST_MM:g} to {MOST_MM:g}; its height follows:",
                text=told,
            )
            if not given:
                return None
            try:
                width = typed(told.removesuffix("mm"), "")
            except ValueError as error:
                self.trouble.say(str(error))
                continue
            if LEAST_MM <= width <= MOST_MM:
                self.files.settings.setValue("picture_mm", f"{width:g}")
                return width

    def copy_picture(self) -> None:
        def copy(widgets: list[QWidget], caption: str) -> None:
            QApplication.clipboard().setImage(picture(widgets, caption))
            self.desk.told.emit("The picture is on the clipboard.")

        self._on_paper(copy)

    def save_picture(self) -> None:
        if not self._open_place().figure():
            self._on_paper(lambda *_: None)  # says so
            return
        kinds = "Drawing (*.svg);;Page (*.pdf);;Picture (*.png)"
        path = self.files.to_write("Picture", kinds, ".svg")
        width_mm = None if path is None else self._width_mm()
        if path is None or width_mm is None:
            return

        def write(widgets: list[QWidget], caption: str) -> None:
            try:
                save(widgets, caption, path, width_mm)
            except OSError as error:
                self.trouble.say(f"{path.name} could not be written: {error.strerror}.")
            else:
                self.desk.told.emit(f"Written: {path.name}")

        self._on_paper(write)

    def show_table(self) -> None:
        """The data behind the plots of the open place, as a table in a window beside."""
        place = self._open_place()
        rows = place.data_rows()
        if len(rows) < 2:
            self.trouble.say("There are no data here to show: go to Map, Reading or Course.")
            return
        table = DataTable(rows, place.caption() or place.noun, place.window())
        table.show()
        table.view.setFocus()

    def copy_table(self) -> None:
        rows = self._open_place().data_rows()
        if len(rows) < 2:
            self.trouble.say("There are no data here to copy: go to Map, Reading or Course.")
            return
        QApplication.clipboard().setText(as_text(rows))
        self.desk.told.emit(f"{len(rows) - 1} rows are on the clipboard, for a spreadsheet.")
