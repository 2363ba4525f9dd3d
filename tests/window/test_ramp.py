"""The ramp of the map: even steps, seen on its ground, and never glaring."""

from __future__ import annotations

import numpy as np
import pytest

pytest.importorskip("PySide6")

from coatgui.window import palette
from coatgui.window.palette import ramp


def luminance(colour: str) -> float:
    """Relative luminance (WCAG 2.2)."""
    parts = [int(colour[i : i + 2], 16) / 255 for i in (1, 3, 5)]
    linear = [p / 12.92 if p <= 0.04045 else ((p + 0.055) / 1.055) ** 2.4 for p in parts]
    return 0.2126 * linear[0] + 0.7152 * linear[1] + 0.0722 * linear[2]


def contrast(one: str, other: str) -> float:
    light, dark = sorted((luminance(one), luminance(other)), reverse=True)
    return (light + 0.05) / (dark + 0.05)


@pytest.mark.parametrize("dark", [False, True])
def test_the_ramp_falls_evenly_and_its_ink_is_read(dark: bool) -> None:
    steps = [ramp(share / 20, dark) for share in range(21)]
    lightness = np.diff([ground.lightnessF() for ground, _ in steps])
    assert (lightness < 0).all()
    assert np.ptp(lightness) < 0.006  # even, up to rounding to eight bits
    assert min(contrast(ground.name(), ink.name()) for ground, ink in steps) >= 4.5


def test_on_dark_ground_no_cell_glares_and_none_is_lost() -> None:
    tone = palette.colours(True)
    against = [contrast(ramp(share / 20, True)[0].name(), tone.ground) for share in range(21)]
    # The words are the brightest thing there; the cells stay well below them.
    assert max(against) < 0.5 * contrast(tone.ink, tone.ground)
    assert min(against) >= 1.4
    assert contrast(ramp(0.0, True)[0].name(), ramp(1.0, True)[0].name()) >= 3.0
