"""What each operation does, and what it refuses, seen through the file."""

import hashlib
from collections.abc import Callable
from dataclasses import replace
from typing import Any

import pytest

from coatgui.campaign import CampaignFile, Operation, OperationRefused, operations
from coatgui.records import (
    Campaign,
    Criterion,
    Electrolyte,
    Found,
    Judge,
    Limit,
    Method,
    Panel,
    ProjectionWanted,
    Question,
    Reading,
    Regime,
    Side,
    Source,
)


def reading(campaign: Campaign, reading_id: str) -> Reading:
    return next(r for r in campaign.readings if r.reading_id == reading_id)


def panel(campaign: Campaign, panel_id: str) -> Panel:
    return next(p for p in campaign.panels if p.panel_id == panel_id)


def with_reading(campaign: Campaign, reading_id: str, **fields: Any) -> Campaign:
    return replace(
        campaign,
        readings=tuple(
            replace(r, **fields) if r.reading_id == reading_id else r for r in campaign.readings
        ),
    )


def with_panel(campaign: Campaign, panel_id: str, **fields: Any) -> Campaign:
    return replace(
        campaign,
        panels=tuple(
            replace(p, **fields) if p.panel_id == panel_id else p for p in campaign.panels
        ),
    )


def with_formulation(campaign: Campaign, formulation_id: str, **fields: Any) -> Campaign:
    return replace(
        campaign,
        formulations=tuple(
            replace(f, **fields) if f.formulation_id == formulation_id else f
            for f in campaign.formulations
        ),
    )


def with_rating(campaign: Campaign, **fields: Any) -> Campaign:
    first, *others = campaign.ratings
    return replace(campaign, ratings=(replace(first, seen=replace(first.seen, **fields)), *others))


LIMIT = Criterion("new", 0.01, 1e8, "ours")
WET = Limit("wet", "water_uptake", 4, "vol-%", "ours", Side.ABOVE)
BRINE = Electrolyte("brine", "Brine", 8, "measured", (("brine",),))

# The operation, what the campaign should be afterwards, what changes, how it is called.
CASES: dict[
    str,
    tuple[Callable[[Campaign], Operation], Callable[[Campaign], Campaign], set[str], str],
] = {
    "rename_campaign": (
        lambda c: operations.rename_campaign(c, " New "),
        lambda c: replace(c, title="New"),
        {"campaign"},
        "Rename the campaign to New",
    ),
    "edit_campaign_remark": (
        lambda c: operations.edit_campaign_remark(c, "two\nlines"),
        lambda c: replace(c, remark="two\nlines"),
        {"campaign"},
        "Change the campaign's remark",
    ),
    "edit_settings": (
        lambda c: operations.edit_settings(
            c, mains_hz=50, criteria=[LIMIT], modulus_frequencies_hz=[1], thresholds=[["x", 2]]
        ),
        lambda c: replace(
            c,
            settings=replace(
                c.settings,
                mains_hz=50.0,
                criteria=(LIMIT,),
                modulus_frequencies_hz=(1.0,),
                thresholds=(("x", 2.0),),
            ),
        ),
        {"settings"},
        "Set mains frequency, criteria, frequencies for the modulus and thresholds",
    ),
    "edit_settings of what is asked": (
        lambda c: operations.edit_settings(
            c,
            limits=[WET],
            comparisons=[*c.settings.comparisons, Question(method=Method.TUKEY)],
            projections=[],
            electrolytes=[BRINE],
            regimes=[Regime("shelf", "Shelf")],
        ),
        lambda c: replace(
            c,
            settings=replace(
                c.settings,
                limits=(WET,),
                comparisons=(*c.settings.comparisons, Question(method=Method.TUKEY)),
                projections=(),
                electrolytes=(BRINE,),
                regimes=(Regime("shelf", "Shelf"),),
            ),
        ),
        {"settings"},
        "Set limits, comparisons, projections, electrolytes and exposure regimes",
    ),
    "set_open_lead to none": (
        lambda c: operations.set_open_lead(c, None, None),
        lambda c: replace(c, open_lead=None, open_lead_source=None),
        {"open_lead"},
        "Remove the open-lead run",
    ),
    "set_open_lead": (
        lambda c: operations.set_open_lead(c, c.readings[0].spectrum, None),
        lambda c: replace(c, open_lead=c.readings[0].spectrum, open_lead_source=None),
        {"open_lead"},
        "Set the open-lead run",
    ),
    "dismiss_refusals": (
        lambda c: operations.dismiss_refusals(c, c.refused),
        lambda c: replace(c, refused=()),
        {"refused"},
        "Dismiss 1 refusal",
    ),
    "rename_formulation": (
        lambda c: operations.rename_formulation(c, "f2", "Blue"),
        lambda c: with_formulation(c, "f2", name="Blue"),
        {"formulations"},
        "Rename formulation Blau 'Ü'; DROP to Blue",
    ),
    "rename_formulation that is a reference": (
        lambda c: operations.rename_formulation(c, "f1", "Gray"),
        lambda c: replace(
            with_formulation(c, "f1", name="Gray"),
            settings=replace(
                c.settings,
                comparisons=(
                    replace(c.settings.comparisons[0], reference="Gray"),
                    *c.settings.comparisons[1:],
                ),
            ),
        ),
        {"formulations", "settings"},
        "Rename formulation Grey to Gray",
    ),
    "edit_formulation_remark": (
        lambda c: operations.edit_formulation_remark(c, "f1", ""),
        lambda c: with_formulation(c, "f1", remark=""),
        {"formulations"},
        "Change the remark of formulation Grey",
    ),
    "remove_formulation": (
        lambda c: operations.remove_formulation(c, "f3"),
        lambda c: replace(c, formulations=c.formulations[:2]),
        {"formulations"},
        "Remove formulation empty one",
    ),
    "edit_panel": (
        lambda c: operations.edit_panel(
            c,
            "p1",
            name="A 1",
            area_cm2=None,
            thickness_um=50,
            substrate="steel",
            notes=[["Lot", "8"], ["b", "c"]],
        ),
        lambda c: with_panel(
            c, "p1", name="A 1", area_cm2=None, thickness_um=50.0, notes=(("Lot", "8"), ("b", "c"))
        ),
        {"panels"},
        "Change name, area, film thickness and notes of panel A1",
    ),
    "edit_panels": (
        lambda c: operations.edit_panels(c, ["p1", "p2"], regime=" Salt ", temperature_c=35),
        lambda c: with_panel(
            with_panel(c, "p1", regime="Salt", temperature_c=35.0),
            "p2",
            regime="Salt",
            temperature_c=35.0,
        ),
        {"panels"},
        "Change exposure regime and temperature of 2 panels",
    ),
    "move_panel": (
        lambda c: operations.move_panel(c, "p2", "f1"),
        lambda c: with_panel(c, "p2", formulation_id="f1"),
        {"panels"},
        "Move panel B-2 to Grey",
    ),
    "remove_panel": (
        lambda c: operations.remove_panel(c, "p1"),
        lambda c: replace(
            c,
            panels=c.panels[1:],
            readings=c.readings[2:],
            ratings=c.ratings[1:],
            photographs=(),
        ),
        {"panels", "readings", "ratings", "photographs"},
        "Remove panel A1 with 2 readings",
    ),
    "identify": (
        lambda c: operations.identify(c, customer=" Another ", standards=["ISO 16773-2 "]),
        lambda c: replace(
            c,
            identification=replace(
                c.identification, customer="Another", standards=("ISO 16773-2",)
            ),
        ),
        {"campaign"},
        "Set customer, standards of the summary",
    ),
    "edit_rating": (
        lambda c: operations.edit_rating(c, "v1", value=" 3(S2) ", exposure_h=200),
        lambda c: with_rating(c, value="3(S2)", exposure_h=200.0),
        {"ratings"},
        "Change a rating of panel A1",
    ),
    "remove_ratings": (
        lambda c: operations.remove_ratings(c, ["v1", "v2"]),
        lambda c: replace(c, ratings=()),
        {"ratings"},
        "Remove 2 ratings",
    ),
    "edit_photograph": (
        lambda c: operations.edit_photograph(c, "b1", caption="rust", exposure_h=None),
        lambda c: replace(
            c, photographs=(replace(c.photographs[0], caption="rust", exposure_h=None),)
        ),
        {"photographs"},
        "Change a photograph of panel A1",
    ),
    "remove_photograph": (
        lambda c: operations.remove_photograph(c, "b1"),
        lambda c: replace(c, photographs=()),
        {"photographs"},
        "Remove a photograph of panel A1",
    ),
    "edit_reading": (
        lambda c: operations.edit_reading(c, "r1", exposure_h=24, panel_id="p2", remark=""),
        lambda c: with_reading(c, "r1", exposure_h=24.0, panel_id="p2", remark=""),
        {"readings"},
        "Change exposure time, panel and remark of the reading of A1 at 0.3 h",
    ),
    "remove_reading": (
        lambda c: operations.remove_reading(c, "r2"),
        lambda c: replace(c, readings=(c.readings[0], *c.readings[2:])),
        {"readings"},
        "Remove the reading of A1 at 168 h",
    ),
    "leave_out_points": (
        lambda c: operations.leave_out_points(c, "r1", [5, 2, 0], " noise "),
        lambda c: with_reading(
            c,
            "r1",
            left_out=((0, "noise"), (2, "noise"), (4, "drift"), (5, "noise")),
            kept_in=(),
        ),
        {"readings"},
        "Leave out 3 points of the reading of A1 at 0.3 h",
    ),
    "take_back_points": (
        lambda c: operations.take_back_points(c, "r1", [4, 1]),
        lambda c: with_reading(c, "r1", left_out=((0, "spike"),), kept_in=(1, 2, 4)),
        {"readings"},
        "Take back 2 points of the reading of A1 at 0.3 h",
    ),
    "pin_model": (
        lambda c: operations.pin_model(c, ["r2", "r3"], "closed_film"),
        lambda c: with_reading(
            with_reading(c, "r2", pinned_model="closed_film"), "r3", pinned_model="closed_film"
        ),
        {"readings"},
        "Set the model of 2 readings",
    ),
    "pin_model to automatic": (
        lambda c: operations.pin_model(c, ["r1"], ""),
        lambda c: with_reading(c, "r1", pinned_model=""),
        {"readings"},
        "Let the program choose the model of the reading of A1 at 0.3 h",
    ),
    "overrule": (
        lambda c: operations.overrule(c, "r2", "measured twice"),
        lambda c: with_reading(c, "r2", overruled_because="measured twice"),
        {"readings"},
        "Overrule the rejection of the reading of A1 at 168 h",
    ),
    "overrule no longer": (
        lambda c: operations.overrule(c, "r1", ""),
        lambda c: with_reading(c, "r1", overruled_because=""),
        {"readings"},
        "Accept the rejection of the reading of A1 at 0.3 h",
    ),
}


@pytest.mark.parametrize("case", CASES)
def test_an_operation_and_its_inverse(file: CampaignFile, campaign: Campaign, case: str) -> None:
    make, expected, kinds, name = CASES[case]
    wanted = expected(campaign)
    assert wanted != campaign
    change = file.apply(make(file.campaign))
    assert file.campaign == wanted
    assert change.kinds == kinds
    assert change.name == name == file.undo_name
    file.close()
    with CampaignFile.open(file.path) as again:
        assert again.campaign == wanted
        assert again.undo() == change
        assert again.campaign == campaign
        assert again.redo_name == name
        assert again.redo() == change
        assert again.campaign == wanted


def test_add_formulation_and_panel(file: CampaignFile) -> None:
    file.apply(operations.add_formulation(file.campaign, " Red ", "r"))
    red = file.campaign.formulations[-1]
    assert (red.name, red.remark) == ("Red", "r")
    file.apply(operations.add_panel(file.campaign, "C1", red.formulation_id, area_cm2=7))
    made = file.campaign.panels[-1]
    assert made == Panel(made.panel_id, "C1", red.formulation_id, 7.0)
    assert len({f.formulation_id for f in file.campaign.formulations}) == 4


def test_an_open_lead_run_brings_its_file(file: CampaignFile, campaign: Campaign) -> None:
    content = b"open again"
    sha256 = hashlib.sha256(content).hexdigest()
    source = Source("open_lead.csv", sha256)
    spectrum = campaign.readings[1].spectrum
    file.apply(operations.set_open_lead(file.campaign, spectrum, source, content))
    assert (file.campaign.open_lead, file.campaign.open_lead_source) == (spectrum, source)
    assert file.raw(sha256) == content


def test_an_edit_that_changes_nothing_leaves_no_trace(file: CampaignFile) -> None:
    change = file.apply(operations.edit_panel(file.campaign, "p1", area_cm2=10.1))
    assert change.kinds == frozenset()
    assert file.undo_name is None
    assert len(file.history()) == 1


def test_only_what_differs_is_written_down(campaign: Campaign) -> None:
    (change,) = operations.edit_panel(campaign, "p1", area_cm2=12, name="A1").changes
    assert (change.table, change.key) == ("panels", "p1")
    assert change.before == {"area_cm2": 10.1}
    assert change.after == {"area_cm2": 12.0}


REFUSED: dict[str, tuple[Callable[[Campaign], Operation], str]] = {
    "unknown panel": (lambda c: operations.edit_panel(c, "?", name="X"), "not in the campaign"),
    "unknown reading": (lambda c: operations.remove_reading(c, "?"), "not in the campaign"),
    "unknown formulation": (lambda c: operations.move_panel(c, "p1", "?"), "not in the campaign"),
    "empty panel name": (lambda c: operations.edit_panel(c, "p1", name=" "), "not empty"),
    "taken panel name": (
        lambda c: operations.edit_panel(c, "p1", name="B-2 "),
        "already a panel with the name 'B-2'",
    ),
    "taken new panel name": (lambda c: operations.add_panel(c, "A1", "f1"), "already a panel"),
    "panel of no formulation": (lambda c: operations.add_panel(c, "Z", "?"), "formulation"),
    "area zero": (
        lambda c: operations.edit_panel(c, "p1", area_cm2=0),
        "area of panel A1 in cm² must be greater than 0, not 0",
    ),
    "area negative": (lambda c: operations.edit_panel(c, "p1", area_cm2=-3.0), "greater than 0"),
    "area not a number": (
        lambda c: operations.edit_panel(c, "p1", area_cm2=float("nan")),
        "must be a number",
    ),
    "area a word": (lambda c: operations.edit_panel(c, "p1", area_cm2="10"), "must be a number"),
    "area yes": (lambda c: operations.edit_panel(c, "p1", area_cm2=True), "must be a number"),
    "substrate a number": (lambda c: operations.edit_panel(c, "p1", substrate=3), "must be a text"),
    "thickness": (lambda c: operations.edit_panel(c, "p1", thickness_um=-1), "film thickness"),
    "panel id": (
        lambda c: operations.add_panel(c, "Z", "f1", panel_id="x"),
        "'panel_id' cannot be changed",
    ),
    "no such field": (lambda c: operations.edit_panel(c, "p1", colour="red"), "cannot be changed"),
    "empty formulation name": (lambda c: operations.rename_formulation(c, "f1", ""), "not empty"),
    "taken formulation name": (
        lambda c: operations.rename_formulation(c, "f3", "Grey"),
        "already a formulation",
    ),
    "new formulation's name taken": (
        lambda c: operations.add_formulation(c, "Grey"),
        "already a formulation",
    ),
    "formulation with panels": (lambda c: operations.remove_formulation(c, "f1"), "has panels"),
    "empty title": (lambda c: operations.rename_campaign(c, "  "), "not empty"),
    "exposure before the start": (
        lambda c: operations.edit_reading(c, "r1", exposure_h=-1),
        "0 h or more",
    ),
    "no exposure time": (
        lambda c: operations.edit_reading(c, "r1", exposure_h=None),
        "must be a number",
    ),
    "reading of no panel": (
        lambda c: operations.edit_reading(c, "r1", panel_id="?"),
        "needs a panel",
    ),
    "decision by the wrong door": (
        lambda c: operations.edit_reading(c, "r1", pinned_model="x"),
        "cannot be changed",
    ),
    "spectrum": (
        lambda c: operations.edit_reading(c, "r1", spectrum=c.open_lead),
        "cannot be changed",
    ),
    "no reason": (lambda c: operations.leave_out_points(c, "r1", [1], " "), "with a reason"),
    "no points": (lambda c: operations.leave_out_points(c, "r1", [], "x"), "at least one point"),
    "no such point": (
        lambda c: operations.leave_out_points(c, "r1", [6], "x"),
        "does not have all of these points",
    ),
    "negative point": (lambda c: operations.take_back_points(c, "r1", [-1]), "does not have"),
    "no readings": (lambda c: operations.pin_model(c, [], "x"), "at least one reading"),
    "mains": (lambda c: operations.edit_settings(c, mains_hz=0), "greater than 0"),
    "no temperature": (lambda c: operations.edit_settings(c, temperature_c=None), "a number"),
    "limit": (
        lambda c: operations.edit_settings(c, criteria=(replace(LIMIT, ohm_cm2=0.0),)),
        "limit of criterion new",
    ),
    "threshold": (
        lambda c: operations.edit_settings(c, thresholds=(("x", float("inf")),)),
        "threshold x",
    ),
    "input": (lambda c: operations.edit_settings(c, input_resistance_ohm=-1.0), "greater than 0"),
    "model": (lambda c: operations.edit_settings(c, own_models=("[]",)), "JSON object"),
    "panels without one": (lambda c: operations.edit_panels(c, [], regime="x"), "at least one"),
    "panels of one name": (
        lambda c: operations.edit_panels(c, ["p1", "p2"], name="x"),
        "cannot be changed",
    ),
    **{
        f"limit: {says}": (
            lambda c, limit=limit: operations.edit_settings(c, limits=[limit]),
            says,
        )
        for limit, says in (
            (replace(WET, name=" "), "needs a name"),
            (replace(WET, quantity="shine"), "no quantity “shine”"),
            (replace(WET, unit="%"), "given in vol-%, not in %"),
            (replace(WET, frequency_hz=0.1), "to it only"),
            (replace(WET, quantity="modulus", unit="Ω cm²"), "belongs to the modulus"),
            (replace(WET, quantity="pore_resistance", unit="Ω cm²", value=0.0), "greater than 0"),
            (replace(WET, value=float("nan")), "must be a number"),
            (replace(WET, side="over"), "cannot be 'over'"),
        )
    },
    "limit twice": (lambda c: operations.edit_settings(c, limits=[WET, WET]), "already a limit"),
    **{
        f"comparison: {says}": (
            lambda c, asked=question: operations.edit_settings(c, comparisons=[asked]),
            says,
        )
        for question, says in (
            (Question(judge=Judge.RATING), "needs a scale"),
            (Question(judge=Judge.TIME_TO_LIMIT), "needs a limit"),
            (Question(method=Method.DUNNETT), "needs a reference formulation"),
            (Question(quantity="shine"), "no quantity"),
            (Question(exposure_h=-1.0), "0 or more"),
            ("which is best?", "cannot be 'which is best"),
        )
    },
    "comparison twice": (
        lambda c: operations.edit_settings(c, comparisons=[Question(), Question()]),
        "already a comparison with this question",
    ),
    "projection": (
        lambda c: operations.edit_settings(c, projections=[ProjectionWanted("modulus", 0.0, 0.1)]),
        "greater than 0",
    ),
    "electrolyte": (
        lambda c: operations.edit_settings(c, electrolytes=[replace(BRINE, known_by=((),))]),
        "words that are not empty",
    ),
    "electrolyte without resistance": (
        lambda c: operations.edit_settings(c, electrolytes=[replace(BRINE, resistivity_ohm_cm=0)]),
        "resistivity of Brine",
    ),
    "electrolyte twice": (
        lambda c: operations.edit_settings(c, electrolytes=[BRINE, BRINE]),
        "already an electrolyte",
    ),
    "regime": (
        lambda c: operations.edit_settings(
            c, regimes=[Regime("a", "A", duration_h=(200.0, 100.0))]
        ),
        "ends before it begins",
    ),
    "model twice": (
        lambda c: operations.edit_settings(c, own_models=('{"id": "a"}', '{"id": "a"}')),
        "already a coating model",
    ),
}


@pytest.mark.parametrize("case", REFUSED)
def test_an_operation_that_cannot_be(campaign: Campaign, case: str) -> None:
    make, says = REFUSED[case]
    with pytest.raises(OperationRefused, match=says) as refusal:
        make(campaign)
    assert str(refusal.value).endswith(".")


def test_what_was_prepared_on_an_older_state_is_refused(file: CampaignFile) -> None:
    stale = file.campaign
    file.apply(operations.edit_panel(stale, "p1", area_cm2=11))
    with pytest.raises(OperationRefused, match="changed meanwhile"):
        file.apply(operations.edit_panel(stale, "p1", area_cm2=12))
    # Another column of the same row is no conflict.
    file.apply(operations.edit_panel(stale, "p1", thickness_um=70))
    assert (file.campaign.panels[0].area_cm2, file.campaign.panels[0].thickness_um) == (11.0, 70.0)
    file.apply(operations.remove_panel(file.campaign, "p1"))
    before = file.campaign
    with pytest.raises(OperationRefused, match="removed meanwhile"):
        file.apply(operations.leave_out_points(stale, "r1", [3], "x"))
    with pytest.raises(OperationRefused, match="already in the campaign's refused"):
        file.apply(
            operations.import_found(replace(stale, refused=()), Found(refused=stale.refused))
        )
    assert file.campaign == before
