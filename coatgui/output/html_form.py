"""The document as one HTML file: nothing is loaded from elsewhere, nothing is run, and every text
from outside stays text."""

from __future__ import annotations

from base64 import b64encode
from html import escape

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
from coatgui.output.text import printable
from coatgui.shipped import resource

_CLASSES = {Style.TEXT: "", Style.LEAD: ' class="lead"', Style.SMALL: ' class="small"'}


def html_text(text: str) -> str:
    """Text in which nothing is markup."""
    return escape(printable(text), quote=True)


def html_document(document: Document) -> str:
    """The whole file."""
    style = resource("report.css").read_text(encoding="utf-8")
    blocks = list(document.numbered())
    contents = "".join(
        f'<li><a href="#section-{number}">{html_text(block.text)}</a></li>'
        for block, number in blocks
        if isinstance(block, Heading) and block.level == 1
    )
    body = "\n".join(_block(block, number) for block, number in blocks)
    title = html_text(document.title)
    return (
        '<!DOCTYPE html>\n<html lang="en">\n<head>\n<meta charset="utf-8">\n'
        '<meta http-equiv="Content-Security-Policy" '
        "content=\"default-src 'none'; style-src 'unsafe-inline'; img-src data:\">\n"
        '<meta name="viewport" content="width=device-width, initial-scale=1">\n'
        f'<meta name="author" content="{html_text(document.author)}">\n'
        f'<meta name="description" content="{html_text(document.subject)}">\n'
        f"<title>{title}</title>\n<style>\n{style}</style>\n</head>\n<body>\n<main>\n"
        f'<h1 dir="auto">{title}</h1>\n<p class="running" dir="auto">'
        f"{html_text(document.running)}</p>\n"
        f'<nav aria-label="Contents"><ol>{contents}</ol></nav>\n{body}\n</main>\n</body>\n</html>\n'
    )


def _block(block: Block, number: str) -> str:
    match block:
        case Heading():
            tag = f"h{block.level + 1}"
            return f'<{tag} id="section-{number}">{number} {html_text(block.text)}</{tag}>'
        case Paragraph():
            return f'<p dir="auto"{_CLASSES[block.style]}>{html_text(block.text)}</p>'
        case Listing():
            tag = "ol" if block.numbered else "ul"
            items = "".join(f'<li dir="auto">{html_text(item)}</li>' for item in block.items)
            return f"<{tag}>{items}</{tag}>"
        case Table():
            return _table(block, number)
        case Picture():
            return _photograph(block, number)
        case Figure():
            picture = block.drawing.svg(
                block.caption, block.alternative, number.lower().replace(" ", "-")
            )
            return (
                f"<figure>{picture}<figcaption><b>{number}.</b> {html_text(block.caption)}"
                "</figcaption></figure>"
            )


def _photograph(picture: Picture, number: str) -> str:
    data = b64encode(picture.content).decode("ascii")
    return (
        f'<figure><img alt="{html_text(picture.alternative)}" '
        f'src="data:{html_text(picture.media_type)};base64,{data}"><figcaption dir="auto">'
        f"<b>{number}.</b> {html_text(picture.caption)}</figcaption></figure>"
    )


def _table(table: Table, number: str) -> str:
    def row(tag: str, cells: tuple[str, ...]) -> str:
        scope = ' scope="col"' if tag == "th" else ""
        return "".join(
            f'<{tag}{scope} dir="auto"{" class=number" if i in table.numbers else ""}>'
            f"{html_text(cell)}</{tag}>"
            for i, cell in enumerate(cells)
        )

    rows = "\n".join(f"<tr>{row('td', cells)}</tr>" for cells in table.rows)
    return (
        f'<div class="table"><table>\n<caption dir="auto"><b>{number}.</b> '
        f"{html_text(table.caption)}</caption>\n"
        f"<thead><tr>{row('th', table.headings)}</tr></thead>\n<tbody>\n{rows}\n</tbody>"
        "</table></div>"
    )
