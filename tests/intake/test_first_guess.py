"""Where the columns are not understood, a person still gets them to name."""

from __future__ import annotations

from dataclasses import replace

import pytest

from coatgui.intake import Unreadable, first_guess, read_as_told

_ROWS = "\n".join(f"{10.0 ** (5 - k)}|{100.0 + k}|{-(10.0 ** (k + 1))}" for k in range(7))


def test_unknown_columns_can_be_named_and_then_read() -> None:
    data = f"alpha|beta|gamma\n{_ROWS}\n".encode()
    guess = first_guess(data)
    assert (guess.delimiter, guess.first_data_line) == ("|", 0)
    assert [c.role for c in guess.columns] == ["other"] * 3
    named = tuple(
        replace(c, role=role)
        for c, role in zip(guess.columns, ("frequency", "real", "imaginary"), strict=True)
    )
    (piece,) = read_as_told(data, replace(guess, columns=named))
    assert len(piece.spectrum) == 7
    assert piece.spectrum.impedance_ohm[0] == 100 - 10j


def test_headings_that_are_known_are_kept() -> None:
    data = f"frequency / kHz|Z' / ohm|what\n{_ROWS}\n".encode()
    columns = first_guess(data).columns
    assert [(c.role, c.factor) for c in columns] == [
        ("frequency", 1000.0), ("real", 1.0), ("other", 1.0),
    ]  # fmt: skip


def test_without_numbers_there_is_nothing_to_name() -> None:
    with pytest.raises(Unreadable):
        first_guess(b"only words here\nand here\n")
