"""A small campaign in which every field of every record says something."""

import hashlib
from collections.abc import Iterator
from pathlib import Path

import numpy as np
import pytest
from pictures import png

from coatgui.campaign import CampaignFile
from coatgui.records import (
    Campaign,
    Column,
    Criterion,
    Dialect,
    Electrolyte,
    Formulation,
    Identification,
    Judge,
    Limit,
    Method,
    Panel,
    Photograph,
    ProjectionWanted,
    Question,
    Rating,
    Reading,
    Refusal,
    Regime,
    Settings,
    Side,
    Source,
    Spectrum,
    VisualRating,
)

FREQUENCY_HZ = np.array([1e5, 1e3, 10.0, 10.0, 1 / 3, 0.1])
# Real and imaginary parts in Ω, written out digit by digit: powers differ in their last digit from
# processor to processor, and old files are compared exactly.
IMPEDANCE_OHM = {
    1: (
        (4040123.326162774, -387111714.19421804),
        (35823933242.5521, -535.5350612459978),
        (1983.5196831098274, -49466.55062419233),
        (34502059852.99925, -0.0024312386174736166),
        (645562.1224159738, -34198.44703894606),
        (64044.68118844323, -35414696.26777665),
    ),
    2: (
        (22620.865017496963, -0.42718404832315304),
        (48575.836793549206, -0.0059163353491833975),
        (2128294218.8531365, -7.072470598337806),
        (671.805382704116, -1599787.1654102788),
        (360615791.98660487, -0.12614547785867272),
        (25171247.13780125, -74425.07465000292),
    ),
    3: (
        (589.9870841674127, -5090.0045900252335),
        (13529.899147704231, -0.17232361827433934),
        (1627309601.4017804, -19234465.383949023),
        (17356347.01286947, -0.03903087422984636),
        (790938.0377824432, -17153.887467334993),
        (703.3277940457883, -300.0507156510653),
    ),
    9: (
        (6795835154.791713, -1110480888.1626565),
        (38137.7336880801, -7166825110.806322),
        (26812255.57612633, -0.0023562875173779125),
        (994962577.2676554, -1322.7324310719926),
        (17314943725.789455, -0.008168809404633996),
        (278401561.25241625, -6154.893997153954),
    ),
}


def spectrum(number: int) -> Spectrum:
    return Spectrum(FREQUENCY_HZ, np.array([complex(*z) for z in IMPEDANCE_OHM[number]]))


@pytest.fixture
def raw() -> dict[str, bytes]:
    files = [f"file {number}\r\n\x00\xff".encode("latin-1") for number in range(4)]
    files.append(png())
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
            temperature_span_c=(22.1, 22.9),
            potential_span_mv=(-440.25, -428.0),
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
            2e12,
            5e-12,
            True,
            ('{"id": "own", "name": "Dünner Film", "layer": [{"role": "film"}]}',),
            (Limit("wet", "water_uptake", 5.0, "vol-%", "the maker's sheet", Side.ABOVE),),
            (
                Question(
                    "pore_resistance", None, Judge.AT_TIME, Method.DUNNETT, 168.0, None, "", "Grey"
                ),
                Question(judge=Judge.RATING, method=Method.RANKS, scale="astm_d610"),
                Question(
                    judge=Judge.TIME_TO_LIMIT,
                    limit=Limit("low", "modulus", 1e6, "Ω cm²", "ours", Side.BELOW, 0.1),
                ),
            ),
            (ProjectionWanted("modulus", 2000.5, 0.1), ProjectionWanted("film_resistivity", 1e3)),
            (
                Electrolyte(
                    "brine", "Brine of the yard", 7.5, "measured", (("brine",), ("7.5", "x"))
                ),
            ),
            (
                Regime(
                    "ours",
                    "House cycle",
                    "6 h wet, 18 h dry",
                    "brine",
                    35.0,
                    24.0,
                    (0.0, 504.0),
                    "x",
                ),
                Regime("plain", "Shelf"),
            ),
            True,
        ),
        formulations=formulations,
        panels=panels,
        readings=readings,
        open_lead=spectrum(9),
        open_lead_source=Source("open_lead.txt", hashes[3], "", dialect),
        refused=(Refusal("broken.csv", "It holds no numbers."),),
        remark="Cabinet 3",
        ratings=(
            Rating("v1", VisualRating("p1", 168.0, "iso_4628_2", "2(S3)", "2016", "AB", "edge")),
            Rating("v2", VisualRating("p2", 0.0, "astm_d610", "9-S")),
        ),
        photographs=(
            Photograph("b1", "p1", hashes[4], "image/png", 168.0, "blisters, lower edge", "7.png"),
        ),
        identification=Identification(
            "Own laboratory", "A customer", "2026-17", "AB", "CD", ("ISO 16773-2", "ISO 4628-2")
        ),
    )


@pytest.fixture
def path(tmp_path: Path) -> Path:
    return tmp_path / "Tafeln 1.coatgui"


@pytest.fixture
def file(path: Path, campaign: Campaign, raw: dict[str, bytes]) -> Iterator[CampaignFile]:
    with CampaignFile.create(path, campaign, raw) as created:
        yield created
