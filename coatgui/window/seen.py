"""What was seen on a panel: visual ratings by their scales, and photographs."""

from __future__ import annotations

from pathlib import Path
from typing import Any

from PySide6.QtCore import QSize, Qt, Signal
from PySide6.QtGui import QHideEvent, QIcon, QKeyEvent, QPainter, QPaintEvent, QPixmap, QShowEvent
from PySide6.QtWidgets import (
    QComboBox,
    QFileDialog,
    QGridLayout,
    QHBoxLayout,
    QLineEdit,
    QListWidget,
    QListWidgetItem,
    QPushButton,
    QScrollArea,
    QVBoxLayout,
    QWidget,
)

from coatgui.campaign import CampaignFileError, operations
from coatgui.campaign.photographs import LARGEST_BYTES
from coatgui.records import Panel, Photograph, Rating, VisualRating
from coatgui.window.desk import Desk
from coatgui.window.palette import Colours
from coatgui.window.photographs import SMALL, SmallPictures, seen_large
from coatgui.window.places.place import plain_label, plain_tip

_ID = Qt.ItemDataRole.UserRole
_LINES = {
    "grade": ("Rating", ""),
    "edition": ("Edition", ""),
    "rater": ("Rated by", "who looked"),
    "remark": ("Remark", ""),
}
_PHOTOGRAPHS = "Photographs (*.jpg *.jpeg *.png)"


def rating_words(rating: VisualRating) -> str:
    """A rating as a line: when, by which scale, which grade, and by whom."""
    from coatgui.assessment.ratings import edition, scales  # late: it brings all of assessment

    scale = scales().get(rating.scale)
    name = rating.scale if scale is None else f"{scale['name']}"
    words = f"{rating.exposure_h:g} h: {name}: {rating.value}"
    by = [rating.edition if scale is None else edition(rating), rating.rater, rating.remark]
    return f"{words}\n{'; '.join(text for text in by if text)}"


class SeenView(QScrollArea):
    """Ratings and photographs of the picked panel, and a form for more at the picked reading."""

    def __init__(self, desk: Desk, tone: Colours) -> None:
        super().__init__()
        self.desk, self.tone = desk, tone
        self.setWidgetResizable(True)
        self.setHorizontalScrollBarPolicy(Qt.ScrollBarPolicy.ScrollBarAlwaysOff)
        self.setFocusPolicy(Qt.FocusPolicy.NoFocus)
        page = QWidget()
        self.setWidget(page)
        column = QVBoxLayout(page)
        column.setContentsMargins(12, 8, 12, 12)
        column.setSpacing(6)
        self.about = plain_label("fact_title")
        column.addWidget(self.about)
        self._heading(column, "Ratings of this panel")
        self.ratings = _list(
            "Ratings of this panel",
            "Delete takes out the rating that is picked",
            "None yet: choose a scale below and type the rating.",
        )
        column.addWidget(self.ratings, 2)
        self.remove_rating = QPushButton("Remove the rating")
        self.remove_rating.setAccessibleDescription("Take the picked rating out; it can be undone")
        self.remove_rating.clicked.connect(lambda _checked=False: self._remove_rating())
        column.addWidget(self.remove_rating)
        self._form(column)
        self._heading(column, "Photographs of this panel")
        self.pictures = _list(
            "Photographs of this panel",
            "Return shows the picked one large, Delete takes it out",
            "None yet: add a JPEG or PNG.",
        )
        self.pictures.setIconSize(SMALL)
        self.pictures.itemActivated.connect(lambda _item: self.show_large())
        column.addWidget(self.pictures, 2)
        self.caption = QLineEdit()
        self.caption.setPlaceholderText("caption of the picked photograph")
        self.caption.setAccessibleName("Caption of the picked photograph")
        self.caption.setAccessibleDescription("Return keeps it")
        self.caption.editingFinished.connect(self._caption_typed)
        column.addWidget(self.caption)
        row = QHBoxLayout()
        self.add = QPushButton("Add a photograph…")
        self.add.setAccessibleDescription("Attach a photograph to the picked reading")
        self.add.clicked.connect(lambda _checked=False: self.ask_photographs())
        self.large = QPushButton("Show large")
        self.large.setAccessibleDescription("The picked photograph in a window of its own")
        self.large.clicked.connect(lambda _checked=False: self.show_large())
        self.remove = QPushButton("Remove")
        self.remove.setAccessibleDescription("Take the picked photograph out; it can be undone")
        self.remove.clicked.connect(lambda _checked=False: self._remove_picture())
        column.addWidget(self.add)
        for button in (self.large, self.remove):
            row.addWidget(button)
        column.addLayout(row)
        self.ratings.deleted.connect(self._remove_rating)
        self.pictures.deleted.connect(self._remove_picture)
        self.ratings.currentRowChanged.connect(self._enable)
        self.pictures.currentRowChanged.connect(self._picked_picture)
        self.small = SmallPictures(self)
        self.small.came.connect(self._draw_pictures)

    def _heading(self, column: QVBoxLayout, text: str) -> None:
        label = plain_label("fact_name")
        label.setText(text)
        column.addWidget(label)

    def _form(self, column: QVBoxLayout) -> None:
        self.scale = QComboBox()
        self.scale.setAccessibleName("Scale of the rating")
        self.scale.setAccessibleDescription("The standard that the rating goes by")
        self.scale.setMinimumContentsLength(10)
        self.scale.setSizeAdjustPolicy(
            QComboBox.SizeAdjustPolicy.AdjustToMinimumContentsLengthWithIcon
        )
        self.scale.currentIndexChanged.connect(self._say_scale)
        column.addWidget(self.scale)
        grid = QGridLayout()
        grid.setVerticalSpacing(4)
        self.lines: dict[str, QLineEdit] = {}
        for place, (field, (name, hint)) in enumerate(_LINES.items()):
            label = plain_label("small")
            label.setText(name)
            line = QLineEdit()
            line.setAccessibleName(name)
            line.setAccessibleDescription(hint or f"{name} of the new rating")
            line.setPlaceholderText(hint)
            line.returnPressed.connect(self.rate)
            grid.addWidget(label, place, 0)
            grid.addWidget(line, place, 1)
            self.lines[field] = line
        column.addLayout(grid)
        self.wrong = plain_label("wrong")
        self.wrong.hide()
        column.addWidget(self.wrong)
        self.take = QPushButton("Rate")
        self.take.setAccessibleDescription("Add the rating to the panel at the picked time")
        self.take.clicked.connect(lambda _checked=False: self.rate())
        column.addWidget(self.take)

    # --- showing ---------------------------------------------------------------------------

    def _panel(self) -> Panel | None:
        reading, campaign = self.desk.reading(), self.desk.campaign
        if reading is None or campaign is None:
            return None
        return next((p for p in campaign.panels if p.panel_id == reading.panel_id), None)

    def _fill_scales(self) -> None:
        if self.scale.count():
            return
        from coatgui.assessment.ratings import scales  # late: it brings all of assessment

        for scale_id, scale in scales().items():
            self.scale.addItem(str(scale["name"]), scale_id)

    def _say_scale(self) -> None:
        from coatgui.assessment.ratings import scales

        scale: dict[str, Any] = scales().get(str(self.scale.currentData()), {})
        self.lines["grade"].setPlaceholderText(str(scale.get("example", "")))
        self.lines["grade"].setToolTip(str(scale.get("example", "")))
        self.lines["edition"].setPlaceholderText(str(scale.get("edition", "")))
        self.scale.setToolTip(plain_tip(str(scale.get("source", ""))))

    def refresh(self) -> None:
        self._fill_scales()
        panel, reading, campaign = self._panel(), self.desk.reading(), self.desk.campaign
        there = panel is not None and reading is not None
        self.about.setText(
            f"{panel.name}, {reading.exposure_h:g} h" if panel and reading else
            "Pick a reading to say what was seen then."
        )  # fmt: skip
        for widget in (self.take, self.add, self.scale, *self.lines.values()):
            widget.setEnabled(there)
        own: list[Rating] = []
        if campaign is not None and panel is not None:
            own = [r for r in campaign.ratings if r.seen.panel_id == panel.panel_id]
        row = self.ratings.currentRow()
        self.ratings.clear()
        for rating in sorted(own, key=lambda r: (r.seen.exposure_h, r.seen.scale)):
            here = reading is not None and rating.seen.exposure_h == reading.exposure_h
            item = QListWidgetItem(f"{'● ' if here else ''}{rating_words(rating.seen)}")
            item.setData(_ID, rating.rating_id)
            self.ratings.addItem(item)
        self.ratings.setCurrentRow(min(row, self.ratings.count() - 1))
        self._draw_pictures()
        self._enable()

    def photographs(self) -> list[Photograph]:
        """Those of the picked panel, by exposure time."""
        panel, campaign = self._panel(), self.desk.campaign
        if panel is None or campaign is None:
            return []
        own = [p for p in campaign.photographs if p.panel_id == panel.panel_id]
        return sorted(own, key=lambda p: -1.0 if p.exposure_h is None else p.exposure_h)

    def _draw_pictures(self) -> None:
        own, reading = self.photographs(), self.desk.reading()
        row = self.pictures.currentRow()
        self.pictures.blockSignals(True)
        self.pictures.clear()
        for photograph in own:
            when = "" if photograph.exposure_h is None else f"{photograph.exposure_h:g} h"
            here = reading is not None and photograph.exposure_h == reading.exposure_h
            name = photograph.caption or photograph.file or "photograph"
            item = QListWidgetItem(f"{'● ' if here else ''}{when}\n{name}")
            item.setData(_ID, photograph.photograph_id)
            image = self.small.of(photograph)
            if image is not None and not image.isNull():
                item.setIcon(QIcon(QPixmap.fromImage(image)))
            elif image is not None:
                item.setText(f"{item.text()} (cannot be read)")
            item.setSizeHint(QSize(100, SMALL.height() + 6))
            self.pictures.addItem(item)
        self.pictures.setCurrentRow(min(max(row, 0), self.pictures.count() - 1))
        self.pictures.blockSignals(False)
        self._picked_picture()
        if own and self.desk.file is not None and self.isVisible():
            self.small.want(self.desk.file, own)

    def _enable(self, _row: int = -1) -> None:
        self.remove_rating.setEnabled(self.ratings.currentRow() >= 0)
        picked = self.pictures.currentRow() >= 0
        for widget in (self.large, self.remove, self.caption):
            widget.setEnabled(picked)

    def _picture(self) -> Photograph | None:
        item = self.pictures.currentItem()
        wanted = None if item is None else item.data(_ID)
        return next((p for p in self.photographs() if p.photograph_id == wanted), None)

    def _picked_picture(self, _row: int = -1) -> None:
        photograph = self._picture()
        self.caption.setText("" if photograph is None else photograph.caption)
        self._enable()

    # --- ratings ---------------------------------------------------------------------------

    def _say(self, sentence: str) -> None:
        self.wrong.setText(f"■  {sentence}" if sentence else "")
        self.wrong.setVisible(bool(sentence))

    def rate(self) -> None:
        """Add what the form says, or say beside it what is wrong with it."""
        from coatgui.assessment.ratings import order

        reading, campaign = self.desk.reading(), self.desk.campaign
        if reading is None or campaign is None:
            return
        fields = {name: line.text().strip() for name, line in self.lines.items()}
        scale = str(self.scale.currentData())
        try:
            order(scale, fields["grade"])
            seen = VisualRating(
                reading.panel_id, reading.exposure_h, scale, fields["grade"],
                fields["edition"], fields["rater"], fields["remark"],
            )  # fmt: skip
            operations.add_ratings(campaign, [seen])
        except (ValueError, CampaignFileError) as error:
            self._say(str(error))
            return
        self._say("")
        for name in ("grade", "remark"):  # edition and rater serve the next panel as well
            self.lines[name].clear()
        self.desk.edit(operations.add_ratings, [seen])

    def _remove_rating(self) -> None:
        item = self.ratings.currentItem()
        if item is not None:
            self.desk.edit(operations.remove_ratings, [str(item.data(_ID))])

    # --- photographs -----------------------------------------------------------------------

    def ask_photographs(self) -> None:
        names, _ = QFileDialog.getOpenFileNames(self, "Photographs", "", _PHOTOGRAPHS)
        for name in names:
            self.add_photograph(Path(name))

    def add_photograph(self, path: Path) -> None:
        """Attach a file to the picked reading."""
        reading = self.desk.reading()
        if reading is None:
            return
        try:
            if path.stat().st_size > LARGEST_BYTES:
                self.desk.failed.emit(
                    f"{path.name} is larger than {LARGEST_BYTES / 1e6:.0f} MB: save it smaller "
                    "first."
                )
                return
            content = path.read_bytes()
        except OSError as error:
            self.desk.failed.emit(f"{path.name} could not be read: {error.strerror}.")
            return
        self.desk.edit(
            operations.add_photograph,
            reading.panel_id,
            content,
            file=path.name,
            exposure_h=reading.exposure_h,
        )

    def _caption_typed(self) -> None:
        photograph = self._picture()
        text = self.caption.text().strip()
        if photograph is not None and text != photograph.caption:
            self.desk.edit(operations.edit_photograph, photograph.photograph_id, caption=text)

    def _remove_picture(self) -> None:
        photograph = self._picture()
        if photograph is not None:
            self.desk.edit(operations.remove_photograph, photograph.photograph_id)

    def show_large(self) -> None:
        photograph, panel, file = self._picture(), self._panel(), self.desk.file
        if photograph is None or panel is None or file is None:
            return
        when = "" if photograph.exposure_h is None else f", {photograph.exposure_h:g} h"
        title = f"{panel.name}{when}: {photograph.caption or photograph.file}"
        try:
            window = seen_large(file, photograph, title, self.window())
        except CampaignFileError as error:
            self.desk.failed.emit(str(error))
            return
        if window is None:
            self.desk.failed.emit("This photograph cannot be read.")
        else:
            window.show()

    def showEvent(self, event: QShowEvent) -> None:
        super().showEvent(event)
        self.refresh()

    def hideEvent(self, event: QHideEvent) -> None:
        self.small.stop()
        super().hideEvent(event)


class _List(QListWidget):
    """A list in which Delete removes, as it does in the lists of every desktop."""

    deleted = Signal()
    while_empty = ""

    def paintEvent(self, event: QPaintEvent) -> None:
        super().paintEvent(event)
        if not self.count():
            painter = QPainter(self.viewport())
            painter.setPen(self.palette().placeholderText().color())
            where = self.viewport().rect().adjusted(4, 4, -4, -4)
            painter.drawText(where, Qt.TextFlag.TextWordWrap, self.while_empty)
            painter.end()

    def keyPressEvent(self, event: QKeyEvent) -> None:
        if event.key() == Qt.Key.Key_Delete:
            self.deleted.emit()
        else:
            super().keyPressEvent(event)


def _list(name: str, description: str, while_empty: str) -> _List:
    made = _List()
    made.while_empty = while_empty
    made.setAccessibleName(name)
    made.setAccessibleDescription(description)
    made.setWordWrap(True)
    made.setMinimumHeight(110)
    made.setMinimumWidth(60)
    made.setHorizontalScrollBarPolicy(Qt.ScrollBarPolicy.ScrollBarAlwaysOff)
    return made
