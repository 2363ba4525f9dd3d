"""The set-up command: what it needs, what it says, and that README gives it."""

from __future__ import annotations

import re
from pathlib import Path

import pytest

from coatgui import first_steps

ROOT = Path(__file__).resolve().parent.parent


def test_readme_gives_the_two_commands_first() -> None:
    blocks = re.findall(r"```\w*\n(.*?)```", (ROOT / "README.md").read_text(encoding="utf-8"), re.S)
    assert blocks[0].strip() == "python3 -m coatgui.first_steps sample"
    assert blocks[1].strip() == "python3 -m coatgui.first_steps tests"


def test_ci_runs_the_test_command_as_readme_gives_it() -> None:
    script = (ROOT / ".ci" / "run").read_text(encoding="utf-8")
    assert "README.md" in script
    assert "first_steps" not in script


def test_a_wrong_call_is_answered_in_one_sentence(capsys: pytest.CaptureFixture[str]) -> None:
    assert first_steps.main([]) == 2
    assert first_steps.main(["everything"]) == 2
    assert "sample" in capsys.readouterr().out


def test_lacking_packages_are_named_where_they_cannot_be_installed(
    monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    monkeypatch.setattr(first_steps, "lacking", lambda packages: ["libegl1"])
    monkeypatch.setattr(first_steps, "is_debian_root", lambda: False)
    first_steps.install_packages(("libegl1",))
    assert "apt-get install libegl1" in capsys.readouterr().out


def test_every_check_is_run() -> None:
    names = " ".join(name for name, _, _ in first_steps.checks())
    for wanted in ("ruff check", "ruff format", "mypy", "tests"):
        assert wanted in names


def test_without_a_display_the_sample_is_assessed(
    monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str], tmp_path: Path
) -> None:
    calls: list[list[str]] = []

    def run(command: list[object], extra: object = None) -> int:
        calls.append([str(word) for word in command])
        return 1 if "assess" in calls[-1] else 0

    monkeypatch.setattr(first_steps, "OUTPUT", ROOT / "assessment")
    monkeypatch.setattr(first_steps, "run", run)
    monkeypatch.setattr(first_steps, "quiet", lambda command, extra=None: True)
    monkeypatch.setattr(first_steps, "install_packages", lambda packages: None)
    monkeypatch.setattr(first_steps, "has_display", lambda: False)
    assert first_steps.main(["sample"]) == 0
    assert any("assess" in call and "--workbook" in call for call in calls)
    shown = capsys.readouterr().out
    assert "no display" in shown
    assert "workbook: assessment/sample_panels.xlsx" in shown
    assert "summary: assessment/sample_panels.pdf" in shown
    # Where Qt cannot paint, the summary is HTML and that is said.
    monkeypatch.setattr(first_steps, "quiet", lambda command, extra=None: not extra)
    assert first_steps.main(["sample"]) == 0
    assert calls[-1][-2:] == ["--summary", str(ROOT / "assessment" / "sample_panels.html")]
    assert "the summary is HTML" in capsys.readouterr().out
