"""Pages, pictures and PDF by Qt: the one file outside the window that uses it, and only when asked.

A document is laid out block by block on A4: a heading stays with what follows, a figure with its
caption, a table's heading row is repeated on every page, and a row breaks only where it is longer
than a page. What Qt cannot write (bookmarks, alternative texts, fixed dates) `pdf_marks.py` adds.
"""

from __future__ import annotations

import os
import sys
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, Any

from coatgui.output.document import (
    Block,
    Document,
    Figure,
    Heading,
    Listing,
    Paragraph,
    Style,
    Table,
)
from coatgui.output.drawing import FONT, GRID, INK, SECOND
from coatgui.output.pdf_marks import Bookmark, Described, marked
from coatgui.output.text import printable
from coatgui.output.whole import write_whole

if TYPE_CHECKING:
    from PySide6.QtGui import QFont, QImage, QPainter, QPdfWriter, QTextLayout

_DOTS = 1200  # to the inch: fine enough that whole pixels do not show
UNIT = _DOTS / 72  # one point
_WIDE, _HIGH = 595.276, 841.89  # A4 in points
_LEFT, _TOP, _BOTTOM = 57.6, 64.0, 60.0
_ACROSS = _WIDE - 2 * _LEFT
_LEADING = 1.36
_GAP = 6.0  # between the columns of a table
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
    book = _Book(document)
    # Once to count the pages, and once to paint them: pages kept would fill the memory.
    total = _Book(document).set_out()
    book = _Book(document, total)

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
        figure.name, "", layout, lambda painter, _: _picture(figure).render(painter, whole)
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
    _picture(figure).render(painter)
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

    total = _Book(document).set_out()
    scale = pixels_across / (_WIDE * UNIT)
    size = (pixels_across, round(pixels_across * _HIGH / _WIDE))
    book = _Book(document, total)

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
        if painter.isActive():  # not where `take` ended it between two pages
            painter.end()
    take(book.page, total, image)
    return tuple(book.bookmarks)


def page_height(width: float) -> float:
    """How high a page is that is so wide."""
    return width * _HIGH / _WIDE


def _picture(figure: Figure) -> Any:
    from PySide6.QtSvg import QSvgRenderer

    return QSvgRenderer(figure.drawing.svg(figure.caption, figure.alternative).encode("utf-8"))


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
    writer.setResolution(_DOTS)
    painter = QPainter(writer)
    paint(painter, writer)
    painter.end()
    buffer.close()
    return bytes(buffer.data().data())


# ---------------------------------------------------------------------------------------------
# Layout


@dataclass(slots=True)
class _Text:
    """Lines of a text, set to a width; `leading` in points."""

    layout: QTextLayout
    leading: float

    @property
    def lines(self) -> int:
        return self.layout.lineCount()

    @property
    def height(self) -> float:
        return self.lines * self.leading

    def paint(self, painter: QPainter, x: float, y: float, first: int, last: int) -> None:
        from PySide6.QtCore import QPointF

        for i in range(first, min(last, self.lines)):
            at = QPointF(x * UNIT, (y + (i - first) * self.leading) * UNIT)
            self.layout.lineAt(i).draw(painter, at)


def _font(size: float, bold: bool) -> QFont:
    from PySide6.QtGui import QFont

    font = QFont([name.strip() for name in FONT.split(",")[:-1]])
    font.setStyleHint(QFont.StyleHint.SansSerif)
    font.setPixelSize(round(size * UNIT))
    font.setBold(bold)
    font.setFeature(QFont.Tag("liga"), 0)  # so that words are found when the file is searched
    return font


class _Book:
    """Lays a document out and, where it has a painter, paints it as it goes."""

    def __init__(self, document: Document, total: int = 0) -> None:
        self.document, self.total = document, total
        self.page = 0
        self.y = _TOP
        self.bookmarks: list[Bookmark] = []
        self.described: list[Described] = []
        self._fonts: dict[tuple[float, bool], QFont] = {}
        self._painter: QPainter | None = None
        self._next: Callable[[], QPainter] | None = None

    def paint(self, painter: QPainter, turn: Callable[[], QPainter]) -> None:
        """Paint the first page with `painter`, each further one with what `turn` gives."""
        self._painter, self._next = painter, turn
        self.set_out()

    def set_out(self) -> int:
        """Lay out the whole document; returns how many pages it takes."""
        self._frame()
        self._flow(self._set(self.document.title, 18, _ACROSS, bold=True))
        self.y += 4
        blocks = list(self.document.numbered())
        for (block, number), follows in zip(blocks, [*blocks[1:], (None, "")], strict=True):
            self.add(block, number, follows[0])
        return self.page + 1

    def _turn(self) -> None:
        """Begin a new page."""
        self.page += 1
        self.y = _TOP
        if self._next is not None:
            self._painter = self._next()
        self._frame()

    # Setting text

    def _set(
        self, text: str, size: float, width: float, *, bold: bool = False, right: bool = False
    ) -> _Text:
        from PySide6.QtCore import QPointF, Qt
        from PySide6.QtGui import QTextLayout, QTextOption

        font = self._fonts.setdefault((size, bold), _font(size, bold))
        layout = QTextLayout(printable(text), font)
        option = QTextOption(Qt.AlignmentFlag.AlignRight if right else Qt.AlignmentFlag.AlignLeft)
        option.setWrapMode(QTextOption.WrapMode.WrapAtWordBoundaryOrAnywhere)
        layout.setTextOption(option)
        layout.beginLayout()
        while (line := layout.createLine()).isValid():
            line.setLineWidth(width * UNIT)
            line.setPosition(QPointF(0, 0))
        layout.endLayout()
        return _Text(layout, size * _LEADING)

    @property
    def _room(self) -> float:
        return _HIGH - _BOTTOM - self.y

    def _need(self, height: float) -> None:
        """A new page where so much does not fit; never an empty one."""
        if height > self._room and self.y > _TOP:
            self._turn()

    def _paint(self, paint: Callable[[QPainter], object]) -> None:
        if self._painter is not None:
            paint(self._painter)

    def _flow(self, text: _Text, x: float = 0.0, colour: str = INK) -> None:
        """A text that may go on over pages; no line of it stands alone."""
        first = 0
        self._need(min(text.lines, 2) * text.leading)
        while first < text.lines:
            self._need(text.leading)
            fit = max(int(self._room / text.leading), 1)
            last = min(first + fit, text.lines)
            if text.lines - last == 1 and last - first > 2:
                last -= 1
            self._text(text, _LEFT + x, self.y, first, last, colour)
            self.y += (last - first) * text.leading
            first = last
            if first < text.lines:
                self._need(self._room + 1)

    def _text(
        self, text: _Text, x: float, y: float, first: int, last: int, colour: str = INK
    ) -> None:
        def paint(painter: QPainter) -> None:
            from PySide6.QtGui import QColor

            painter.setPen(QColor(colour))
            text.paint(painter, x, y, first, last)

        self._paint(paint)

    def _rule(self, y: float, width: float, colour: str) -> None:
        def paint(painter: QPainter) -> None:
            _line(painter, _LEFT, y, _LEFT + _ACROSS, width, colour)

        self._paint(paint)

    # Blocks

    def add(self, block: Block, number: str, follows: Block | None) -> None:
        match block:
            case Heading():
                self._heading(block, number, follows)
            case Paragraph():
                size, colour = {
                    Style.LEAD: (12.0, INK),
                    Style.SMALL: (8.5, SECOND),
                    Style.TEXT: (9.5, INK),
                }[block.style]
                self._flow(self._set(block.text, size, _ACROSS), colour=colour)
                self.y += 7
            case Listing():
                for place, item in enumerate(block.items, start=1):
                    text = self._set(item, 9.5, _ACROSS - 18)
                    self._need(min(text.lines, 2) * text.leading)
                    sign = self._set(f"{place}." if block.numbered else "–", 9.5, 18)
                    self._text(sign, _LEFT, self.y, 0, 1)
                    self._flow(text, 18)
                    self.y += 3
                self.y += 5
            case Figure():
                self._figure(block, number)
            case Table():
                self._table(block, number)

    def _heading(self, heading: Heading, number: str, follows: Block | None) -> None:
        size, before, room = (14.0, 20.0, 110.0) if heading.level == 1 else (11.0, 8.0, 70.0)
        if isinstance(follows, Figure):
            room = follows.drawing.height + 40
        text = self._set(f"{number}  {heading.text}", size, _ACROSS, bold=True)
        if self.y > _TOP:
            self.y += before
        self._need(text.height + room)
        self.bookmarks.append(
            Bookmark(f"{number} {heading.text}", heading.level, self.page, self.y)
        )
        self._flow(text)
        self.y += 5

    def _figure(self, figure: Figure, number: str) -> None:
        drawing = figure.drawing
        caption = self._set(f"{number}. {figure.caption}", 8.5, _ACROSS)
        most = _HIGH - _TOP - _BOTTOM - caption.height - 20
        scale = min(_ACROSS / drawing.width, most / drawing.height, 1.0)
        width, height = drawing.width * scale, drawing.height * scale
        self._need(height + caption.height + 8)
        top, picture = self.y, _picture(figure)

        def paint(painter: QPainter) -> None:
            from PySide6.QtCore import QRectF

            box = QRectF(_LEFT * UNIT, top * UNIT, width * UNIT, height * UNIT)
            picture.render(painter, box)

        self._paint(paint)
        where = (_LEFT, top, _LEFT + width, top + height)
        self.described.append(Described(self.page, where, figure.alternative))
        self.y += height + 4
        self._flow(caption, colour=SECOND)
        self.y += 12

    def _table(self, table: Table, number: str) -> None:
        whole = _ACROSS - _GAP * (len(table.shares) - 1)
        widths = [whole * share / sum(table.shares) for share in table.shares]
        starts = [_LEFT + sum(widths[:i]) + _GAP * i for i in range(len(widths))]
        head = self._cells(table.headings, widths, table, bold=True)
        caption = self._set(f"{number}. {table.caption}", 8.5, _ACROSS)
        rows = [self._cells(cells, widths, table) for cells in table.rows[:2]]
        opening = caption.height + sum(_height(cells) for cells in (head, *rows)) + 8
        self._need(min(opening, _HIGH - _TOP - _BOTTOM))
        self._flow(caption, colour=SECOND)
        self.y += 3
        self._head(head, starts)
        for cells in table.rows:
            row = self._cells(cells, widths, table)
            first, lines = 0, max(cell.lines for cell in row)
            while first < lines:
                rest = (lines - first) * row[0].leading + 4
                page = _HIGH - _TOP - _BOTTOM - _height(head) - 24
                if rest > self._room and (rest <= page or self._room < 4 * row[0].leading):
                    self._turn()
                    again = self._set(f"{number}, continued", 8.5, _ACROSS)
                    self._flow(again, colour=SECOND)
                    self.y += 3
                    self._head(head, starts)
                fit = max(int((self._room - 4) / row[0].leading), 1)
                last = min(first + fit, lines)
                for cell, x in zip(row, starts, strict=True):
                    self._text(cell, x, self.y, first, last)
                self.y += (last - first) * row[0].leading + 2
                self._rule(self.y, 0.4, GRID)
                self.y += 2
                first = last
        self.y += 12

    def _cells(
        self, cells: Sequence[str], widths: Sequence[float], table: Table, bold: bool = False
    ) -> list[_Text]:
        return [
            self._set(cell, 7.5, width, bold=bold, right=i in table.numbers)
            for i, (cell, width) in enumerate(zip(cells, widths, strict=True))
        ]

    def _head(self, head: Sequence[_Text], starts: Sequence[float]) -> None:
        for cell, x in zip(head, starts, strict=True):
            self._text(cell, x, self.y, 0, cell.lines)
        self.y += _height(head) - 2
        self._rule(self.y, 0.9, INK)
        self.y += 3

    # Pages

    def _frame(self) -> None:
        """Running head and page number."""
        if self.page:
            running = self._set(self.document.running, 8, _ACROSS * 0.98)
            self._text(running, _LEFT, 34, 0, 1, SECOND)
            self._rule(48, 0.5, GRID)
        foot = self._set(f"Page {self.page + 1} of {self.total}", 8, _ACROSS, right=True)
        self._text(foot, _LEFT, _HIGH - 42, 0, 1, SECOND)


def _height(cells: Sequence[_Text]) -> float:
    return max(cell.height for cell in cells) + 4


def _line(painter: QPainter, x: float, y: float, end: float, width: float, colour: str) -> None:
    from PySide6.QtCore import QLineF
    from PySide6.QtGui import QColor, QPen

    painter.setPen(QPen(QColor(colour), width * UNIT))
    painter.drawLine(QLineF(x * UNIT, y * UNIT, end * UNIT, y * UNIT))
