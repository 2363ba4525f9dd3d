"""What is saved from damaged files, and that nothing is made up."""

import sqlite3
from contextlib import closing
from dataclasses import replace
from pathlib import Path
from random import Random

import pytest
from mutations import mutated

from coatgui.campaign import CampaignFile, CampaignFileError, check_file, operations
from coatgui.campaign.recovery import recover
from coatgui.records import Campaign


def test_a_sound_file_is_recovered_whole(
    file: CampaignFile, campaign: Campaign, raw: dict[str, bytes], tmp_path: Path
) -> None:
    file.keep_results({"k" * 64: b"v" * 30_000})
    file.apply(operations.add_formulation(campaign, "for a while"))
    file.undo()
    file.close()
    target = tmp_path / "recovered.coatgui"
    told = recover(file.path, target)
    assert told.readings == len(campaign.readings)
    assert len(told.lost) == 1
    assert "history (3 lines" in told.lost[0]
    assert check_file(target) == ()
    with CampaignFile.open(target) as again:
        assert again.campaign == campaign
        assert all(again.raw(sha256) == content for sha256, content in raw.items())
        assert again.history()[0].name == "Recover what could be read from Tafeln 1.coatgui"


@pytest.mark.parametrize("version", ["version_1", "version_2", "version_3"])
def test_files_of_every_version_are_recovered(
    version: str, campaign: Campaign, path: Path, tmp_path: Path
) -> None:
    text = (Path(__file__).parent / "old_versions" / f"{version}.sql").read_text(encoding="utf-8")
    with closing(sqlite3.connect(path)) as shell:
        shell.executescript(text)
    told = recover(path, tmp_path / "recovered.coatgui")
    assert told.readings == len(campaign.readings)
    with CampaignFile.open(tmp_path / "recovered.coatgui") as again:
        known = version == "version_3"
        assert again.campaign.readings == tuple(
            r if known else replace(r, temperature_span_c=None, potential_span_mv=None)
            for r in campaign.readings
        )
        assert again.campaign.settings.criteria == campaign.settings.criteria


def page_of(path: Path, piece: bytes) -> int:
    return path.read_bytes().index(piece) // 4096


def ruin(path: Path, page: int) -> None:
    content = bytearray(path.read_bytes())
    content[page * 4096 : page * 4096 + 4096] = b"\xa5" * 4096
    path.write_bytes(content)


def test_without_its_schema_a_file_is_still_recovered(
    file: CampaignFile, campaign: Campaign, tmp_path: Path
) -> None:
    file.close()
    ruin(file.path, 0)
    with pytest.raises(CampaignFileError):
        CampaignFile.open(file.path)
    recover(file.path, tmp_path / "recovered.coatgui")
    with CampaignFile.open(tmp_path / "recovered.coatgui") as again:
        assert again.campaign == campaign


def test_what_is_lost_is_named(
    file: CampaignFile, campaign: Campaign, raw: dict[str, bytes], tmp_path: Path
) -> None:
    file.close()
    content = file.path.read_bytes()
    number = b"590.9870841674127" if b"590.9870841674127" in content else b"589.9870841674127"
    file.path.write_bytes(content.replace(number, b"7" * len(number)))
    target = tmp_path / "recovered.coatgui"
    told = recover(file.path, target)
    # Two readings have the numbers that were altered, both from one file.
    assert told.readings == 2
    assert "Lost: the reading of B-2 at 168 h from b2.csv." in told.lost
    assert "Lost: the reading of B-2 at 336 h from b2.csv." in told.lost
    assert told.to_read_again == {"b2.csv": raw[campaign.readings[2].source.sha256]}
    assert check_file(target) == ()


@pytest.mark.parametrize("piece", [b"Salt and patience", b"lower edge", b"a drop under the cell"])
def test_a_ruined_page_costs_what_stood_on_it(
    file: CampaignFile, campaign: Campaign, piece: bytes, tmp_path: Path
) -> None:
    file.close()
    ruin(file.path, page_of(file.path, piece))
    target = tmp_path / "recovered.coatgui"
    told = recover(file.path, target)
    assert len(told.lost) > 1
    assert check_file(target) == ()
    with CampaignFile.open(target) as again:
        assert set(again.campaign.readings) <= set(campaign.readings)
        if piece != b"a drop under the cell":
            assert again.campaign.readings == campaign.readings


def test_nothing_to_recover(tmp_path: Path) -> None:
    other = tmp_path / "other.coatgui"
    other.write_bytes(b"frequency;real\n1;2" * 900)
    with pytest.raises(CampaignFileError, match="Nothing"):
        recover(other, tmp_path / "target.coatgui")
    with pytest.raises(CampaignFileError):
        recover(tmp_path / "absent", tmp_path / "target.coatgui")
    assert not (tmp_path / "target.coatgui").exists()


def test_whatever_is_damaged_recovery_makes_nothing_up(
    file: CampaignFile, campaign: Campaign, tmp_path: Path
) -> None:
    file.close()
    sound = file.path.read_bytes()
    target = tmp_path / "recovered.coatgui"
    whole = 0
    for number in range(150):
        file.path.write_bytes(mutated(sound, Random(f"recovery {number}")))
        try:
            recover(file.path, target, replace_target=True)
        except CampaignFileError:
            continue
        assert check_file(target) == () or "are missing" in check_file(target)[0], number
        with CampaignFile.open(target, read_only=True) as again:
            spectra = {r.spectrum for r in again.campaign.readings}
            assert spectra <= {r.spectrum for r in campaign.readings}
            whole += len(again.campaign.readings) == len(campaign.readings)
    assert whole > 75
