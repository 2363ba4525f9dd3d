"""Pages, pictures and PDF by Qt, which is imported only when it is asked for: with `book.py`, the
only files outside the window that use it.

What Qt cannot write (bookmarks, alternative texts, fixed dates) `pdf_marks.py` adds.
"""

from __future__ import annotations

import os
import sys
from collections.abc import Callable
from pathlib import Path
from typing import TYPE_CHECKING, Any

from coatgui.output.book import DOTS, HIGH, UNIT, WIDE, Book, picture
from coatgui.output.document import Document, Figure
from coatgui.output.pdf_marks import Bookmark, Described, marked
from coatgui.output.text import printable
from coatgui.output.whole import write_whole

if TYPE_CHECKING:
    from PySide6.QtGui import QImage, QPainter, QPdfWriter

_PICTURE_SCALE = 2.5  # pixels to the point


class PagesUnavailable(Exception):
    """Qt cannot be used; the message can be shown."""


def require_qt() -> None:
    """Make sure that pages can be painted, without a display. Raises PagesUnavailable."""
    if sys.platform.startswith("linux"):
        os.environ.setdefault("QT_QPA_PLATFORM", "offscreen")
    try:
        from PySide6 import QtSvg, QtWidgets  # noqa: F401
    except ImportError as error:
        raise PagesUnavailable(
            f"a PDF or PNG needs Qt's libraries, which cannot be loaded ({error}); install them, "
            "or ask for HTML and SVG, which need none."
        ) from None
    if QtWidgets.QApplication.instance() is None:
        # Of the kind that a window needs: there can be only one in a process, for as long as it
        # runs, and a window may come later.
        _kept.append(QtWidgets.QApplication(["coatgui"]))


_kept: list[Any] = []


def write_pdf(document: Document, path: Path) -> None:
    """Write the document as PDF, whole or not at all. Raises OSError and PagesUnavailable."""
    content = pdf_bytes(document)
    write_whole(path, lambda file: file.write(content))


def pdf_bytes(document: Document) -> bytes:
    """The document as PDF; the same document gives the same bytes on one machine. Raises
    PagesUnavailable."""
    require_qt()
    from PySide6.QtCore import QMarginsF
    from PySide6.QtGui import QPageLayout, QPageSize

    layout = QPageLayout(
        QPageSize(QPageSize.PageSizeId.A4),
        QPageLayout.Orientation.Portrait,
        QMarginsF(0, 0, 0, 0),
    )
    book = Book(document)
    # Once to count the pages, and once to paint them: pages kept would fill the memory.
    total = Book(document).set_out()
    book = Book(document, total)

    def paint(painter: QPainter, writer: QPdfWriter) -> None:
        def turn() -> QPainter:
            writer.newPage()
            return painter

        book.paint(painter, turn)

    raw = _written(document.title, document.author, layout, paint)
    return marked(
        raw,
        title=document.title,
        author=document.author,
        subject=document.subject,
        bookmarks=book.bookmarks,
        described=book.described,
    )


def figure_pdf(figure: Figure) -> bytes:
    """One figure as a page of its own size. Raises PagesUnavailable."""
    require_qt()
    from PySide6.QtCore import QMarginsF, QRectF, QSizeF
    from PySide6.QtGui import QPageLayout, QPageSize

    drawing = figure.drawing
    size = QPageSize(
        QSizeF(drawing.width, drawing.height),
        QPageSize.Unit.Point,
        "",
        QPageSize.SizeMatchPolicy.ExactMatch,
    )
    layout = QPageLayout(size, QPageLayout.Orientation.Portrait, QMarginsF(0, 0, 0, 0))
    whole = QRectF(0, 0, drawing.width * UNIT, drawing.height * UNIT)
    raw = _written(
        figure.name, "", layout, lambda painter, _: picture(figure).render(painter, whole)
    )
    everything = (0.0, 0.0, drawing.width, drawing.height)
    return marked(
        raw,
        title=figure.caption,
        author="",
        subject=figure.alternative,
        bookmarks=[],
        described=[Described(0, everything, figure.alternative)],
    )


def figure_png(figure: Figure) -> bytes:
    """One figure as a picture on white. Raises PagesUnavailable."""
    require_qt()
    from PySide6.QtCore import QBuffer, QIODevice, Qt
    from PySide6.QtGui import QImage, QPainter

    drawing = figure.drawing
    wide, high = (round(v * _PICTURE_SCALE) for v in (drawing.width, drawing.height))
    image = QImage(wide, high, QImage.Format.Format_RGB32)
    image.fill(Qt.GlobalColor.white)
    painter = QPainter(image)
    painter.setRenderHint(QPainter.RenderHint.Antialiasing)
    picture(figure).render(painter)
    painter.end()
    image.setText("Description", printable(figure.alternative))
    buffer = QBuffer()
    buffer.open(QIODevice.OpenModeFlag.WriteOnly)
    if not image.save(buffer, "PNG"):  # type: ignore[call-overload]
        raise OSError("the picture could not be made into a PNG")
    return bytes(buffer.data().data())


def paint_pages(
    document: Document, pixels_across: int, take: Callable[[int, int, QImage], object]
) -> tuple[Bookmark, ...]:
    """Paint the pages as they print, so many pixels wide, and give each to `take` with its place,
    from 0, and how many there are. In any thread; what `take` raises ends it. Returns where the
    headings stand. Raises PagesUnavailable."""
    require_qt()
    from PySide6.QtCore import Qt
    from PySide6.QtGui import QImage, QPainter

    total = Book(document).set_out()
    scale = pixels_across / (WIDE * UNIT)
    size = (pixels_across, round(pixels_across * HIGH / WIDE))
    book = Book(document, total)

    def begin() -> tuple[QImage, QPainter]:
        image = QImage(*size, QImage.Format.Format_RGB32)
        image.fill(Qt.GlobalColor.white)
        painter = QPainter(image)
        painter.setRenderHint(QPainter.RenderHint.Antialiasing)
        painter.scale(scale, scale)
        return image, painter

    image, painter = begin()

    def turn() -> QPainter:
        nonlocal image, painter
        painter.end()
        take(book.page - 1, total, image)
        image, painter = begin()
        return painter

    try:
        book.paint(painter, turn)
    finally:
        painter.end()
    take(book.page, total, image)
    return tuple(book.bookmarks)


def page_height(width: float) -> float:
    """How high a page is that is so wide."""
    return width * HIGH / WIDE


def _written(
    title: str, author: str, layout: Any, paint: Callable[[QPainter, QPdfWriter], object]
) -> bytes:
    from PySide6.QtCore import QBuffer, QIODevice
    from PySide6.QtGui import QPainter, QPdfWriter

    buffer = QBuffer()
    buffer.open(QIODevice.OpenModeFlag.WriteOnly)
    writer = QPdfWriter(buffer)
    writer.setPageLayout(layout)
    writer.setTitle(printable(title))
    writer.setAuthor(printable(author))
    writer.setCreator("coatgui")
    writer.setResolution(DOTS)
    painter = QPainter(writer)
    paint(painter, writer)
    painter.end()
    buffer.close()
    return bytes(buffer.data().data())
