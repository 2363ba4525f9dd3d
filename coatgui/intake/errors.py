"""How intake says that it cannot, or should not, read something."""

from __future__ import annotations


class Unreadable(Exception):
    """A file that cannot be used; the message is one sentence for a person."""


class Unclear(Unreadable):
    """A file that makes sense in more than one way, or lacks what only a person knows: the message
    says what to tell the program. Nothing is guessed."""


class NoSpectrum(Unreadable):
    """Numbers, or nothing, but no spectrum: beside a spectrum they are passed over."""
