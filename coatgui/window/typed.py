"""Numbers as a person types them, with or without a unit: "4,6 nF", "2 TΩ", "0.1; 0.01 Hz"."""

from __future__ import annotations

import re

from coatgui.window.numbers import prefixed

_POWERS = {
    "f": -15, "p": -12, "n": -9, "µ": -6, "u": -6, "m": -3, "k": 3, "K": 3, "M": 6, "G": 9,
    "T": 12,
}  # fmt: skip
# How each unit may be written, in small letters.
_SPELT = {
    "Ω": ("ω", "ohm", "ohms"),
    "F": ("f", "farad"),
    "Hz": ("hz", "hertz"),
    "H": ("h", "henry"),
    "s": ("s", "sec"),
    "°C": ("°c", "c", "degc"),
    "Ω cm²": ("ω cm²", "ωcm²", "ω·cm²", "ohm cm²", "ohm cm2", "ω cm2", "ohm·cm²", "ω*cm²"),
    "h": ("h", "hours", "hour"),
}
_EXAMPLES = {
    "Ω": "2 TΩ", "F": "4.6 nF", "Hz": "10 kHz", "H": "200 nH", "s": "3 ms", "°C": "23 °C",
    "Ω cm²": "10 MΩ cm²", "h": "168 h",
}  # fmt: skip
_WRITTEN = re.compile(r"([+\-]?(?:\d[\d ]*[.,]?\d*|[.,]\d+)(?:[eE][+\-]?\d{1,3})?)\s*(.*)")
_NO_PREFIX = ("°C", "h")


def typed(text: str, unit: str) -> float:
    """The number that was typed, in `unit`; a comma is a decimal sign, and a number without a unit
    is taken to be in that unit. Raises ValueError with a sentence that can be shown."""
    written = " ".join(text.replace("−", "-").replace("\u2126", "Ω").replace("μ", "µ").split())
    example = _EXAMPLES.get(unit, "0.9")
    found = _WRITTEN.fullmatch(written)
    if not found:
        raise ValueError(f"“{written}” is not a number: type it like {example}.")
    number = float(found[1].replace(" ", "").replace(",", "."))
    after = found[2].strip()
    if not after:
        return number
    if unit in ("", "%"):
        raise ValueError(f"This is a plain number: leave “{after}” away.")
    if unit not in _SPELT:
        if after != unit:
            raise ValueError(f"“{after}” is not understood here: the unit is {unit}.")
        return number
    power = _power(after, unit)
    if power is None:
        raise ValueError(f"“{after}” is not a unit that belongs here: type it like {example}.")
    return float(f"{number!r}e{power}") if "e" not in repr(number) else number * 10.0**power


def _power(after: str, unit: str) -> int | None:
    """The power of ten of a written unit; a lone prefix will do ("2 T"). None where it is none."""
    spelt = (*_SPELT[unit], "")
    if after.casefold() in spelt:
        return 0
    if unit in _NO_PREFIX:
        return None
    prefix, rest = after[0], after[1:].strip().casefold()
    return _POWERS.get(prefix) if rest in spelt else None


def written(value: float | None, unit: str) -> str:
    """A number as it can be typed again, without idle zeros; empty for None."""
    if value is None:
        return ""
    if unit == "Ω cm²":
        return f"{written(value, 'Ω')} cm²"
    if unit not in _SPELT:
        return f"{value:g} {unit}".strip()
    number, _, after = prefixed(value, unit, 6).partition(" ")
    if "." in number and "e" not in number:
        number = number.rstrip("0").rstrip(".")
    return f"{number} {after}".strip()


def typed_list(text: str, unit: str) -> tuple[float, ...]:
    """Several numbers, parted by semicolons or "and", falling; a unit behind the last serves those
    that have none. Raises ValueError with a sentence."""
    parts = [part.strip() for part in re.split(r";|\band\b", text) if part.strip()]
    if not parts:
        raise ValueError(f"Type at least one, like {_EXAMPLES.get(unit, '0.9')}.")
    last = re.search(r"[^\d\s.,;+\-−].*$", re.sub(r"(?<=\d)[eE](?=[+\-\d])", "0", parts[-1]))
    ending = f" {last[0]}" if last else ""
    values = [typed(part + ending if re.search(r"\d$", part) else part, unit) for part in parts]
    return tuple(sorted(dict.fromkeys(values), reverse=True))
