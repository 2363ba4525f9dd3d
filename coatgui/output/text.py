"""Text from outside made harmless: names of files and panels can hold anything."""

from __future__ import annotations

import unicodedata

REPLACED = "\ufffd"
# Characters that turn the order of what follows, so that a name reads as another.
_TURNING = frozenset("\u202a\u202b\u202c\u202d\u202e\u2066\u2067\u2068\u2069")


def whole_text(text: str) -> str:
    """Text that can be written as UTF-8: halves of characters, as names of files that were not
    UTF-8 bring them, become U+FFFD."""
    if text.isascii():
        return text
    return "".join(REPLACED if "\ud800" <= c <= "\udfff" else c for c in text)


def one_line(text: str) -> str:
    """Text for a line of a terminal: white space becomes one blank, and what could steer the
    terminal or turn the reading order becomes U+FFFD."""
    words = " ".join(text.split())
    if words.isprintable():  # which neither half a character nor anything that steers is
        return words
    return "".join(
        REPLACED if c in _TURNING or unicodedata.category(c) in ("Cc", "Cs") else c for c in words
    )


def columns_of(text: str) -> int:
    """How many columns of a terminal the text takes: wide characters take two, marks none."""
    return sum(
        0 if unicodedata.combining(c) else 2 if unicodedata.east_asian_width(c) in "WF" else 1
        for c in text
    )


def printable(text: str) -> str:
    """Text for a page: one line, without control characters and without what turns the reading
    order; nothing else is changed."""
    return one_line(whole_text(text))
