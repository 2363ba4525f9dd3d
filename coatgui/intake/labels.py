"""Times, panels and dates as people write them beside and above their tables."""

from __future__ import annotations

import re
from datetime import datetime
from functools import cache

from coatgui.intake.units import data

_DATES = (
    (re.compile(r"(?P<y>\d{4})-(?P<m>\d{1,2})-(?P<d>\d{1,2})"), "certain"),
    (re.compile(r"(?P<y>\d{4})/(?P<m>\d{1,2})/(?P<d>\d{1,2})"), "certain"),
    (re.compile(r"(?P<d>\d{1,2})\.(?P<m>\d{1,2})\.(?P<y>\d{4})"), "certain"),
    (re.compile(r"(?P<d>\d{1,2})[/-](?P<m>\d{1,2})[/-](?P<y>\d{4})"), "order"),
)
_CLOCK = re.compile(r"(\d{1,2}):(\d{2})(?::(\d{2})(?:[.,]\d+)?)?\s*([ap]m)?", re.IGNORECASE)


@cache
def _time_pattern() -> re.Pattern[str]:
    units = "|".join(sorted(map(re.escape, data()["unit"]["time"]), key=len, reverse=True))
    return re.compile(
        rf"(?<![\w.,])(?P<number>\d+(?:[.,]\d+)?)\s*(?P<unit>{units})(?![^\W_])", re.IGNORECASE
    )


def time_in(text: str) -> tuple[float | None, str]:
    """Hours named in a text, and the text without them. Several times are none."""
    found = list(_time_pattern().finditer(text.replace("_", " ")))
    if len(found) != 1:
        return None, text
    (match,) = found
    hours = float(match["number"].replace(",", "."))
    factor = float(data()["unit"]["time"][match["unit"].casefold()])
    rest = f"{text[: match.start()]} {text[match.end() :]}".strip()
    return hours * factor, re.sub(r"[\s_]+", " ", rest).strip(" _-,;:()[]")


def label_in(text: str) -> tuple[str, float | None]:
    """Panel and hours of a short label: "A1 24 h", "24 h", "t = 24 h", "A1"."""
    text = text.strip().strip("#*=-–:;, ").strip()
    if not text or len(text) > 60:
        return "", None
    hours, rest = time_in(text)
    rest = re.sub(r"\b(?:t|time|after|nach|exposure|immersion)\b\s*[=:]?\s*$", "", rest,
                  flags=re.IGNORECASE)  # fmt: skip
    return rest.strip(" =:,;-_()[]"), hours


def moment_in(text: str) -> tuple[datetime | None, bool]:
    """A date, with its time of day if there is one; and whether day and month could be the other
    way round."""
    for pattern, how in _DATES:
        found = pattern.search(text)
        if not found:
            continue
        day, month = int(found["d"]), int(found["m"])
        unsure = how == "order" and day <= 12 and month <= 12 and day != month
        if how == "order" and month > 12:
            day, month = month, day
        clock = _CLOCK.search(text[found.end() :])
        hour, minute, second = 0, 0, 0
        if clock:
            hour, minute, second = int(clock[1]), int(clock[2]), int(clock[3] or 0)
            if clock[4]:
                hour = hour % 12 + (12 if clock[4].casefold() == "pm" else 0)
        try:
            return datetime(int(found["y"]), month, day, hour, minute, second), unsure
        except ValueError:
            return None, False
    return None, False
