"""What may be kept as a photograph: judged by its content, never by its name.

Only PNG and JPEG are taken, walked through from the first byte to the last: they hold pictures and
nothing that could act. What follows the end of a picture is cut off, as it could be anything.
"""

from __future__ import annotations

import re
import zlib
from pathlib import PureWindowsPath

from coatgui.campaign.errors import OperationRefused

PNG, JPEG = "image/png", "image/jpeg"
MEDIA_TYPES = (PNG, JPEG)
ENDINGS = {PNG: ".png", JPEG: ".jpg"}
# Own choice: twice what a phone writes; and what a desk computer can show without trouble.
LARGEST_BYTES = 20_000_000
MOST_PIXELS = 100_000_000
LONGEST_NAME = 120

_PNG_START = b"\x89PNG\r\n\x1a\n"
_JPEG_START = b"\xff\xd8\xff"
_JPEG_SIZES = {*range(0xC0, 0xD0)} - {0xC4, 0xC8, 0xCC}  # the frame headers SOF0 to SOF15
_DAMAGED = "This photograph is damaged: take it from the camera again."


def judged(content: bytes) -> tuple[bytes, str]:
    """The bytes to keep of a photograph, and its media type. Raises OperationRefused."""
    if len(content) > LARGEST_BYTES:
        raise OperationRefused(
            f"The photograph has {len(content) / 1e6:.0f} MB; at most {LARGEST_BYTES / 1e6:.0f} MB "
            "are kept: save it smaller first."
        )
    if content.startswith(_PNG_START):
        end, width, height = _walk_png(content)
        media_type = PNG
    elif content.startswith(_JPEG_START):
        end, width, height = _walk_jpeg(content)
        media_type = JPEG
    else:
        raise OperationRefused(
            "This is no photograph that can be kept, whatever its name says: save it as JPEG or "
            "PNG."
        )
    if width < 1 or height < 1:
        raise OperationRefused(_DAMAGED)
    if width * height > MOST_PIXELS:
        raise OperationRefused(
            f"The photograph has {width} × {height} pixels; at most {MOST_PIXELS / 1e6:.0f} million"
            " are kept: save it smaller first."
        )
    return content[:end], media_type


def plain_name(name: str) -> str:
    """The last part of a file name, without anything that means more than itself on some system."""
    last = PureWindowsPath(name.replace("/", "\\")).name
    plain = re.sub(r'[\x00-\x1f\x7f<>:"|?*\\/]', "_", last).strip(". ")
    return plain[:LONGEST_NAME]


def _walk_png(content: bytes) -> tuple[int, int, int]:
    """End, width and height. Every chunk must be whole, by its checksum."""
    place, width, height, has_picture = len(_PNG_START), 0, 0, False
    while place + 12 <= len(content):
        size = int.from_bytes(content[place : place + 4])
        kind = content[place + 4 : place + 8]
        end = place + 12 + size
        if end > len(content):
            break
        if zlib.crc32(content[place + 4 : end - 4]) != int.from_bytes(content[end - 4 : end]):
            break
        if place == len(_PNG_START):
            if kind != b"IHDR" or size != 13:
                break
            width = int.from_bytes(content[place + 8 : place + 12])
            height = int.from_bytes(content[place + 12 : place + 16])
        has_picture = has_picture or kind == b"IDAT"
        place = end
        if kind == b"IEND":
            if has_picture:
                return end, width, height
            break
    raise OperationRefused(_DAMAGED)


def _walk_jpeg(content: bytes) -> tuple[int, int, int]:
    """End, width and height. Segments are followed by their lengths, scans to their ends."""
    place, width, height, has_picture = 2, 0, 0, False
    while place + 4 <= len(content) and content[place] == 0xFF:
        marker = content[place + 1]
        if marker == 0xFF:  # filling
            place += 1
            continue
        if marker == 0xD9:
            break
        size = int.from_bytes(content[place + 2 : place + 4])
        if size < 2 or place + 2 + size > len(content):
            raise OperationRefused(_DAMAGED)
        if marker in _JPEG_SIZES and size >= 8:
            height = int.from_bytes(content[place + 5 : place + 7])
            width = int.from_bytes(content[place + 7 : place + 9])
        place += 2 + size
        if marker == 0xDA:
            has_picture = True
            place = _end_of_scan(content, place)
    if has_picture and content[place : place + 2] == b"\xff\xd9":
        return place + 2, width, height
    raise OperationRefused(_DAMAGED)


def _end_of_scan(content: bytes, place: int) -> int:
    """The next marker that is no part of the scan's own data (FF 00 and restarts are)."""
    while True:
        place = content.find(b"\xff", place)
        if place < 0 or place + 1 >= len(content):
            raise OperationRefused(_DAMAGED)
        after = content[place + 1]
        if after != 0 and not 0xD0 <= after <= 0xD7:
            return place
        place += 2
