"""Undo, redo and the audit trail, also under random sequences with closing and opening."""

import re
import shutil
import tempfile
from pathlib import Path

import numpy as np
import pytest
from hypothesis import settings
from hypothesis import strategies as st
from hypothesis.stateful import RuleBasedStateMachine, initialize, invariant, precondition, rule
from pictures import png

from coatgui.campaign import CampaignFile, OperationRefused, check_file, operations
from coatgui.campaign import connection as database
from coatgui.campaign.snapshot import Snapshot
from coatgui.records import (
    Campaign,
    Criterion,
    Electrolyte,
    Found,
    FoundPanel,
    FoundReading,
    Limit,
    Question,
    Refusal,
    Source,
    Spectrum,
    VisualRating,
)


def test_the_trail_tells_who_did_what_when(
    file: CampaignFile, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(database.getpass, "getuser", lambda: "operator")
    database.who.cache_clear()
    file.apply(operations.edit_panel(file.campaign, "p1", area_cm2=11.0))
    file.undo()
    file.redo()
    file.undo()
    file.apply(operations.rename_campaign(file.campaign, "Later"))
    lines = file.history()
    assert [(e.action, e.of_entry, e.state) for e in lines] == [
        ("create", None, ""),
        ("edit", None, "abandoned"),
        ("undo", 2, ""),
        ("redo", 2, ""),
        ("undo", 2, ""),
        ("edit", None, "done"),
    ]
    assert [e.name for e in lines[1:5]] == ["Change area of panel A1"] * 4
    assert {e.who for e in lines[1:]} == {"operator"}
    assert all(re.fullmatch(r"\d{4}-\d\d-\d\dT\d\d:\d\d:\d\dZ", e.when_utc) for e in lines)
    (edit,), (undo,) = lines[1].changes, lines[2].changes
    assert (edit.before, edit.after) == ({"area_cm2": 10.1}, {"area_cm2": 11.0})
    assert (undo.before, undo.after) == (edit.after, edit.before)
    path = file.path
    file.close()
    with CampaignFile.open(path) as again:
        assert again.history() == lines
        assert (again.undo_name, again.redo_name) == ("Rename the campaign to Later", None)


def test_a_person_without_an_account_name(
    file: CampaignFile, monkeypatch: pytest.MonkeyPatch
) -> None:
    def nobody() -> str:
        raise OSError("no account")

    monkeypatch.setattr(database.getpass, "getuser", nobody)
    database.who.cache_clear()
    file.apply(operations.rename_campaign(file.campaign, "Later"))
    assert file.history()[-1].who == "unknown"


def test_undone_edits_stay_redoable_after_closing(file: CampaignFile, campaign: Campaign) -> None:
    states = [campaign]
    for title in ("one", "two", "three"):
        file.apply(operations.rename_campaign(file.campaign, title))
        states.append(file.campaign)
    file.undo()
    file.undo()
    assert file.history()[-3].state == "undone"
    path = file.path
    file.close()
    with CampaignFile.open(path) as again:
        assert again.campaign == states[1]
        assert again.redo_name == "Rename the campaign to two"
        again.redo()
        again.redo()
        assert again.campaign == states[3]
        assert again.redo() is None
        for state in reversed(states[:3]):
            again.undo()
            assert again.campaign == state
        assert again.undo() is None


def test_a_removed_record_returns_to_its_place(file: CampaignFile, campaign: Campaign) -> None:
    for remove, identity in (
        (operations.remove_reading, "r2"),
        (operations.remove_panel, "p1"),
        (operations.remove_formulation, "f3"),
    ):
        file.apply(remove(file.campaign, identity))
        file.apply(operations.add_formulation(file.campaign, "in between"))
        file.undo()
        file.undo()
        assert file.campaign == campaign


WORDS = st.text(st.characters(codec="utf-8"), max_size=6)
NUMBERS = st.floats(allow_nan=False, allow_infinity=False)
POSITIVE = st.floats(min_value=5e-324, allow_infinity=False)


class Editing(RuleBasedStateMachine):
    """Every operation in any order, against a model: the snapshots on two piles.

    After each step the campaign in memory must be what a fresh reading of the file gives; undo and
    redo must give the very snapshots of before.
    """

    def __init__(self) -> None:
        super().__init__()
        self.folder = Path(tempfile.mkdtemp())
        self.imported = 0
        self.abandoned = 0
        self.done: list[Campaign] = []
        self.undone: list[Campaign] = []

    @initialize()
    def start(self) -> None:
        self.file = CampaignFile.create(self.folder / "a.coatgui", Campaign("c", "t"), {})
        self.present = self.file.campaign
        self.bring(["A1", "A2"], ["A1", "A1", "B1"])

    def teardown(self) -> None:
        self.file.close()
        assert check_file(self.file.path) == () or self.imported  # raw bytes are not given here
        shutil.rmtree(self.folder)

    def apply(self, make: object, *arguments: object, **fields: object) -> None:
        try:
            operation = make(self.present, *arguments, **fields)  # type: ignore[operator]
        except OperationRefused:
            return
        change = self.file.apply(operation)
        assert change.kinds == {c.table for c in operation.changes}
        if operation.changes:
            self.done.append(self.present)
            self.abandoned += len(self.undone)
            self.undone.clear()
            self.present = self.file.campaign

    @rule(listed=st.lists(WORDS, max_size=2), panels=st.lists(WORDS, max_size=3))
    def bring(self, listed: list[str], panels: list[str]) -> None:
        readings = []
        for name in panels:
            self.imported += 1
            random = np.random.default_rng(self.imported // 2)
            numbers = random.normal(size=(3, 4)) * 10.0 ** random.integers(-9, 9)
            spectrum = Spectrum(abs(numbers[0]) + 1e-3, numbers[1] + 1j * numbers[2])
            source = Source(f"{name}.csv", f"{self.imported:064x}")
            readings.append(FoundReading(spectrum, source, name, float(self.imported)))
        found = Found(
            tuple(FoundPanel(name, name[:2], area_cm2=1.5) for name in listed),
            tuple(readings),
            (readings[0].spectrum, readings[0].source) if readings else None,
            tuple(Refusal(name, "no") for name in listed),
        )
        self.apply(operations.import_found, found)

    @rule(data=st.data(), name=WORDS, remark=WORDS)
    def formulations(self, data: st.DataObject, name: str, remark: str) -> None:
        act = data.draw(st.sampled_from(["add", "rename", "remark", "remove"]))
        if act == "add":
            return self.apply(operations.add_formulation, name, remark)
        if not self.present.formulations:
            return None
        chosen = data.draw(st.sampled_from(self.present.formulations)).formulation_id
        if act == "rename":
            return self.apply(operations.rename_formulation, chosen, name)
        if act == "remark":
            return self.apply(operations.edit_formulation_remark, chosen, remark)
        return self.apply(operations.remove_formulation, chosen)

    @precondition(lambda self: self.present.panels)
    @rule(data=st.data(), name=WORDS, area=st.none() | NUMBERS, temperature=st.none() | NUMBERS)
    def panels(
        self, data: st.DataObject, name: str, area: float | None, temperature: float | None
    ) -> None:
        chosen = data.draw(st.sampled_from(self.present.panels)).panel_id
        formulation = data.draw(st.sampled_from(self.present.formulations)).formulation_id
        act = data.draw(st.sampled_from(["add", "edit", "notes", "move", "remove"]))
        if act == "add":
            self.apply(operations.add_panel, name, formulation, area_cm2=area)
        elif act == "edit":
            self.apply(
                operations.edit_panel,
                chosen,
                name=name,
                area_cm2=area,
                temperature_c=temperature,
                regime=name,
            )
        elif act == "notes":
            self.apply(operations.edit_panel, chosen, notes=[[name, "x"]], remark=name)
        elif act == "move":
            self.apply(operations.move_panel, chosen, formulation)
        else:
            self.apply(operations.remove_panel, chosen)

    @precondition(lambda self: self.present.readings)
    @rule(
        data=st.data(),
        points=st.lists(st.integers(-1, 4), max_size=3),
        words=WORDS,
        hours=NUMBERS,
        potential=st.none() | NUMBERS,
    )
    def readings(
        self,
        data: st.DataObject,
        points: list[int],
        words: str,
        hours: float,
        potential: float | None,
    ) -> None:
        chosen = data.draw(st.sampled_from(self.present.readings)).reading_id
        acts = ["edit", "remove", "leave out", "take back", "pin", "overrule"]
        act = data.draw(st.sampled_from(acts))
        if act == "edit":
            panel = data.draw(st.sampled_from(self.present.panels)).panel_id
            self.apply(
                operations.edit_reading,
                chosen,
                exposure_h=hours,
                potential_mv=potential,
                panel_id=panel,
                remark=words,
            )
        elif act == "remove":
            self.apply(operations.remove_reading, chosen)
        elif act == "leave out":
            self.apply(operations.leave_out_points, chosen, points, words)
        elif act == "take back":
            self.apply(operations.take_back_points, chosen, points)
        elif act == "pin":
            every = [r.reading_id for r in self.present.readings]
            self.apply(operations.pin_model, every, words)
        else:
            self.apply(operations.overrule, chosen, words)

    @rule(data=st.data(), words=WORDS, number=NUMBERS, positive=POSITIVE)
    def whole(self, data: st.DataObject, words: str, number: float, positive: float) -> None:
        act = data.draw(st.sampled_from(["title", "remark", "settings", "lead", "dismiss"]))
        if act == "title":
            self.apply(operations.rename_campaign, words)
        elif act == "remark":
            self.apply(operations.edit_campaign_remark, words)
        elif act == "settings":
            self.apply(
                operations.edit_settings,
                temperature_c=number,
                criteria=(Criterion(words, positive, positive, words),),
                thresholds=((words, number),),
                modulus_frequencies_hz=(positive,),
                limits=(Limit(words, "pore_resistance", positive, "Ω cm²", words),),
                comparisons=(Question(exposure_h=positive, reference=words),),
                electrolytes=(Electrolyte(words, words, positive),),
            )
        elif act == "lead":
            self.apply(operations.set_open_lead, None, None)
        else:
            self.apply(operations.dismiss_refusals, self.present.refused[:1])

    @precondition(lambda self: self.present.panels)
    @rule(data=st.data(), words=WORDS, hours=NUMBERS, picture=st.integers(1, 3))
    def seen(self, data: st.DataObject, words: str, hours: float, picture: int) -> None:
        panel = data.draw(st.sampled_from(self.present.panels)).panel_id
        act = data.draw(st.sampled_from(["rate", "edit", "forget", "photograph", "take", "name"]))
        ratings, photographs = self.present.ratings, self.present.photographs
        if act == "rate":
            self.apply(operations.add_ratings, [VisualRating(panel, hours, "astm_d610", words)])
        elif act == "edit" and ratings:
            self.apply(operations.edit_rating, ratings[0].rating_id, value=words, panel_id=panel)
        elif act == "forget" and ratings:
            self.apply(operations.remove_ratings, [ratings[-1].rating_id])
        elif act == "photograph":
            self.apply(operations.add_photograph, panel, png(picture), file=words, caption=words)
        elif act == "take" and photographs:
            self.apply(operations.remove_photograph, photographs[0].photograph_id)
        else:
            self.apply(operations.identify, customer=words, standards=[words])

    @rule()
    def undo(self) -> None:
        change = self.file.undo()
        assert (change is None) == (not self.done)
        if self.done:
            self.undone.append(self.present)
            self.present = self.done.pop()

    @rule()
    def redo(self) -> None:
        change = self.file.redo()
        assert (change is None) == (not self.undone)
        if self.undone:
            self.done.append(self.present)
            self.present = self.undone.pop()

    @rule()
    def close_and_open(self) -> None:
        self.file.close()
        self.file = CampaignFile.open(self.file.path)

    @invariant()
    def memory_and_file_agree(self) -> None:
        assert self.file.campaign == self.present
        assert Snapshot(self.file._connection).campaign == self.present

    @invariant()
    def the_trail_agrees(self) -> None:
        states = [entry.state for entry in self.file.history()]
        assert states.count("done") == len(self.done)
        assert states.count("undone") == len(self.undone)
        assert states.count("abandoned") == self.abandoned
        assert (self.file.undo_name is None) == (not self.done)
        assert (self.file.redo_name is None) == (not self.undone)


TestEditing = Editing.TestCase
TestEditing.settings = settings(max_examples=25, stateful_step_count=30, deadline=None)
