import hashlib
from dataclasses import replace

import numpy as np
import pytest

from coatgui.campaign import (
    UNASSIGNED,
    CampaignFile,
    OperationRefused,
    campaign_from_found,
    operations,
)
from coatgui.records import (
    Campaign,
    Found,
    FoundPanel,
    FoundReading,
    Refusal,
    Settings,
    Source,
    Spectrum,
)


def spectrum(ohm: float) -> Spectrum:
    return Spectrum(np.array([10.0, 1.0]), np.array([ohm, ohm - 1j]))


def reading(panel: str, hours: float, content: bytes, part: str = "") -> FoundReading:
    sha256 = hashlib.sha256(content).hexdigest()
    name = f"{panel}_{hours:g}h.csv"
    return FoundReading(
        spectrum(float(len(content))), Source(name, sha256, part), panel, hours, 21, 20, -300, "r"
    )


def raw(*contents: bytes) -> dict[str, bytes]:
    return {hashlib.sha256(content).hexdigest(): content for content in contents}


LISTED = FoundPanel(
    "A1", "Grey", 10, 60.0, "steel", "NaCl", 23.0, "ISO", "scratched", (("Lot", "7"),)
)


def names(campaign: Campaign) -> dict[str, str]:
    formulations = {f.formulation_id: f.name for f in campaign.formulations}
    return {p.name: formulations[p.formulation_id] for p in campaign.panels}


def test_a_new_campaign() -> None:
    settings = Settings(mains_hz=60.0)
    lead = (spectrum(9.0), Source("open_lead.csv", "e" * 64))
    refusal = Refusal("x.csv", "no")
    found = Found(
        (LISTED, FoundPanel("A2", "Grey"), FoundPanel("Z9")),
        (reading("A1", 24, b"a"), reading("A1", 48, b"b"), reading("C3", 24, b"c")),
        lead,
        (refusal, refusal),
    )
    campaign = campaign_from_found(found, "Title", settings)
    assert (campaign.title, campaign.settings) == ("Title", settings)
    assert names(campaign) == {"A1": "Grey", "A2": "Grey", "Z9": UNASSIGNED, "C3": UNASSIGNED}
    assert [f.name for f in campaign.formulations] == ["Grey", UNASSIGNED]
    a1 = campaign.panels[0]
    assert (a1.area_cm2, a1.thickness_um, a1.temperature_c) == (10.0, 60.0, 23.0)
    assert (a1.substrate, a1.electrolyte, a1.regime) == ("steel", "NaCl", "ISO")
    assert (a1.remark, a1.notes) == ("scratched", (("Lot", "7"),))
    assert campaign.panels[-1].area_cm2 is None
    first = campaign.readings[0]
    assert (first.panel_id, first.exposure_h) == (a1.panel_id, 24.0)
    assert (first.temperature_c, first.amplitude_mv, first.potential_mv) == (21.0, 20.0, -300.0)
    assert (first.source, first.remark) == (found.readings[0].source, "r")
    assert [r.exposure_h for r in campaign.readings] == [24.0, 48.0, 24.0]
    assert (campaign.open_lead, campaign.open_lead_source) == lead
    assert campaign.refused == (refusal,)
    ids = [f.formulation_id for f in campaign.formulations]
    ids += [p.panel_id for p in campaign.panels] + [r.reading_id for r in campaign.readings]
    assert len(set(ids)) == len(ids)
    assert campaign_from_found(found, "Title").campaign_id != campaign.campaign_id


def test_the_same_bytes_are_taken_once() -> None:
    found = Found(
        readings=(
            reading("A1", 24, b"a", "t=24"),
            reading("A1", 48, b"a", "t=48"),
            reading("B1", 24, b"a", "t=24"),
        )
    )
    campaign = campaign_from_found(found, "T")
    assert [r.exposure_h for r in campaign.readings] == [24.0, 48.0]
    assert names(campaign) == {"A1": UNASSIGNED}
    (refusal,) = campaign.refused
    assert refusal.file == "B1_24h.csv"
    assert "same bytes as A1_24h.csv" in refusal.reason
    assert "panel A1 at 24 h" in refusal.reason


def test_a_panel_listed_twice_is_one_panel() -> None:
    found = Found((FoundPanel("A1", area_cm2=10.0), FoundPanel(" A1 ", "Grey", area_cm2=12.0)))
    campaign = campaign_from_found(found, "T")
    assert names(campaign) == {"A1": "Grey"}
    assert campaign.panels[0].area_cm2 == 10.0
    (refusal,) = campaign.refused
    assert refusal.file == "panels.csv"
    assert "area in cm² 12.0, but 10.0 was known" in refusal.reason


def test_what_makes_no_sense_is_refused_by_name() -> None:
    found = Found(
        (FoundPanel(" "), FoundPanel("A1", area_cm2=-1.0, temperature_c=float("nan"))),
        (reading("", 1, b"a"), reading("A1", -1, b"b"), reading("A1", float("nan"), b"c")),
    )
    campaign = campaign_from_found(found, "T")
    assert campaign.readings == ()
    assert (campaign.panels[0].area_cm2, campaign.panels[0].temperature_c) == (None, None)
    said = [r.reason for r in campaign.refused]
    assert len(said) == 6
    for part, reason in zip(
        ["no panel", "-1 is no", "nan is no", "no panel", "time (-1 h)", "time (nan h)"],
        said,
        strict=True,
    ):
        assert part in reason


def test_file_names_that_are_no_text_can_be_stored(file: CampaignFile) -> None:
    odd = replace(reading("A1", 3, b"odd"), source=Source("a\udcff.csv", raw(b"odd").popitem()[0]))
    found = Found(readings=(odd,), refused=(Refusal("b\udcff.csv", "no"),), raw=raw(b"odd"))
    file.apply(operations.import_found(file.campaign, found))
    assert file.campaign.readings[-1].source.file == "a?.csv"
    assert file.campaign.refused[-1].file == "b?.csv"


def test_import_into_a_campaign(file: CampaignFile, campaign: Campaign) -> None:
    found = Found(
        (FoundPanel("B-2", area_cm2=8.0), FoundPanel("C3", "Grey", 9.0)),
        (reading("B-2", 500, b"new 1"), reading("C3", 500, b"new two")),
        refused=(Refusal("y.csv", "no numbers"), *campaign.refused),
        raw=raw(b"new 1", b"new two"),
    )
    operation = operations.import_found(file.campaign, found)
    assert operation.name == "Import 2 readings, 1 panel and 1 refusal"
    change = file.apply(operation)
    assert change.kinds == {"panels", "readings", "refused"}
    after = file.campaign
    assert after.readings[:4] == campaign.readings
    assert after.panels[:2] == (campaign.panels[0], replace(campaign.panels[1], area_cm2=8.0))
    assert names(after)["C3"] == "Grey"
    assert after.formulations == campaign.formulations
    assert [r.panel_id for r in after.readings[4:]] == ["p2", after.panels[2].panel_id]
    assert after.refused == (*campaign.refused, Refusal("y.csv", "no numbers"))
    for sha256, content in found.raw.items():
        assert file.raw(sha256) == content
    file.undo()
    assert file.campaign == campaign
    file.redo()
    assert file.campaign == after


def test_importing_the_same_again_adds_no_reading(file: CampaignFile) -> None:
    found = Found((LISTED,), (reading("C3", 500, b"new"),), raw=raw(b"new"))
    file.apply(operations.import_found(file.campaign, found))
    once = file.campaign
    file.apply(operations.import_found(once, found))
    assert file.campaign.readings == once.readings
    assert file.campaign.panels == once.panels
    assert file.campaign.refused == once.refused
    again = operations.import_found(file.campaign, found)
    assert (again.changes, again.name) == ((), "Nothing new; 1 reading there already")
    more = replace(found, readings=(*found.readings, reading("C3", 600, b"more")), raw=raw(b"more"))
    name = operations.import_found(file.campaign, more).name
    assert name == "Import 1 reading; 1 reading there already"


def test_a_reading_moved_by_hand_is_recognised_by_its_file(file: CampaignFile) -> None:
    found = Found((), (reading("C3", 500, b"new"),), raw=raw(b"new"))
    file.apply(operations.import_found(file.campaign, found))
    moved = file.campaign.readings[-1].reading_id
    file.apply(operations.edit_reading(file.campaign, moved, exposure_h=510))
    assert operations.import_found(file.campaign, found).changes == ()


def test_a_corrected_export_replaces_visibly(file: CampaignFile) -> None:
    first = Found((), (reading("C3", 500, b"first"),), raw=raw(b"first"))
    file.apply(operations.import_found(file.campaign, first))
    before = file.campaign
    old = before.readings[-1]
    file.apply(operations.leave_out_points(before, old.reading_id, [1], "spike"))
    better = Found((), (reading("C3", 500, b"corrected"),), raw=raw(b"corrected"))
    operation = operations.import_found(file.campaign, better)
    assert operation.name == "Import 1 corrected reading"
    file.apply(operation)
    new = file.campaign.readings[-1]
    assert len(file.campaign.readings) == len(before.readings)
    assert (new.reading_id, new.spectrum) == (old.reading_id, better.readings[0].spectrum)
    assert new.left_out == ()
    assert f"before: C3_500h.csv, SHA-256 {old.source.sha256[:12]}" in new.remark
    assert "were reset" in new.remark
    # The old bytes stay, the new ones are there, and undo brings the old reading back.
    assert file.raw(old.source.sha256) == b"first"
    assert file.raw(new.source.sha256) == b"corrected"
    file.undo()
    file.undo()
    assert file.campaign.readings[-1] == old


def test_the_same_numbers_saved_again_change_nothing(file: CampaignFile) -> None:
    file.apply(operations.import_found(file.campaign, Found((), (reading("C3", 500, b"abc"),))))
    again = Found((), (reading("C3", 500, b"cba"),))  # other bytes, the same spectrum
    assert operations.import_found(file.campaign, again).changes == ()


def test_a_repeated_measurement_is_no_correction(file: CampaignFile) -> None:
    first = reading("C3", 500, b"first")
    file.apply(operations.import_found(file.campaign, Found((), (first,))))
    second = replace(
        reading("C3", 500, b"second one"), source=Source("repeat.csv", raw(b"2").popitem()[0])
    )
    both = operations.import_found(file.campaign, Found((), (first, second)))
    assert both.name == "Import 1 reading; 1 reading there already"
    file.apply(both)
    # Of two that are there, the file's name tells which is meant; without it none is replaced.
    third = Found((), (replace(second, source=Source("x.csv", "3" * 64)),))
    third = replace(third, readings=(replace(third.readings[0], spectrum=spectrum(77.0)),))
    assert operations.import_found(file.campaign, third).name == "Import 1 reading"
    named = replace(third.readings[0], source=Source("repeat.csv", "3" * 64))
    replaced = operations.import_found(file.campaign, Found((), (named,)))
    assert replaced.name == "Import 1 corrected reading"


def test_a_file_that_can_be_used_now_is_no_longer_refused(file: CampaignFile) -> None:
    said = Refusal("C3_500h.csv", "It was cut short.")
    file.apply(operations.import_found(file.campaign, Found(refused=(said,))))
    assert said in file.campaign.refused
    file.apply(operations.import_found(file.campaign, Found((), (reading("C3", 500, b"whole"),))))
    assert said not in file.campaign.refused
    file.undo()
    assert said in file.campaign.refused


def test_stored_bytes_are_read_again_in_one_operation(
    file: CampaignFile, campaign: Campaign
) -> None:
    r1, r3 = campaign.readings[0], campaign.readings[2]
    assert r1.source.dialect is not None
    dialect = replace(r1.source.dialect, delimiter=",")
    turned = Spectrum(r1.spectrum.frequency_hz, r1.spectrum.impedance_ohm.conj())
    corrected = {
        "r1": FoundReading(
            turned,
            replace(r1.source, dialect=dialect),
            "A1",
            2.0,
            temperature_span_c=(21.0, 22.0),
        ),
        "r3": FoundReading(spectrum(4.0), r3.source, "New one", 168.0),
    }
    operation = operations.read_again(campaign, corrected)
    assert operation.name == "Read 2 readings again, corrected"
    file.apply(operation)
    after = file.campaign
    # What ran within the sweep comes from the file as well, and this reading of it names nothing.
    assert after.readings[0] == replace(
        r1,
        spectrum=turned,
        exposure_h=2.0,
        source=corrected["r1"].source,
        temperature_span_c=(21.0, 22.0),
        potential_span_mv=None,
    )
    assert after.readings[0].left_out == r1.left_out  # the same frequencies, the same points
    assert after.readings[2].spectrum == spectrum(4.0)
    assert names(after)["New one"] == UNASSIGNED
    file.undo()
    assert file.campaign == campaign
    for wrong, words in (
        ({}, "at least one"),
        ({"nobody": corrected["r1"]}, "not in the campaign"),
        ({"r3": corrected["r1"]}, "its own"),
        ({"r1": replace(corrected["r1"], exposure_h=-1.0)}, "0 h or more"),
        ({"r1": replace(corrected["r1"], panel=" ")}, "name that is not empty"),
    ):
        with pytest.raises(OperationRefused, match=words):
            operations.read_again(campaign, wrong)


def test_known_facts_are_kept(file: CampaignFile, campaign: Campaign) -> None:
    listed = FoundPanel(
        "A1", "Blau 'Ü'; DROP", 12.0, None, "zinc", notes=(("Lot", "8"), ("Shift", "night"))
    )
    file.apply(operations.import_found(campaign, Found((listed,))))
    assert file.campaign.panels[0] == replace(
        campaign.panels[0], notes=(("Lot", "7"), ("Shift", "night"))
    )
    reasons = [r.reason for r in file.campaign.refused[1:]]
    assert [reason.split(" says ")[1].split(",")[0] for reason in reasons] == [
        "formulation Blau 'Ü'; DROP",
        "area in cm² 12.0",
        "substrate zinc",
        "Lot 8",
    ]


def test_an_unassigned_panel_can_be_assigned_by_a_list() -> None:
    campaign = campaign_from_found(Found(readings=(reading("A1", 1, b"a"),)), "T")
    operation = operations.import_found(campaign, Found((FoundPanel("A1", "Grey"),)))
    assert {change.table for change in operation.changes} == {"formulations", "panels"}
    assert operation.name == "Import panel facts"


def test_another_open_lead_run_is_refused(campaign: Campaign) -> None:
    other = Found(open_lead=(spectrum(5.0), Source("open_lead_2.csv", "1" * 64)))
    (change,) = operations.import_found(campaign, other).changes
    assert change.table == "refused"
    assert campaign.open_lead is not None
    same = Found(open_lead=(campaign.open_lead, Source("open_lead.csv", "1" * 64)))
    assert operations.import_found(campaign, same).changes == ()
    without = replace(campaign, open_lead=None, open_lead_source=None)
    assert operations.import_found(without, other).name == "Import 1 open-lead run"
