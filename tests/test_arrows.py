"""Imports point one way, Qt stays in its room, files stay small."""

from __future__ import annotations

import ast
import subprocess
import sys
from pathlib import Path

import pytest

PACKAGE = Path(__file__).resolve().parent.parent / "coatgui"
ANYONE = {"records", "progress", "shipped", "notes", ""}
UPSTREAM = {
    "records": set(),
    "progress": set(),
    "shipped": set(),
    "notes": {"shipped"},
    "first_steps": set(),
    "circuits": set(),
    "intake": set(),
    "campaign": set(),
    "quality": {"circuits"},
    "fitting": {"circuits"},
    "assessment": {"fitting", "quality", "campaign", "circuits"},
    "output": {"assessment", "campaign"},
    "jobs": {"campaign", "circuits", "intake", "quality", "fitting", "assessment", "output"},
}
EVERYTHING = {*UPSTREAM, "window", "cli"}
UPSTREAM["cli"] = EVERYTHING
UPSTREAM["window"] = EVERYTHING
UPSTREAM["__main__"] = {"cli"}
QT = ("PySide6", "shiboken6", "pyqtgraph")
# These paint pages, and import Qt only when they do.
PAGES = {PACKAGE / "output" / name for name in ("pages.py", "book.py")}


def room_of(path: Path, package: Path = PACKAGE) -> str:
    first = path.relative_to(package).parts[0]
    return first.removesuffix(".py")


def imports(source: str) -> set[str]:
    found: set[str] = set()
    for node in ast.walk(ast.parse(source)):
        if isinstance(node, ast.Import):
            found |= {alias.name for alias in node.names}
        elif isinstance(node, ast.ImportFrom) and node.module:
            found |= {f"{node.module}.{alias.name}" for alias in node.names}
    return found


def wrong_arrows(room: str, source: str, paints: bool = False) -> list[str]:
    """Imports that a room may not have."""
    wrong = []
    for name in imports(source):
        parts = name.split(".")
        if parts[0] in QT and room != "window" and not (paints and parts[0] == "PySide6"):
            wrong.append(name)
        if parts[0] == "coatgui" and len(parts) > 1:
            target = parts[1]
            known = target in EVERYTHING
            if known and target != room and target not in UPSTREAM[room] | ANYONE:
                wrong.append(name)
    return wrong


MODULES = sorted(p for p in PACKAGE.rglob("*.py") if p.parent != PACKAGE or p.stem != "__init__")


@pytest.mark.parametrize("path", MODULES, ids=lambda p: str(p.relative_to(PACKAGE)))
def test_arrows_point_one_way(path: Path) -> None:
    text = path.read_text(encoding="utf-8")
    assert wrong_arrows(room_of(path), text, paints=path in PAGES) == []


def test_no_output_loads_qt_before_it_is_asked_for() -> None:
    code = "import sys, coatgui.output; print([m for m in sys.modules if 'PySide6' in m])"
    shown = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert shown.stdout.strip() == "[]"


def test_a_backward_arrow_is_found() -> None:
    assert wrong_arrows("circuits", "from coatgui.window import run")
    assert wrong_arrows("intake", "import coatgui.fitting.engine")
    assert wrong_arrows("output", "from PySide6 import QtGui")
    assert not wrong_arrows("window", "from PySide6 import QtGui")


@pytest.mark.parametrize("path", MODULES, ids=lambda p: str(p.relative_to(PACKAGE)))
def test_files_can_be_read_in_one_go(path: Path) -> None:
    assert len(path.read_text(encoding="utf-8").splitlines()) <= 500


def test_the_command_line_starts_light() -> None:
    heavy = ("scipy", "openpyxl", "PySide6", "pyqtgraph")
    code = f"import sys, coatgui.cli; print([m for m in {heavy!r} if m in sys.modules])"
    shown = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert shown.stdout.strip() == "[]"
