"""The open place's plots and data, taken along: as a picture, a drawing or a table."""

from __future__ import annotations

from collections.abc import Callable

from PySide6.QtWidgets import QApplication, QWidget

from coatgui.window.desk import Desk
from coatgui.window.figure import as_text, on_white, picture, save
from coatgui.window.file_actions import FileActions
from coatgui.window.places.place import Place
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

    def copy_picture(self) -> None:
        def copy(widgets: list[QWidget], caption: str) -> None:
            QApplication.clipboard().setImage(picture(widgets, caption))
            self.desk.told.emit("The picture is on the clipboard.")

        self._on_paper(copy)

    def save_picture(self) -> None:
        path = self.files.to_write("Picture", "Drawing (*.svg);;Picture (*.png)", ".svg")
        if path is None:
            return

        def write(widgets: list[QWidget], caption: str) -> None:
            try:
                save(widgets, caption, path)
            except OSError as error:
                self.trouble.say(f"{path.name} could not be written: {error.strerror}.")
            else:
                self.desk.told.emit(f"Written: {path.name}")

        self._on_paper(write)

    def copy_table(self) -> None:
        rows = self._open_place().data_rows()
        if len(rows) < 2:
            self.trouble.say("There are no data here to copy: go to Map, Reading or Course.")
            return
        QApplication.clipboard().setText(as_text(rows))
        self.desk.told.emit(f"{len(rows) - 1} rows are on the clipboard, for a spreadsheet.")
