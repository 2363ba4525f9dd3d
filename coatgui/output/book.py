"""A document laid out on A4, block by block: a heading stays with what follows, a figure with its
caption, a table's heading row is repeated on every page, and a row breaks only where it is longer
than a page. Qt sets and paints it, and is imported only then."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

from coatgui.output.document import (
    Block,
    Document,
    Figure,
    Heading,
    Listing,
    Paragraph,
    Picture,
    Style,
    Table,
)
from coatgui.output.drawing import FONT, GRID, INK, SECOND
from coatgui.output.pdf_marks import Bookmark, Described
from coatgui.output.text import printable

if TYPE_CHECKING:
    from PySide6.QtGui import QFont, QImage, QPainter, QTextLayout

DOTS = 1200  # to the inch: fine enough that whole pixels do not show
UNIT = DOTS / 72  # one point
WIDE, HIGH = 595.276, 841.89  # A4 in points
_LEFT, _TOP, _BOTTOM = 57.6, 64.0, 60.0
_ACROSS = WIDE - 2 * _LEFT
_LEADING = 1.36
_GAP = 6.0  # between the columns of a table
_PHOTOGRAPH_WIDE, _PHOTOGRAPH_HIGH = 0.7 * _ACROSS, 250.0
_PHOTOGRAPH_DOTS = 200  # to the inch
NOT_SHOWN = "(The photograph cannot be shown: its file is damaged.)"


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


class Book:
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
        return HIGH - _BOTTOM - self.y

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
                drawing = block.drawing
                self._figure(block, number, (drawing.width, drawing.height), picture(block).render)
            case Picture():
                self._photograph(block, number)
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

    def _figure(
        self,
        figure: Figure | Picture,
        number: str,
        size: tuple[float, float],
        draw: Callable[[QPainter, Any], object],
    ) -> None:
        caption = self._set(f"{number}. {figure.caption}", 8.5, _ACROSS)
        most = HIGH - _TOP - _BOTTOM - caption.height - 20
        scale = min(_ACROSS / size[0], most / size[1], 1.0)
        width, height = size[0] * scale, size[1] * scale
        self._need(height + caption.height + 8)
        top = self.y

        def paint(painter: QPainter) -> None:
            from PySide6.QtCore import QRectF

            draw(painter, QRectF(_LEFT * UNIT, top * UNIT, width * UNIT, height * UNIT))

        self._paint(paint)
        where = (_LEFT, top, _LEFT + width, top + height)
        self.described.append(Described(self.page, where, figure.alternative))
        self.y += height + 4
        self._flow(caption, colour=SECOND)
        self.y += 12

    def _photograph(self, photograph: Picture, number: str) -> None:
        image = _image(photograph.content, self._painter is not None)
        if image is None:
            self._flow(self._set(f"{number}. {photograph.caption} {NOT_SHOWN}", 8.5, _ACROSS))
            self.y += 12
            return
        wide, high, pixels = image
        self._figure(
            photograph, number, (wide, high), lambda painter, box: painter.drawImage(box, pixels)
        )

    def _table(self, table: Table, number: str) -> None:
        whole = _ACROSS - _GAP * (len(table.shares) - 1)
        widths = [whole * share / sum(table.shares) for share in table.shares]
        starts = [_LEFT + sum(widths[:i]) + _GAP * i for i in range(len(widths))]
        head = self._cells(table.headings, widths, table, bold=True)
        caption = self._set(f"{number}. {table.caption}", 8.5, _ACROSS)
        rows = [self._cells(cells, widths, table) for cells in table.rows[:2]]
        opening = caption.height + sum(_height(cells) for cells in (head, *rows)) + 8
        self._need(min(opening, HIGH - _TOP - _BOTTOM))
        self._flow(caption, colour=SECOND)
        self.y += 3
        self._head(head, starts)
        for cells in table.rows:
            row = self._cells(cells, widths, table)
            first, lines = 0, max(cell.lines for cell in row)
            while first < lines:
                rest = (lines - first) * row[0].leading + 4
                page = HIGH - _TOP - _BOTTOM - _height(head) - 24
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
        self._text(foot, _LEFT, HIGH - 42, 0, 1, SECOND)


def picture(figure: Figure) -> Any:
    """What paints a figure."""
    from PySide6.QtSvg import QSvgRenderer

    return QSvgRenderer(figure.drawing.svg(figure.caption, figure.alternative).encode("utf-8"))


def _image(content: bytes, decode: bool) -> tuple[float, float, QImage] | None:
    """A photograph as large as it prints (points across and high), upright, in no more dots than
    that needs; None where it cannot be read. Where not `decode`, its size only is looked at."""
    from PySide6.QtCore import QBuffer, QIODevice, QSize
    from PySide6.QtGui import QImage, QImageIOHandler, QImageReader

    buffer = QBuffer()
    buffer.setData(content)
    buffer.open(QIODevice.OpenModeFlag.ReadOnly)
    reader = QImageReader(buffer)
    reader.setAutoTransform(True)
    size = reader.size()
    if not size.isValid() or size.isEmpty():
        return None
    turned = bool(reader.transformation() & QImageIOHandler.Transformation.TransformationRotate90)
    across, up = (size.height(), size.width()) if turned else (size.width(), size.height())
    scale = min(_PHOTOGRAPH_WIDE / across, _PHOTOGRAPH_HIGH / up)
    if not decode:
        return across * scale, up * scale, QImage()
    smaller = min(scale * _PHOTOGRAPH_DOTS / 72, 1.0)
    wanted = (max(round(side * smaller), 1) for side in (size.width(), size.height()))
    reader.setScaledSize(QSize(*wanted))
    image = reader.read()
    return None if image.isNull() else (across * scale, up * scale, image)


def _height(cells: Sequence[_Text]) -> float:
    return max(cell.height for cell in cells) + 4


def _line(painter: QPainter, x: float, y: float, end: float, width: float, colour: str) -> None:
    from PySide6.QtCore import QLineF
    from PySide6.QtGui import QColor, QPen

    painter.setPen(QPen(QColor(colour), width * UNIT))
    painter.drawLine(QLineF(x * UNIT, y * UNIT, end * UNIT, y * UNIT))
