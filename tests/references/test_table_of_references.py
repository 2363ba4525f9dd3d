"""Every outside source is described in a file of its own, its checks exist, and the developers'
table lists them all. `python tests/references/test_table_of_references.py` prints that table."""

from __future__ import annotations

import tomllib
from pathlib import Path
from typing import Any

import pytest

HERE = Path(__file__).resolve().parent
ROOT = HERE.parent.parent
KINDS = {"outside": "made elsewhere", "memory": "from memory", "own": "made here, apart"}


def references() -> dict[str, dict[str, Any]]:
    files = sorted(HERE.glob("*.toml"))
    return {path.stem: tomllib.loads(path.read_text(encoding="utf-8")) for path in files}


def table() -> str:
    lines = ["| source | edition | kind | checks |", "| --- | --- | --- | --- |"]
    for name, entry in references().items():
        checks = ", ".join(f"`{check.removeprefix('tests/')}`" for check in entry["checks"])
        what = f"{entry['what']} (`{name}.toml`): {entry['source']}"
        lines.append(f"| {what} | {entry['edition']} | {KINDS[entry['kind']]} | {checks} |")
    return "\n".join(lines)


@pytest.mark.parametrize("name", references())
def test_a_source_says_all_it_should(name: str) -> None:
    entry = references()[name]
    assert set(entry) == {"what", "source", "edition", "obtained", "kind", "checks"}
    assert all(entry[field] for field in entry)
    assert entry["kind"] in KINDS
    if entry["kind"] == "memory":
        assert "memory" in entry["edition"] + entry["obtained"] + entry["source"]
    for check in entry["checks"]:
        assert "def test_" in (ROOT / check).read_text(encoding="utf-8")


def test_no_kept_data_is_without_its_source() -> None:
    folders = {path.name for path in HERE.iterdir() if path.is_dir() and path.name[0] not in "._"}
    # The three sources of water's permittivity share a folder.
    assert folders <= {*references(), "water_permittivity"}
    for folder in folders:
        assert list((HERE / folder).glob("SOURCE*"))


def test_the_developers_table_lists_them_all() -> None:
    text = (ROOT / "DEVELOPERS.md").read_text(encoding="utf-8")
    assert table() in text, "put the table that this file prints into DEVELOPERS.md"


if __name__ == "__main__":
    print(table())  # noqa: T201
