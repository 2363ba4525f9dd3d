"""A small campaign in which every field of every record says something."""

import hashlib
from collections.abc import Iterator
from pathlib import Path

import numpy as np
import pytest

from coatgui.campaign import CampaignFile
from coatgui.records import (
    Campaign,
    Column,
    Criterion,
    Dialect,
    Formulation,
    Panel,
    Reading,
    Refusal,
    Settings,
    Source,
    Spectrum,
)

FREQUENCY_HZ = np.array([1e5, 1e3, 10.0, 10.0, 0.1, 1 / 3])


def spectrum(seed: int) -> Spectrum:
    random = np.random.default_rng(seed)
    size = FREQUENCY_HZ.size
    return Spectrum(
        FREQUENCY_HZ, 10 ** random.uniform(2, 11, size) - 1j * 10 ** random.uniform(-3, 11, size)
    )


@pytest.fixture
def raw() -> dict[str, bytes]:
    files = [f"file {number}\r\n\x00\xff".encode("latin-1") for number in range(4)]
    return {hashlib.sha256(content).hexdigest(): content for content in files}


@pytest.fixture
def campaign(raw: dict[str, bytes]) -> Campaign:
    hashes = tuple(raw)
    dialect = Dialect(
        "utf-16",
        ";",
        ",",
        3,
        (
            Column(0, "Frequenz/kHz", "frequency", "kHz", 1000.0),
            Column(2, "−Z″", "imaginary", "MΩ", -1e6),
        ),
        ascending=True,
        remarks=("Lines 1–2 were skipped.",),
    )
    formulations = (
        Formulation("f1", "Grey", "first batch"),
        Formulation("f2", "Blau 'Ü'; DROP"),
        Formulation("f3", "empty one"),
    )
    panels = (
        Panel(
            "p1", "A1", "f1", 10.1, 62.5, "steel", "3.5 % NaCl", 23.0, "ISO", "x", (("Lot", "7"),)
        ),
        Panel("p2", "B-2", "f2"),
    )
    readings = (
        Reading(
            "r1",
            "p1",
            0.1 + 0.2,
            spectrum(1),
            Source("one/a1.csv", hashes[0], "sheet 2", dialect),
            temperature_c=22.5,
            amplitude_mv=20.0,
            potential_mv=-431.7,
            remark="a drop under the cell\nwiped",
            left_out=((0, "spike"), (4, "drift")),
            kept_in=(2,),
            pinned_model="film_with_pores",
            overruled_because="repeated, same answer",
        ),
        Reading("r2", "p1", 168.0, spectrum(2), Source("a1 168.csv", hashes[1])),
        Reading("r3", "p2", 168.0, spectrum(3), Source("b2.csv", hashes[2], "t=168", dialect)),
        # The same numbers in another reading: one spectrum in the file, two readings.
        Reading("r4", "p2", 336.0, spectrum(3), Source("b2.csv", hashes[2], "t=336", dialect)),
    )
    return Campaign(
        campaign_id="c1",
        title="Salt and patience",
        settings=Settings(
            23.4,
            (1.0, 0.1),
            9e3,
            60.0,
            (Criterion("house limit", 0.1, 1e7, "agreed with the customer"),),
            (("kk_residual_percent", 1.5),),
        ),
        formulations=formulations,
        panels=panels,
        readings=readings,
        open_lead=spectrum(9),
        open_lead_source=Source("open_lead.txt", hashes[3], "", dialect),
        refused=(Refusal("broken.csv", "It holds no numbers."),),
        remark="Cabinet 3",
    )


@pytest.fixture
def path(tmp_path: Path) -> Path:
    return tmp_path / "Tafeln 1.coatgui"


@pytest.fixture
def file(path: Path, campaign: Campaign, raw: dict[str, bytes]) -> Iterator[CampaignFile]:
    with CampaignFile.create(path, campaign, raw) as created:
        yield created
