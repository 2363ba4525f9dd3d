"""The inspection summary as pages to look at, painted in the background as they will print."""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass, field

from PySide6.QtCore import QBuffer, QIODevice, QObject, QPoint, QRect, Qt, QTimer, Signal
from PySide6.QtGui import QColor, QImage, QKeyEvent, QPainter, QPaintEvent, QResizeEvent
from PySide6.QtWidgets import QAbstractScrollArea, QFrame

from coatgui.jobs import Job, run_in_background
from coatgui.output.document import Document
from coatgui.output.pages import page_height, paint_pages
from coatgui.output.pdf_marks import Bookmark
from coatgui.progress import Progress
from coatgui.window.palette import Colours

_POLL_MS = 50
_SETTLED_MS = 200
_GAP = 16
_WIDEST = 900
# Pages lie ready as small files; so many of them are kept as pictures, too.
_DECODED = 6


@dataclass
class _Painted:
    """What the background has brought so far; only ever added to."""

    pages: list[bytes] = field(default_factory=list)
    total: int = 0
    document: Document | None = None
    headings: tuple[Bookmark, ...] = ()


def _paint(
    make: Callable[[], Document], pixels: int, into: _Painted, *, progress: Progress
) -> None:
    document = make()
    progress.check()

    def take(place: int, total: int, image: QImage) -> None:
        progress.at("Setting the summary", place, total)
        held = QBuffer()
        held.open(QIODevice.OpenModeFlag.WriteOnly)
        # Lightly packed: quick to look at again.
        image.save(held, "PNG", 80)  # type: ignore[call-overload]
        into.total = total
        into.pages.append(bytes(held.data().data()))

    into.headings = paint_pages(document, pixels, take)
    into.document = document


class Printing(QObject):
    """Paints a document in the background; `came` is sent as pages come, `finished` when all are
    there. What was painted before is to be had until a page takes its place."""

    came = Signal()
    finished = Signal()

    def __init__(self, parent: QObject) -> None:
        super().__init__(parent)
        self.pages: list[bytes] = []
        self.headings: tuple[Bookmark, ...] = ()
        self.document: Document | None = None
        self.trouble = ""
        self._job: Job | None = None
        self._new = _Painted()
        self._taken = 0
        self._timer = QTimer(self)
        self._timer.setInterval(_POLL_MS)
        self._timer.timeout.connect(self._poll)

    @property
    def busy(self) -> bool:
        return self._job is not None

    @property
    def standing(self) -> str:
        """How far the painting is, in words."""
        return f"Page {self._taken} of {self._new.total} is set …" if self._new.total else ""

    def begin(self, make: Callable[[], Document], pixels: int) -> None:
        """Paint what `make` gives, so many pixels wide; what was being painted is given up."""
        self.stop()
        self._new, self._taken, self.trouble = _Painted(), 0, ""
        self._job = run_in_background(_paint, make, pixels, self._new)
        self._timer.start()

    def forget(self) -> None:
        self.stop()
        self.pages, self.headings, self.document = [], (), None

    def stop(self) -> None:
        self._timer.stop()
        if self._job is not None:
            self._job.cancel()
            self._job = None

    def _poll(self) -> None:
        job = self._job
        if job is None:
            return
        ended = job.done  # asked first: what came until then is there below
        there = len(self._new.pages)
        if there > self._taken:
            self.pages[self._taken : there] = self._new.pages[self._taken : there]
            self._taken = there
        if not ended:
            self.came.emit()
            return
        self._job = None
        self._timer.stop()
        if job.error is not None:
            self.trouble = f"The summary could not be set: {job.error}"
        else:
            del self.pages[self._new.total :]
            self.headings, self.document = self._new.headings, self._new.document
        self.came.emit()
        self.finished.emit()


class PagesView(QAbstractScrollArea):
    """Pages one under another. `widened` is sent when pages of another width are wanted, `moved`
    with the page at the top."""

    widened = Signal()
    moved = Signal(int)

    def __init__(self, tone: Colours) -> None:
        super().__init__()
        self.tone = tone
        self._pages: list[bytes] = []
        self._pictures: dict[bytes, QImage] = {}
        self.setAccessibleName("The summary as it will print")
        self.setFrameShape(QFrame.Shape.NoFrame)
        self.setObjectName("pages")
        self.setHorizontalScrollBarPolicy(Qt.ScrollBarPolicy.ScrollBarAlwaysOff)
        # Always there, or the pages would become another width by its coming and going.
        self.setVerticalScrollBarPolicy(Qt.ScrollBarPolicy.ScrollBarAlwaysOn)
        self.setMinimumWidth(240)
        self._settled = QTimer(self)
        self._settled.setSingleShot(True)
        self._settled.setInterval(_SETTLED_MS)
        self._settled.timeout.connect(self.widened)
        self.verticalScrollBar().valueChanged.connect(lambda _: self.moved.emit(self.at_top()))

    def page_width(self) -> int:
        return max(min(self.viewport().width() - 2 * _GAP, _WIDEST), 100)

    def pixels(self) -> int:
        """How many pixels a page is wide on this screen."""
        return math.ceil(self.page_width() * self.devicePixelRatioF())

    def show_pages(self, pages: list[bytes]) -> None:
        self._pages = pages
        self._pictures = {page: p for page, p in self._pictures.items() if page in pages}
        self._measure()
        self.viewport().update()

    def go_to(self, page: int, share: float = 0.0) -> None:
        """Scroll to a page, or to so far down on it."""
        self.verticalScrollBar().setValue(round(page * self._step() + share * self._high()))

    def at_top(self) -> int:
        """The page in the upper half of the view."""
        middle = self.verticalScrollBar().value() + self.viewport().height() / 3
        return max(min(int(middle // self._step()), len(self._pages) - 1), 0)

    def _high(self) -> int:
        return round(page_height(self.page_width()))

    def _step(self) -> int:
        return self._high() + _GAP

    def _measure(self) -> None:
        bar = self.verticalScrollBar()
        whole = len(self._pages) * self._step() + _GAP
        bar.setRange(0, max(whole - self.viewport().height(), 0))
        bar.setPageStep(self.viewport().height())
        bar.setSingleStep(60)

    def _picture(self, place: int) -> QImage:
        page = self._pages[place]
        found = self._pictures.pop(page, None)
        if found is None:
            found = QImage.fromData(page)
        self._pictures[page] = found  # last in the order: used last
        while len(self._pictures) > _DECODED:
            del self._pictures[next(iter(self._pictures))]
        return found

    def paintEvent(self, event: QPaintEvent) -> None:
        painter = QPainter(self.viewport())
        painter.fillRect(event.rect(), QColor(self.tone.panel))
        painter.setRenderHint(QPainter.RenderHint.SmoothPixmapTransform)
        width, high = self.page_width(), self._high()
        left = (self.viewport().width() - width) // 2
        top = _GAP - self.verticalScrollBar().value()
        for place in range(len(self._pages)):
            box = QRect(left, top + place * self._step(), width, high)
            if not box.intersects(event.rect()):
                continue
            picture = self._picture(place)
            ratio = self.devicePixelRatioF()
            if picture.width() == self.pixels():
                picture.setDevicePixelRatio(ratio)
                painter.drawImage(QPoint(box.left(), box.top()), picture)
            else:  # until pages of this width are there
                picture.setDevicePixelRatio(1.0)
                painter.drawImage(box, picture)
            painter.setPen(QColor(self.tone.line))
            painter.drawRect(box.adjusted(-1, -1, 0, 0))
        if self.hasFocus():
            painter.setPen(QColor(self.tone.verdigris))
            painter.drawRect(self.viewport().rect().adjusted(0, 0, -1, -1))
        painter.end()

    def resizeEvent(self, event: QResizeEvent) -> None:
        top, share = self.at_top(), 0.0
        if self._pages and event.oldSize().width() > 0:
            # What stood at the top goes on standing there.
            was = max(min(event.oldSize().width() - 2 * _GAP, _WIDEST), 100)
            step = round(page_height(was)) + _GAP
            share = self.verticalScrollBar().value() / step - top
        self._measure()
        if self._pages and event.oldSize().width() not in (-1, event.size().width()):
            self.verticalScrollBar().setValue(round((top + share) * self._step()))
        if event.oldSize().width() != event.size().width():
            self._settled.start()
        super().resizeEvent(event)

    def keyPressEvent(self, event: QKeyEvent) -> None:
        bar = self.verticalScrollBar()
        keys = Qt.Key
        if event.key() in (keys.Key_Home, keys.Key_End):
            bar.setValue(bar.minimum() if event.key() == keys.Key_Home else bar.maximum())
        else:
            super().keyPressEvent(event)
