"""The colours as eyes see them that lack one kind of cone.

Simulated with the matrices of Machado, Oliveira and Fernandes, "A physiologically-based model for
simulation of color vision deficiency", IEEE Transactions on Visualization and Computer Graphics 15
(2009) 1291, for the full deficiency, on linear RGB.
"""

from __future__ import annotations

from itertools import combinations

import numpy as np
import pytest

pytest.importorskip("PySide6")

from PySide6.QtGui import QColor

from coatgui.window import palette

EYES = {
    "protan": [[0.152286, 1.052583, -0.204868], [0.114503, 0.786281, 0.099216],
               [-0.003882, -0.048116, 1.051998]],
    "deutan": [[0.367322, 0.860646, -0.227968], [0.280085, 0.672501, 0.047413],
               [-0.011820, 0.042940, 0.968881]],
    "tritan": [[1.255528, -0.076749, -0.178779], [-0.078411, 0.930809, 0.147602],
               [0.004733, 0.691367, 0.303900]],
}  # fmt: skip
_TO_XYZ = np.array([[0.4124, 0.3576, 0.1805], [0.2126, 0.7152, 0.0722], [0.0193, 0.1192, 0.9505]])


def seen(colour: QColor, eye: str) -> np.ndarray:
    """CIE L*a*b* (white of sRGB) of a colour through such an eye."""
    rgb = np.array([colour.redF(), colour.greenF(), colour.blueF()])
    linear = np.where(rgb <= 0.04045, rgb / 12.92, ((rgb + 0.055) / 1.055) ** 2.4)
    through = np.clip(np.array(EYES[eye]) @ linear, 0.0, 1.0)
    ratio = (_TO_XYZ @ through) / _TO_XYZ.sum(axis=1)
    f = np.where(ratio > 0.008856, np.cbrt(ratio), 7.787 * ratio + 16 / 116)
    return np.array([116 * f[1] - 16, 500 * (f[0] - f[1]), 200 * (f[1] - f[2])])


@pytest.mark.parametrize("eye", EYES)
def test_the_simulation_leaves_greys_alone(eye: str) -> None:
    for value in (0, 64, 128, 255):
        lightness, a, b = seen(QColor(value, value, value), eye)
        assert abs(a) < 1
        assert abs(b) < 1
        assert lightness == pytest.approx(seen(QColor(value, value, value), "protan")[0], abs=0.5)


@pytest.mark.parametrize("dark", [False, True])
@pytest.mark.parametrize("eye", EYES)
def test_ramps_keep_their_order_and_steps(eye: str, dark: bool) -> None:
    for colours in (
        [palette.ramp(share / 10, dark)[0] for share in range(11)],
        [palette.time_colour(share / 10, dark) for share in range(11)],
    ):
        steps = np.diff([seen(colour, eye)[0] for colour in colours])
        assert (np.sign(steps) == np.sign(steps[0])).all()
        assert np.abs(steps).min() > 1.5  # each step can be told from the next
        assert np.abs(steps).max() < 2.2 * np.abs(steps).min()  # and none stands out


@pytest.mark.parametrize("dark", [False, True])
@pytest.mark.parametrize("eye", EYES)
def test_formulations_differ_in_colour_or_in_shape(eye: str, dark: bool) -> None:
    looks = [palette.formulation_look(place, dark) for place in range(6)]
    for (one, shape), (other, another) in combinations(looks, 2):
        apart = float(np.linalg.norm(seen(QColor(one), eye) - seen(QColor(other), eye)))
        assert apart > 10 or shape != another
        assert shape != another  # colour is never the only sign


@pytest.mark.parametrize("dark", [False, True])
@pytest.mark.parametrize("eye", EYES)
def test_words_of_doubt_and_rejection_are_read(eye: str, dark: bool) -> None:
    tone = palette.colours(dark)
    ground = seen(QColor(tone.ground), eye)[0]
    for ink in (tone.ink, tone.second, tone.verdigris, tone.rust, tone.amber, tone.slate):
        assert abs(seen(QColor(ink), eye)[0] - ground) > 35
