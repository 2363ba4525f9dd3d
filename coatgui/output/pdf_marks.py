"""What Qt's PDF lacks, added behind it as the format foresees (an incremental update, ISO 32000-1,
7.5.6): bookmarks, a description of every figure, the document's language and facts, and dates that
do not depend on the clock."""

from __future__ import annotations

import hashlib
import re
from collections.abc import Sequence
from dataclasses import dataclass

from coatgui.output.text import printable

_HIGH = 841.89  # A4 in points; places here count from the top, in PDF from the bottom


@dataclass(frozen=True, slots=True)
class Bookmark:
    text: str
    level: int
    page: int
    y: float


@dataclass(frozen=True, slots=True)
class Described:
    """A figure's place on its page (left, top, right, bottom in points from the top) and words."""

    page: int
    where: tuple[float, float, float, float]
    words: str


def _string(text: str) -> bytes:
    """A text string in UTF-16, in hexadecimal, so that nothing in it is syntax."""
    return b"<" + ("\ufeff" + printable(text)).encode("utf-16-be").hex().upper().encode() + b">"


def _objects(pdf: bytes) -> dict[int, bytes]:
    """The dictionaries of a file with a plain cross-reference table, by object number."""
    start = int(pdf[pdf.rindex(b"startxref") + 9 :].split()[0])
    lines = pdf[start:].split(b"\n")
    first, count = (int(word) for word in lines[1].split())
    found = {}
    for i in range(count):
        entry = lines[2 + i].split()
        if entry[2].startswith(b"n"):
            at = int(entry[0])
            found[first + i] = pdf[at : pdf.index(b"endobj", at)].split(b"obj", 1)[1].strip()
    return found


def marked(
    pdf: bytes,
    *,
    title: str,
    author: str,
    subject: str,
    bookmarks: Sequence[Bookmark],
    described: Sequence[Described],
) -> bytes:
    """The file with the marks added. Raises ValueError where it is not built as Qt builds it."""
    trailer = pdf[pdf.rindex(b"trailer") :]
    found = {name: re.search(rb"/" + name + rb" (\d+)", trailer) for name in (b"Root", b"Size")}
    if not all(found.values()):
        raise ValueError("This PDF cannot be completed: its trailer is not understood.")
    root, size = (int(m.group(1)) for m in found.values() if m)
    pdf = _without_clock(pdf)
    objects = _objects(pdf)
    catalogue = objects[root]
    tree = int(re.search(rb"/Pages (\d+)", catalogue).group(1))  # type: ignore[union-attr]
    pages = [int(n) for n in re.findall(rb"(\d+) 0 R", _kids(objects[tree]))]
    boxes = [_page_height(objects, page) for page in pages]
    new: dict[int, bytes] = {}
    outlines, info = size, size + 1
    following = size + 2

    # Figures: an annotation without a look of its own that carries the words.
    by_page: dict[int, list[int]] = {}
    for figure in described:
        left, top, right, bottom = figure.where
        high = boxes[figure.page]
        box = f"[{left:.2f} {high - bottom:.2f} {right:.2f} {high - top:.2f}]".encode()
        new[following] = (
            b"<< /Type /Annot /Subtype /Square /F 64 /BS << /W 0 >> /Border [0 0 0] /Rect "
            + box
            + b" /Contents "
            + _string(figure.words)
            + b" >>"
        )
        by_page.setdefault(figure.page, []).append(following)
        following += 1
    for page, own in by_page.items():
        notes = b" ".join(b"%d 0 R" % n for n in own)
        without = re.sub(rb"/Annots \d+ 0 R", b"", objects[pages[page]])
        new[pages[page]] = _with(without, b"/Annots [" + notes + b"]")

    new |= _outline(bookmarks, pages, boxes, outlines, following)
    following += len(bookmarks)
    extra = b"/Lang (en) /ViewerPreferences << /DisplayDocTitle true >>"
    if bookmarks:
        extra += b" /Outlines %d 0 R /PageMode /UseOutlines" % outlines
    new[root] = _with(catalogue, extra)
    new[info] = (
        b"<< /Title "
        + _string(title)
        + b" /Author "
        + _string(author)
        + b" /Subject "
        + _string(subject)
        + b" /Creator (coatgui) >>"
    )
    return _appended(pdf, new, following, root, info)


def _kids(tree: bytes) -> bytes:
    match = re.search(rb"/Kids\s*\[(.*?)\]", tree, re.DOTALL)
    if match is None:
        raise ValueError("This PDF cannot be completed: it has no plain list of pages.")
    return match.group(1)


def _page_height(objects: dict[int, bytes], page: int) -> float:
    match = re.search(rb"/MediaBox\s*\[([^\]]*)\]", objects[page])
    return float(match.group(1).split()[3]) if match else _HIGH


def _with(dictionary: bytes, extra: bytes) -> bytes:
    """A dictionary with entries added at its end."""
    inner = dictionary[: dictionary.rindex(b">>")]
    return inner + b"\n" + extra + b"\n>>"


def _without_clock(pdf: bytes) -> bytes:
    """Dates and the file's own id written over, at the same length, so that nothing moves."""
    date = rb"(/(?:Creation|Mod)Date \(D:)\d{14}"
    pdf = re.sub(date, rb"\g<1>20000101000000", pdf)
    stamp = rb'(xmp:(?:Create|Modify|Metadata)Date=")(\d{4}-\d\d-\d\dT\d\d:\d\d:\d\d)'
    pdf = re.sub(stamp, rb"\g<1>2000-01-01T00:00:00", pdf)
    pdf = re.sub(
        rb"(/ID \[ *<)([^>]*)(> *<)([^>]*)",
        lambda m: m.group(1) + b"0" * len(m.group(2)) + m.group(3) + b"0" * len(m.group(4)),
        pdf,
    )
    return re.sub(rb"uuid:[0-9a-fA-F-]{36}", b"uuid:00000000-0000-0000-0000-000000000000", pdf)


def _outline(
    bookmarks: Sequence[Bookmark],
    pages: Sequence[int],
    boxes: Sequence[float],
    outlines: int,
    first: int,
) -> dict[int, bytes]:
    """The outline tree of two levels; its items take the numbers from `first` on."""
    parents: list[int] = []
    top = outlines
    for place, mark in enumerate(bookmarks):
        if mark.level == 1:
            top = first + place
        parents.append(outlines if mark.level == 1 else top)
    new = {}
    for owner in [outlines, *range(first, first + len(bookmarks))]:
        children = [first + i for i, parent in enumerate(parents) if parent == owner]
        entries = b""
        if children:
            entries = b" /First %d 0 R /Last %d 0 R /Count %d" % (
                children[0],
                children[-1],
                len(children) if owner == outlines else -len(children),
            )
        if owner == outlines:
            new[owner] = b"<< /Type /Outlines" + entries + b" >>"
            continue
        mark = bookmarks[owner - first]
        siblings = [first + i for i, p in enumerate(parents) if p == parents[owner - first]]
        at = siblings.index(owner)
        if at:
            entries += b" /Prev %d 0 R" % siblings[at - 1]
        if at + 1 < len(siblings):
            entries += b" /Next %d 0 R" % siblings[at + 1]
        y = boxes[mark.page] - mark.y + 10
        new[owner] = (
            b"<< /Title "
            + _string(mark.text)
            + b" /Parent %d 0 R" % parents[owner - first]
            + entries
            + f" /Dest [{pages[mark.page]} 0 R /XYZ 0 {y:.1f} 0] >>".encode()
        )
    return new


def _appended(pdf: bytes, new: dict[int, bytes], size: int, root: int, info: int) -> bytes:
    previous = int(pdf[pdf.rindex(b"startxref") + 9 :].split()[0])
    out = bytearray(pdf if pdf.endswith(b"\n") else pdf + b"\n")
    places = {}
    for number in sorted(new):
        places[number] = len(out)
        out += b"%d 0 obj\n" % number + new[number] + b"\nendobj\n"
    start = len(out)
    out += b"xref\n"
    for number in sorted(places):
        out += b"%d 1\n%010d 00000 n \n" % (number, places[number])
    # The id of a file is to follow from its content.
    ident = hashlib.sha256(bytes(out)).hexdigest()[:32].upper().encode()
    out += (
        b"trailer\n<< /Size %d /Root %d 0 R /Info %d 0 R /Prev %d " % (size, root, info, previous)
        + b"/ID [<"
        + ident
        + b"> <"
        + ident
        + b">] >>\nstartxref\n%d\n%%%%EOF\n" % start
    )
    return bytes(out)
