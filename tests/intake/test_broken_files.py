"""Files broken at random are read or refused with a sentence; nothing else ever happens."""

from __future__ import annotations

import random
from contextlib import suppress

import numpy as np
import pytest

from coatgui.intake import Unreadable, read_spectra

FREQUENCY = np.logspace(5, -2, 40)
Z = 120 + 1 / (2e-9j * FREQUENCY + 1 / 4e6)
PIECES = (b";", b",", b"\n", b"\x00", b'"', b"1e999", b"nan", b"-", b"=1+1", b"\xff", b"'", b"(",
          b"|Z|", b"/", b"log ", b"24 h\n", b"Panel: A1\n", b"mohm", b"\t", b"0;0;0\n")  # fmt: skip


def broken(seed: int) -> bytes:
    chance = random.Random(seed)
    form = chance.choice(["{:.6g};{:.6g};{:.6g}", "{:.3f},{:.3f},{:.3f}", "A1;24;{:g};{:g};{:g}"])
    heading = chance.choice(["f (Hz);Z' (Ohm);Z'' (Ohm)", "panel;time (h);f;Z';Z''", ""])
    rows = [form.format(f, z.real, z.imag) for f, z in zip(FREQUENCY, Z, strict=True)] * 2
    data = bytearray("\n".join([heading, *rows]).encode(chance.choice(["utf-8", "utf-16"])))
    for _ in range(chance.choice([1, 3, 30])):
        place = chance.randrange(len(data) + 1)
        what = chance.randrange(4)
        if what == 0:
            data[place:place] = chance.choice(PIECES)
        elif what == 1:
            del data[place : place + chance.randrange(1, 40)]
        elif what == 2:
            data[place : place + 1] = bytes([chance.randrange(256)])
        else:
            data[place:place] = data[: chance.randrange(200)]
    return bytes(data)


@pytest.mark.parametrize("chunk", range(4))
def test_nothing_but_a_refusal(chunk: int) -> None:
    for seed in range(chunk, 800, 4):
        with suppress(Unreadable):
            for piece in read_spectra(broken(seed)):
                assert np.isfinite(piece.spectrum.impedance_ohm).all()
                assert (piece.spectrum.impedance_ohm != 0).all()
                assert len(piece.spectrum) >= 5
