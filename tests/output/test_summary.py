"""The inspection summary: what it says, that it says no more, and its two forms."""

from __future__ import annotations

import re
import shutil
import struct
import subprocess
import sys
import zlib
from base64 import b64encode
from dataclasses import replace
from html.parser import HTMLParser
from pathlib import Path
from typing import Any

import pytest

from coatgui.assessment.cautions import cautions
from coatgui.output import Identification, inspection_summary, require_qt, write_summary
from coatgui.output.document import Document, Figure, Heading, Listing, Paragraph, Table
from coatgui.output.html_form import html_document
from coatgui.output.pages import PagesUnavailable, pdf_bytes
from coatgui.output.shown import amount
from coatgui.records import (
    Assessment,
    Bound,
    Campaign,
    Photograph,
    Quantity,
    Rating,
    RatingCourse,
    VisualRating,
)
from coatgui.records import Identification as KeptIdentification

IDENTIFICATION = Identification(laboratory="Slip Laboratory", order="RC-7", standards="none")
HOSTILE = [
    '<script>alert(1)</script><img src="http://x/y.png" onerror=a>',
    "x" * 300,
    "مرحبا بالعالم",
    "長い名前の塗料",
    "\"&'</td></table>",
    "a\u202eb\x00c\x1b[31m\ud800",
]


def words_of(document: Document) -> str:
    said = []
    for block in document.blocks:
        match block:
            case Heading() | Paragraph():
                said.append(block.text)
            case Listing():
                said += block.items
            case Table():
                said += [block.caption, *block.headings, *(c for row in block.rows for c in row)]
            case Figure():
                said += [block.caption, block.alternative]
    return "\n".join(said)


def qt() -> None:
    try:
        require_qt()
    except PagesUnavailable as error:
        pytest.skip(f"pages cannot be painted here: {error}")


def named(assessment: Assessment, campaign: Campaign, name: str) -> tuple[Assessment, Campaign]:
    """Everything that a person or a file can name, named alike."""
    readings = tuple(
        replace(
            r,
            panel=name,
            formulation=name,
            file=name,
            findings=tuple(replace(f, text=name) for f in r.findings),
            left_out=tuple(replace(p, reason=name) for p in r.left_out),
        )
        for r in assessment.readings
    )
    panels = tuple(
        replace(p, panel=name, formulation=name, events=(replace(e, text=name),))
        for p in assessment.panels
        for e in assessment.panels[0].events
    )
    formulations = tuple(replace(f, formulation=name) for f in assessment.formulations)
    ranking = tuple(replace(r, formulation=name) for r in assessment.ranking)
    evil = replace(
        assessment,
        title=name,
        headline=name,
        ranking_text=name,
        readings=readings,
        panels=panels,
        formulations=formulations,
        ranking=ranking,
        refused=(replace(assessment.refused[0], file=name, reason=name),),
    )
    own = tuple(
        replace(p, name=name, substrate=name, electrolyte=name, regime=name, remark=name)
        for p in campaign.panels
    )
    return evil, replace(campaign, panels=own)


def test_it_says_what_was_found_and_how(assessment: Assessment, campaign: Campaign) -> None:
    words = words_of(inspection_summary(assessment, campaign, IDENTIFICATION))
    for said in (
        "Slip Laboratory",
        "A and B cannot be told apart.",
        "That is not a proof that they are equal.",
        "has fewer than three panels",
        "has no area",
        "The pores conduct.",
        "Below the limit.",
        "wild point",
        "It drifted.",
        "Measure again.",
        "notes.txt",
        "≥ 3·10⁹",
        "cannot be determined",
        "brine",
        "Not recorded in the campaign",
        "Mind the fog.",
        "1" * 64,
        "The program does not claim",
    ):
        assert said in words, said


def test_it_names_what_the_campaign_keeps(assessment: Assessment, campaign: Campaign) -> None:
    kept = KeptIdentification("Kept Laboratory", order="K-1", standards=("one", "another"))
    identified = replace(campaign, identification=kept)
    document = inspection_summary(assessment, identified)
    words = words_of(document)
    for said in ("Kept Laboratory", "K-1", "one; another"):
        assert said in words
    assert document.running == f"{assessment.title} · K-1 · Kept Laboratory"
    told = Identification.of(identified, laboratory="Told Laboratory", order="", date="today")
    assert (told.laboratory, told.order, told.date) == ("Told Laboratory", "K-1", "today")


def test_pages_are_painted_one_by_one_as_they_print(
    assessment: Assessment, campaign: Campaign
) -> None:
    pytest.importorskip("PySide6")
    from coatgui.output.pages import page_height, paint_pages, pdf_bytes

    document = inspection_summary(assessment, campaign, IDENTIFICATION)
    taken: list[tuple[int, int, int, bool]] = []

    def take(place: int, total: int, image: Any) -> None:
        assert (image.width(), image.height()) == (300, round(page_height(300)))
        inked = any(image.pixelColor(x, y).value() < 128 for x in range(300) for y in range(424))
        taken.append((place, total, image.height(), inked))

    headings = paint_pages(document, 300, take)
    assert [place for place, *_ in taken] == list(range(len(taken)))
    assert {total for _, total, *_ in taken} == {len(taken)}
    assert all(inked for *_, inked in taken)
    # By their numbers, for a page that was revised stands in the file twice.
    printed = re.findall(rb"(\d+) 0 obj\s*<<\s*/Type /Page\s", pdf_bytes(document))
    assert len(set(printed)) == len(taken)
    assert [h.text.split(" ", 1)[1] for h in headings] == [
        b.text for b in document.blocks if isinstance(b, Heading)
    ]


def test_an_empty_field_and_an_unknown_section_are_left_out(
    assessment: Assessment, campaign: Campaign
) -> None:
    document = inspection_summary(assessment, campaign)
    titles = [b.text for b in document.blocks if isinstance(b, Heading)]
    assert "Identification" not in titles
    assert "Visual ratings" not in titles
    assert titles[0] == "What was found"


def test_nothing_is_said_of_bounds_where_there_are_none(
    assessment: Assessment, campaign: Campaign
) -> None:
    sure = Quantity(5e9, 4e9, 6e9, Bound.TWO_SIDED, "Ω cm²")
    readings = tuple(replace(r, parameters=(), pore_resistance=sure) for r in assessment.readings)
    words = words_of(inspection_summary(replace(assessment, readings=readings), campaign))
    assert "is a bound" not in words
    assert "do not hold it on either side" not in words


def test_one_formulation_and_no_reading_have_their_sentences(
    assessment: Assessment, campaign: Campaign
) -> None:
    one = replace(assessment, formulations=assessment.formulations[:1])
    assert "nothing is compared" in words_of(inspection_summary(one, campaign))
    empty = Assessment("t", (), (), (), (), "", (), (), ())
    words = words_of(inspection_summary(empty, Campaign("c", "t")))
    assert "There are no readings" in words
    assert cautions()[0] in words  # cautions are never missing


@pytest.mark.parametrize(
    ("value", "low", "high", "shown"),
    [
        (2.83e10, 2.8e10, 2.86e10, "2.83 (2.80 to 2.86)·10¹⁰"),
        (2e-10, 1e-13, 3e-9, "2·10⁻¹⁰ (10⁻¹³ to 3·10⁻⁹)"),
        (1.5, -0.25, 9999.7, "1.5 (−0.25 to 10000)"),
        (0.0, None, 1e9, "0 (– to 10⁹)"),
    ],
)
def test_numbers_with_their_limits(
    value: float, low: float | None, high: float | None, shown: str
) -> None:
    assert amount(Quantity(value, low, high, Bound.TWO_SIDED, "")) == shown


class Elements(HTMLParser):
    def __init__(self, text: str) -> None:
        super().__init__(convert_charrefs=True)
        self.seen: list[tuple[str, dict[str, str | None]]] = []
        self.open: list[str] = []
        self.words: list[str] = []
        self.feed(text)

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.seen.append((tag, dict(attrs)))
        if tag not in ("meta", "polyline", "polygon", "rect", "circle"):
            self.open.append(tag)

    def handle_startendtag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.seen.append((tag, dict(attrs)))

    def handle_endtag(self, tag: str) -> None:
        assert self.open.pop() == tag

    def handle_data(self, data: str) -> None:
        self.words.append(data)


@pytest.mark.parametrize("name", HOSTILE)
def test_html_takes_text_as_text(assessment: Assessment, campaign: Campaign, name: str) -> None:
    text = html_document(inspection_summary(*named(assessment, campaign, name)))
    text.encode("utf-8")
    assert "\x00" not in text
    assert "\u202e" not in text
    elements = Elements(text)
    assert elements.open == []
    tags = {tag for tag, _ in elements.seen}
    assert not tags & {"script", "img", "iframe", "object", "link", "a href"}
    for tag, attributes in elements.seen:
        assert not [key for key in attributes if key.startswith("on") or key == "src"], tag
        assert (attributes.get("href") or "#").startswith("#")
    if name.isprintable() and len(name) < 300:
        assert name in "".join(elements.words)


def test_every_picture_has_words_and_every_table_a_head(
    assessment: Assessment, campaign: Campaign
) -> None:
    text = html_document(inspection_summary(assessment, campaign))
    pictures = re.findall(r"<svg .*?</svg>", text, re.DOTALL)
    assert pictures
    for picture in pictures:
        assert re.search(r"<desc [^>]*>\S", picture)
    assert text.count("<thead>") == text.count("<table>") == text.count("<caption")
    ids = re.findall(r' id="([^"]+)"', text)
    assert len(ids) == len(set(ids))
    for target in re.findall(r'href="#([^"]+)"', text):
        assert target in ids


def test_the_same_assessment_gives_the_same_html(
    assessment: Assessment, campaign: Campaign, tmp_path: Path
) -> None:
    for name in ("1.html", "2.html"):
        write_summary(assessment, campaign, tmp_path / name, IDENTIFICATION)
    assert (tmp_path / "1.html").read_bytes() == (tmp_path / "2.html").read_bytes()


def test_html_needs_no_qt() -> None:
    code = (
        "import os; os.environ['COATGUI_WITHOUT_QT'] = '1'\n"
        "import sys; sys.modules['PySide6'] = None\n"
        "from coatgui.output import inspection_summary, require_qt, PagesUnavailable\n"
        "from coatgui.output.html_form import html_document\n"
        "from coatgui.records import Assessment, Campaign\n"
        "a = Assessment('t', (), (), (), (), '', (), (), ())\n"
        "print(len(html_document(inspection_summary(a, Campaign('c', 't')))) > 1000)\n"
        "try:\n    require_qt()\n"
        "except PagesUnavailable as error:\n    print(error)\n"
    )
    shown = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    said = shown.stdout.splitlines()
    assert said[0] == "True"
    assert "needs Qt's libraries" in said[1]


# ---------------------------------------------------------------------------------------------
# Pages


def page_text(path: Path) -> str:
    tool = shutil.which("pdftotext")
    if tool is None:
        pytest.skip("pdftotext is not installed")
    shown = subprocess.run([tool, "-layout", str(path), "-"], capture_output=True, check=True)
    return " ".join(shown.stdout.decode("utf-8").split())


def test_the_pdf_holds_every_caution_and_number_of_page(
    assessment: Assessment, campaign: Campaign, tmp_path: Path
) -> None:
    qt()
    full = replace(assessment, cautions=cautions())
    write_summary(full, campaign, tmp_path / "s.pdf", IDENTIFICATION)
    text = page_text(tmp_path / "s.pdf")
    for caution in cautions():  # looked for without the blanks: lines break where they must
        assert "".join(caution.split()) in "".join(text.split())
    assert "Identification" in text  # no ligature, so that it is found
    assert "Page 1 of" in text
    assert "By hand · RC-7 · Slip Laboratory" in text


def test_the_pdf_is_whole_has_bookmarks_and_embeds_its_fonts(
    assessment: Assessment, campaign: Campaign, tmp_path: Path
) -> None:
    qt()
    document = inspection_summary(assessment, campaign, IDENTIFICATION)
    content = pdf_bytes(document)
    for block in document.blocks:
        if isinstance(block, Figure):
            words = ("\ufeff" + block.alternative).encode("utf-16-be").hex().upper()
            assert words.encode() in content
    assert b"/Outlines" in content
    assert content.count(b"/Title <") >= 1 + len(
        [b for b in document.blocks if isinstance(b, Heading)]
    )
    if (tool := shutil.which("pdffonts")) is None:
        pytest.skip("pdffonts is not installed")
    path = tmp_path / "s.pdf"
    path.write_bytes(content)
    shown = subprocess.run([tool, str(path)], capture_output=True, text=True, check=True)
    assert shown.stderr == ""
    fonts = shown.stdout.splitlines()[2:]
    assert fonts
    for line in fonts:
        assert line.split()[-5] == "yes", line  # the column "emb"


def test_the_same_document_gives_the_same_pdf(assessment: Assessment, campaign: Campaign) -> None:
    qt()
    document = inspection_summary(assessment, campaign)
    assert pdf_bytes(document) == pdf_bytes(document)


@pytest.mark.parametrize("name", HOSTILE)
def test_pages_take_any_text(
    assessment: Assessment, campaign: Campaign, name: str, tmp_path: Path
) -> None:
    qt()
    evil, own = named(assessment, campaign, name)
    write_summary(evil, own, tmp_path / "s.pdf", Identification(author=name, customer=name))
    text = page_text(tmp_path / "s.pdf")
    if name.isascii() and name.isprintable() and len(name) < 300:
        assert "".join(name.split()) in "".join(text.split())


def test_a_row_longer_than_a_page_is_printed_whole(
    assessment: Assessment, campaign: Campaign, tmp_path: Path
) -> None:
    qt()
    words = " ".join(f"w{i}" for i in range(4000))
    evil = replace(assessment, refused=(replace(assessment.refused[0], reason=words),))
    write_summary(evil, campaign, tmp_path / "s.pdf")
    text = page_text(tmp_path / "s.pdf").split()
    assert {f"w{i}" for i in range(4000)} <= set(text)


# ---------------------------------------------------------------------------------------------
# Ratings and photographs


def _png(wide: int, high: int, grey: int) -> bytes:
    """A PNG of one grey, made by hand."""

    def chunk(kind: bytes, data: bytes) -> bytes:
        return (
            struct.pack(">I", len(data)) + kind + data + struct.pack(">I", zlib.crc32(kind + data))
        )

    head = struct.pack(">IIBBBBB", wide, high, 8, 0, 0, 0, 0)
    rows = zlib.compress((b"\0" + bytes([grey]) * wide) * high)
    return b"\x89PNG\r\n\x1a\n" + chunk(b"IHDR", head) + chunk(b"IDAT", rows) + chunk(b"IEND", b"")


def seen(campaign: Campaign) -> tuple[Campaign, dict[str, bytes]]:
    """The campaign with two photographs whose bytes are there, one lost and one damaged."""
    panel = campaign.panels[0].panel_id
    contents = {"a" * 64: _png(400, 300, 120), "b" * 64: _png(30, 90, 60), "d" * 64: b"\x89PNG no"}
    captions = {"a": "Blisters <near> the scribe.", "b": "=1+1", "c": "lost", "d": "damaged"}
    photographs = tuple(
        Photograph(letter, panel, letter * 64, "image/png", hours, captions[letter])
        for letter, hours in (("b", 504.0), ("a", 24.0), ("c", None), ("d", 600.0))
    )
    ratings = (
        Rating("r", VisualRating(panel, 24.0, "iso_4628_3", "Ri 1", "2016", "R. Inspector")),
    )
    return replace(campaign, photographs=photographs, ratings=ratings), contents


def test_ratings_and_photographs_are_in_the_html(
    assessment: Assessment, campaign: Campaign, tmp_path: Path
) -> None:
    own, contents = seen(campaign)
    write_summary(assessment, own, tmp_path / "s.html", None, contents)
    text = (tmp_path / "s.html").read_text(encoding="utf-8")
    assert text.count('src="data:image/png;base64,') == 3
    assert b64encode(contents["a" * 64]).decode() in text
    alternative = (
        f"Photograph. Panel {own.panels[0].name} at 24 h: Blisters &lt;near&gt; the scribe."
    )
    assert f'alt="{alternative}"' in text
    assert text.index("24 h: Blisters") < text.index("504 h: =1+1")  # in the order of time
    assert "1 photograph is not shown here" in text
    assert "img-src data:" in text
    assert "R. Inspector" not in text  # ratings stand where the assessment has their courses
    course = RatingCourse("Grey", "ISO 4628-3", 24.0, (("A1", "Ri 1"),), "Ri 1", "Ri 1")
    write_summary(replace(assessment, ratings=(course,)), own, tmp_path / "r.html", None, contents)
    text = (tmp_path / "r.html").read_text(encoding="utf-8")
    assert "R. Inspector" in text
    assert ">2016<" in text


def test_photographs_are_in_the_pdf(
    assessment: Assessment, campaign: Campaign, tmp_path: Path
) -> None:
    qt()
    own, contents = seen(campaign)
    write_summary(assessment, own, tmp_path / "s.pdf", None, contents)
    data = (tmp_path / "s.pdf").read_bytes()
    assert data.count(b"/Subtype /Image") >= 2
    words = f"Photograph. Panel {own.panels[0].name} at 504 h: =1+1."
    assert ("\ufeff" + words).encode("utf-16-be").hex().upper().encode() in data
    if shutil.which("pdftotext"):
        shown = subprocess.run(
            ["pdftotext", "-layout", str(tmp_path / "s.pdf"), "-"],
            capture_output=True, text=True, check=True,
        ).stdout  # fmt: skip
        assert "damaged. (The photograph cannot be shown" in " ".join(shown.split())
