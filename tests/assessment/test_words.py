"""Numbers as they stand in a sentence, and that no sentence writes them otherwise."""

from __future__ import annotations

import dataclasses
import re
from collections.abc import Iterator

import pytest

from coatgui.assessment.assess import conclude
from coatgui.assessment.words import hertz, power_of_ten
from coatgui.progress import Progress
from tests.benchmarks.assessment_of_many import large_campaign


@pytest.mark.parametrize(
    ("value", "text"),
    [
        (6e11, "6·10¹¹"), (1e7, "10⁷"), (9.99e8, "10⁹"), (3.2e-11, "3.2·10⁻¹¹"), (42.0, "42"),
        (0.0, "0"), (-2e5, "−2·10⁵"), (0.0079, "0.0079"), (9999.0, "10⁴"), (1234.0, "1230"),
    ],
)  # fmt: skip
def test_powers_of_ten(value: float, text: str) -> None:
    assert power_of_ten(value) == text


@pytest.mark.parametrize(
    ("frequency", "text"),
    [(1e4, "10 kHz"), (0.1, "0.1 Hz"), (0.01, "0.01 Hz"), (1.5e10, "15 GHz"), (2.5e6, "2.5 MHz"),
     (999.0, "999 Hz"), (1e-5, "10⁻⁵ Hz")],
)  # fmt: skip
def test_frequencies(frequency: float, text: str) -> None:
    assert hertz(frequency) == text


def _sentences(value: object) -> Iterator[str]:
    if isinstance(value, str):
        yield value
    elif isinstance(value, tuple | list):
        for part in value:
            yield from _sentences(part)
    elif dataclasses.is_dataclass(value):
        for field in dataclasses.fields(value):
            yield from _sentences(getattr(value, field.name))


def test_no_sentence_writes_numbers_as_a_machine_does() -> None:
    campaign, drawn = large_campaign(panels=6, formulations=2, times=8)
    said = set(_sentences(conclude(campaign, drawn, Progress())))
    assert any("10 kHz" in text for text in said)
    assert [t for t in said if re.search(r"\de[+-]?\d|\d000 Hz", t)] == []
