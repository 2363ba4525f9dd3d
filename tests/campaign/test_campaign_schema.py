import sqlite3
from collections.abc import Iterator
from contextlib import closing
from dataclasses import replace
from pathlib import Path
from typing import Any

import pytest

from coatgui.campaign import CampaignFile, CampaignFileError, check_file, operations, schema
from coatgui.records import Campaign, Identification

OLD_VERSIONS = Path(__file__).parent / "old_versions"


def dump(path: Path) -> str:
    """A campaign file as SQL text, which makes the same file again: for `old_versions/`."""
    with closing(sqlite3.connect(path)) as connection:
        lines = [
            f"PRAGMA {name} = {connection.execute(f'PRAGMA {name}').fetchone()[0]};"
            for name in ("application_id", "user_version")
        ]
        return "\n".join([*lines, *connection.iterdump(), ""])


def restore(text: str, path: Path) -> None:
    with closing(sqlite3.connect(path)) as connection:
        connection.executescript(text)


def add_a_column(connection: sqlite3.Connection) -> None:
    connection.execute("ALTER TABLE panels ADD COLUMN primer TEXT NOT NULL DEFAULT 'none'")


def break_down(connection: sqlite3.Connection) -> None:
    connection.execute("DROP TABLE readings")
    raise sqlite3.OperationalError("the power went")


@pytest.fixture
def later(monkeypatch: pytest.MonkeyPatch) -> Iterator[pytest.MonkeyPatch]:
    """Pretend that the program has gone on to a next version."""
    monkeypatch.setattr(schema, "MIGRATIONS", (*schema.MIGRATIONS, add_a_column))
    schema.columns.cache_clear()
    schema.columns_in_order.cache_clear()
    yield monkeypatch
    schema.columns.cache_clear()
    schema.columns_in_order.cache_clear()


def test_a_file_of_an_older_version_is_brought_up_to_date(
    file: CampaignFile, campaign: Campaign, later: pytest.MonkeyPatch
) -> None:
    file.apply(operations.remove_panel(file.campaign, "p1"))
    file.close()
    assert check_file(file.path) == ()  # sound as the older file it is
    with CampaignFile.open(file.path) as again:
        # A row from before the migration comes back, with the new column's default.
        again.undo()
        assert again.campaign == campaign
    with closing(sqlite3.connect(file.path)) as shell:
        assert shell.execute("PRAGMA user_version").fetchone() == (len(schema.MIGRATIONS),)
        assert shell.execute("SELECT DISTINCT primer FROM panels").fetchall() == [("none",)]
    assert check_file(file.path) == ()
    later.undo()
    with pytest.raises(CampaignFileError, match="newer coatgui"):
        CampaignFile.open(file.path)


def test_a_migration_that_fails_changes_nothing(
    file: CampaignFile, campaign: Campaign, monkeypatch: pytest.MonkeyPatch
) -> None:
    file.close()
    with monkeypatch.context() as later:
        later.setattr(schema, "MIGRATIONS", (*schema.MIGRATIONS, break_down))
        with pytest.raises(CampaignFileError, match="the power went"):
            CampaignFile.open(file.path)
    with CampaignFile.open(file.path) as again:
        assert again.campaign == campaign


def test_a_dump_makes_the_same_campaign_again(file: CampaignFile, tmp_path: Path) -> None:
    file.apply(operations.edit_panel(file.campaign, "p1", area_cm2=12.0))
    copy = tmp_path / "copy.coatgui"
    restore(dump(file.path), copy)
    with CampaignFile.open(copy) as again:
        assert again.campaign == file.campaign
        assert again.history() == file.history()


# What a version did not know yet, with what it becomes when an older file is opened.
_NOTHING_ASKED: dict[str, Any] = {
    **dict.fromkeys(("limits", "comparisons", "projections", "electrolytes", "regimes"), ()),
    "uptake_from_high_frequency": False,
}
ADDED_TO_SETTINGS: dict[str, dict[str, Any]] = {
    "version_1": {
        "input_resistance_ohm": None,
        "input_capacitance_f": None,
        "take_leads_away": False,
        "own_models": (),
        **_NOTHING_ASKED,
    },
    "version_2": _NOTHING_ASKED,
}


NOTHING_SEEN: dict[str, Any] = {
    "ratings": (),
    "photographs": (),
    "identification": Identification(),
}
BEFORE_RATINGS = ("version_1", "version_2")


@pytest.mark.parametrize("sample", sorted(OLD_VERSIONS.glob("*.sql")), ids=lambda path: path.stem)
def test_a_file_of_each_version_opens(sample: Path, campaign: Campaign, tmp_path: Path) -> None:
    """Each sample is a small campaign as that version wrote it; it must stay readable for good."""
    path = tmp_path / "old.coatgui"
    restore(sample.read_text(encoding="utf-8"), path)
    assert check_file(path) == ()
    with CampaignFile.open(path) as file:
        assert file.undo_name == "Change area of panel A1"
        assert file.campaign.panels[0].area_cm2 == 12.0
        file.undo()
        settings = replace(campaign.settings, **ADDED_TO_SETTINGS.get(sample.stem, {}))
        seen = NOTHING_SEEN if sample.stem in BEFORE_RATINGS else {}
        if sample.stem in BEFORE_RATINGS:
            first, *others = campaign.readings
            without = replace(first, temperature_span_c=None, potential_span_mv=None)
            seen = {**seen, "readings": (without, *others)}
        assert file.campaign == replace(campaign, settings=settings, **seen)
    assert check_file(path) == ()


def test_there_is_a_sample_of_every_version() -> None:
    assert {p.stem for p in OLD_VERSIONS.glob("*.sql")} == {
        f"version_{number}" for number in range(1, len(schema.MIGRATIONS) + 1)
    }


def test_what_a_person_reads_in_the_tables_is_in_the_trades_words() -> None:
    with closing(sqlite3.connect(":memory:", isolation_level=None)) as model:
        schema.migrate(model)
        tables = {row[0] for row in model.execute("SELECT name FROM sqlite_schema WHERE sql <> ''")}
    assert set(schema.KEYS) <= tables
    assert {"spectra", "raw_files", "history", "cached_results"} <= tables
    assert "exposure_h" in schema.columns("readings")
    assert "area_cm2" in schema.columns("panels")
