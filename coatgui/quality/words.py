"""Frequencies and stretches as people say them."""

from __future__ import annotations


def hertz(frequency: float) -> str:
    """A frequency as people say it: 6.3 kHz, 0.63 Hz, 10 mHz."""
    for factor, unit in ((1e6, "MHz"), (1e3, "kHz"), (1.0, "Hz")):
        if frequency >= 0.1 * factor and (factor == 1.0 or frequency >= factor):
            return f"{frequency / factor:.3g} {unit}"
    return f"{frequency * 1e3:.3g} mHz"


def listed(words: list[str]) -> str:
    """Things in a row: a, b and c."""
    return words[0] if len(words) == 1 else f"{', '.join(words[:-1])} and {words[-1]}"
