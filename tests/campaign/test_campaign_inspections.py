"""Ratings, photographs and the names on a summary; what is no photograph."""

import hashlib
import zlib
from collections.abc import Callable

import pytest

from coatgui.campaign import CampaignFile, Operation, OperationRefused, operations, photographs
from coatgui.records import Campaign, VisualRating


def chunk(kind: bytes, content: bytes) -> bytes:
    return len(content).to_bytes(4) + kind + content + zlib.crc32(kind + content).to_bytes(4)


def png(width: int = 3, height: int = 2, *more: bytes) -> bytes:
    header = width.to_bytes(4) + height.to_bytes(4) + bytes((8, 0, 0, 0, 0))
    picture = zlib.compress((b"\x00" + b"\x80" * 3) * 2)
    told = (chunk(b"IHDR", header), *more, chunk(b"IDAT", picture), chunk(b"IEND", b""))
    return b"\x89PNG\r\n\x1a\n" + b"".join(told)


def jpeg(width: int = 3, height: int = 2) -> bytes:
    """As a walker sees it: segments, two scans with stuffed bytes and restarts, the end."""
    frame = bytes((8, *height.to_bytes(2), *width.to_bytes(2), 1, 1, 0x11, 0))
    segments = ((0xE0, b"JFIF\x00"), (0xC2, frame), (0xDA, b"\x01\x01\x00\x00\x3f\x00"))
    told = b"".join(
        bytes((0xFF, marker)) + (len(content) + 2).to_bytes(2) + content
        for marker, content in segments
    )
    second = b"\xff\xda\x00\x08\x01\x01\x00\x00\x3f\x00\x12"
    return b"\xff\xd8" + told + b"\x12\xff\x00\x34\xff\xd0\x56" + second + b"\xff\xd9"


@pytest.mark.parametrize(
    ("content", "media_type"), [(png(), photographs.PNG), (jpeg(), photographs.JPEG)]
)
def test_a_photograph_is_known_by_its_content(
    file: CampaignFile, content: bytes, media_type: str
) -> None:
    before = file.campaign
    made = operations.add_photograph(
        before, "p2", content + b"<script>", file="../../etc/pass:wd.exe", exposure_h=24
    )
    file.apply(made)
    kept = file.campaign.photographs[-1]
    assert (kept.media_type, kept.file, kept.exposure_h) == (media_type, "pass_wd.exe", 24.0)
    assert file.raw(kept.sha256) == content  # what followed the picture is gone
    file.undo()
    assert file.campaign == before
    file.redo()
    path = file.path
    file.close()
    with CampaignFile.open(path) as again:
        assert again.campaign.photographs[-1] == kept


@pytest.mark.parametrize(
    ("content", "says"),
    [
        (b"", "no photograph"),
        (b"<svg xmlns='http://www.w3.org/2000/svg' onload='x()'/>", "no photograph"),
        (b"GIF89a", "no photograph"),
        (b"%PDF-1.7", "no photograph"),
        (png()[:-4], "damaged"),
        (png()[:40] + b"\x00" + png()[41:], "damaged"),
        (png(0), "damaged"),
        (png(20_000, 20_000), "20000 × 20000 pixels"),
        (b"\x89PNG\r\n\x1a\n" + chunk(b"IEND", b""), "damaged"),
        (jpeg()[:-2], "damaged"),
        (jpeg()[:12], "damaged"),
        (jpeg(0), "damaged"),
        (jpeg(60_000, 60_000), "pixels"),
        (b"\xff\xd8\xff\xd9", "damaged"),
        (b"\xff\xd8\xff" + bytes(20_000_000), "20 MB"),
    ],
)
def test_what_is_no_photograph_is_refused(campaign: Campaign, content: bytes, says: str) -> None:
    with pytest.raises(OperationRefused, match=says):
        operations.add_photograph(campaign, "p1", content, file="a.jpg")


def test_a_photograph_of_a_reading_is_of_its_panel_and_time(
    file: CampaignFile, campaign: Campaign
) -> None:
    file.apply(operations.photograph_reading(campaign, "r4", png(), caption=" edge "))
    kept = file.campaign.photographs[-1]
    assert (kept.panel_id, kept.exposure_h, kept.caption) == ("p2", 336.0, "edge")
    file.undo()
    assert file.campaign == campaign


@pytest.mark.parametrize(
    ("name", "plain"),
    [
        ("A1 168 h.jpg", "A1 168 h.jpg"),
        ("C:\\Users\\x\\A1.jpg", "A1.jpg"),
        ("/etc/passwd", "passwd"),
        ("..", ""),
        ("a\x00b\nc.png", "a_b_c.png"),
        ("x" * 300, "x" * 120),
    ],
)
def test_a_name_leads_nowhere(name: str, plain: str) -> None:
    assert photographs.plain_name(name) == plain


def test_ratings_are_added_and_taken_back(file: CampaignFile, campaign: Campaign) -> None:
    file.apply(operations.rate_reading(file.campaign, "r3", "astm_d610", " 7-G "))
    assert file.campaign.ratings[-1].seen == VisualRating("p2", 168.0, "astm_d610", "7-G")
    assert file.undo_name == "Rate panel B-2 7-G"
    several = [VisualRating(p, 24, "iso_4628_4", "1(S1)", remark=" r\n") for p in ("p1", "p2")]
    file.apply(operations.add_ratings(file.campaign, several))
    assert [r.seen.remark for r in file.campaign.ratings[-2:]] == [" r\n"] * 2
    file.undo()
    file.undo()
    assert file.campaign == campaign


@pytest.mark.parametrize(
    "make",
    [
        lambda c: operations.add_ratings(c, []),
        lambda c: operations.add_ratings(c, [VisualRating("p1", -1.0, "astm_d610", "7")]),
        lambda c: operations.add_ratings(c, [VisualRating("p1", 1.0, " ", "7")]),
        lambda c: operations.add_ratings(c, [VisualRating("p1", 1.0, "astm_d610", "")]),
        lambda c: operations.add_ratings(c, [VisualRating("gone", 1.0, "astm_d610", "7")]),
        lambda c: operations.add_ratings(c, [VisualRating("p1", 1.0, "s", "7", remark="x" * 9**5)]),
        lambda c: operations.edit_rating(c, "gone", value="7"),
        lambda c: operations.edit_rating(c, "v1", colour="red"),
        lambda c: operations.remove_ratings(c, ["gone"]),
        lambda c: operations.rate_reading(c, "gone", "astm_d610", "7"),
        lambda c: operations.add_photograph(c, "gone", png()),
        lambda c: operations.photograph_reading(c, "gone", png()),
        lambda c: operations.add_photograph(c, "p1", png(), exposure_h=-1.0),
        lambda c: operations.edit_photograph(c, "b1", sha256="x"),
        lambda c: operations.edit_photograph(c, "b1", panel_id="gone"),
        lambda c: operations.remove_photograph(c, "gone"),
        lambda c: operations.identify(c, colour="red"),
        lambda c: operations.identify(c, customer=7),
        lambda c: operations.identify(c, standards=["ISO 4628-2", " "]),
    ],
)
def test_what_makes_no_sense_is_refused(
    campaign: Campaign, make: Callable[[Campaign], Operation]
) -> None:
    with pytest.raises(OperationRefused):
        make(campaign)


def test_a_reason_stands_in_the_trail(file: CampaignFile) -> None:
    file.apply(operations.leave_out_points(file.campaign, "r2", [1], " a drop "))
    file.apply(operations.overrule(file.campaign, "r2", "seen twice"))
    trail = file.history()
    assert [entry.reason for entry in trail] == ["", "a drop", "seen twice"]
    # With the name of who overruled.
    assert trail[2].name.startswith("Overrule the rejection of")
    assert trail[2].who


def test_a_remark_has_a_limit(campaign: Campaign) -> None:
    with pytest.raises(OperationRefused, match="too long"):
        operations.edit_panel(campaign, "p1", remark="x" * 20_001)
    with pytest.raises(OperationRefused, match="too long"):
        operations.edit_campaign_remark(campaign, "x" * 20_001)


def test_a_photograph_that_is_kept_twice_lies_in_the_file_once(file: CampaignFile) -> None:
    for _ in range(2):
        file.apply(operations.add_photograph(file.campaign, "p1", png()))
    first, second = file.campaign.photographs[-2:]
    assert first.photograph_id != second.photograph_id
    assert first.sha256 == second.sha256 == hashlib.sha256(png()).hexdigest()
