"""Photographs of a panel: small pictures made in the background, one seen large in a window."""

from __future__ import annotations

from collections.abc import Sequence

from PySide6.QtCore import QBuffer, QByteArray, QIODevice, QObject, QSize, Qt, QTimer, Signal
from PySide6.QtGui import QImage, QImageReader, QPixmap, QResizeEvent
from PySide6.QtWidgets import QDialog, QLabel, QVBoxLayout, QWidget

from coatgui.campaign import CampaignFile, CampaignFileError
from coatgui.jobs import Job, run_in_background
from coatgui.progress import Progress
from coatgui.records import Photograph

SMALL = QSize(104, 78)
_LARGE = QSize(1600, 1200)
_POLL_MS = 60
_MOST_KEPT = 500
_FORMATS = {"image/png": b"png", "image/jpeg": b"jpeg"}


def decoded(content: bytes, media_type: str, most: QSize) -> QImage:
    """A picture no larger than `most`, turned as the camera says; empty where it cannot be read.
    Only the one format that the content was found to have is tried."""
    held = QBuffer()
    held.setData(QByteArray(content))
    held.open(QIODevice.OpenModeFlag.ReadOnly)
    reader = QImageReader(held, QByteArray(_FORMATS.get(media_type, b"png")))
    reader.setAutoTransform(True)
    size = reader.size()
    if size.isValid() and (size.width() > most.width() or size.height() > most.height()):
        reader.setScaledSize(size.scaled(most, Qt.AspectRatioMode.KeepAspectRatio))
    return reader.read()


def _make_small(
    file: CampaignFile, wanted: Sequence[Photograph], kept: dict[str, QImage], *, progress: Progress
) -> None:
    for done, photograph in enumerate(wanted):
        progress.at("Looking at photographs", done, len(wanted))
        try:
            content = file.raw(photograph.sha256)
        except CampaignFileError:
            content = None
        found = QImage() if content is None else decoded(content, photograph.media_type, SMALL)
        kept[photograph.sha256] = found


class SmallPictures(QObject):
    """Makes small pictures beside the window; `came` is sent when there are more."""

    came = Signal()

    def __init__(self, parent: QObject) -> None:
        super().__init__(parent)
        self._kept: dict[str, QImage] = {}
        self._job: Job | None = None
        self._timer = QTimer(self)
        self._timer.setInterval(_POLL_MS)
        self._timer.timeout.connect(self._poll)

    @property
    def busy(self) -> bool:
        return self._job is not None

    def want(self, file: CampaignFile, photographs: Sequence[Photograph]) -> None:
        missing = [p for p in photographs if p.sha256 not in self._kept]
        if not missing:
            return
        self.stop()
        if len(self._kept) > _MOST_KEPT:
            self._kept.clear()
        self._job = run_in_background(_make_small, file, missing, self._kept)
        self._timer.start()

    def of(self, photograph: Photograph) -> QImage | None:
        """The small picture: None until it is made, empty where it cannot be read."""
        return self._kept.get(photograph.sha256)

    def stop(self) -> None:
        self._timer.stop()
        if self._job is not None:
            self._job.cancel()
            self._job = None

    def _poll(self) -> None:
        if self._job is not None and self._job.done:
            self._job = None
            self._timer.stop()
            self.came.emit()


class PhotographWindow(QDialog):
    """One photograph as large as the window; what is drawn is a picture and nothing else."""

    def __init__(self, image: QImage, title: str, parent: QWidget) -> None:
        super().__init__(parent)
        self.setAttribute(Qt.WidgetAttribute.WA_DeleteOnClose)
        self.setWindowTitle(title)
        self._picture = QPixmap.fromImage(image)
        self._label = QLabel()
        self._label.setAlignment(Qt.AlignmentFlag.AlignCenter)
        self._label.setMinimumSize(200, 150)
        self._label.setAccessibleName(title)
        column = QVBoxLayout(self)
        column.setContentsMargins(0, 0, 0, 0)
        column.addWidget(self._label)
        room = QSize(900, 700)
        self.resize(self._picture.size().scaled(room, Qt.AspectRatioMode.KeepAspectRatio))

    def resizeEvent(self, event: QResizeEvent) -> None:
        self._label.setPixmap(
            self._picture.scaled(
                self._label.size(),
                Qt.AspectRatioMode.KeepAspectRatio,
                Qt.TransformationMode.SmoothTransformation,
            )
        )
        super().resizeEvent(event)


def seen_large(
    file: CampaignFile, photograph: Photograph, title: str, parent: QWidget
) -> PhotographWindow | None:
    """A window with the photograph, or None where it cannot be read."""
    content = file.raw(photograph.sha256)
    image = QImage() if content is None else decoded(content, photograph.media_type, _LARGE)
    return None if image.isNull() else PhotographWindow(image, title, parent)
