"""The wheel carries all that the program needs, and works from any folder."""

from __future__ import annotations

import subprocess
import sys
import zipfile
from pathlib import Path

import pytest

ROOT = Path(__file__).resolve().parent.parent


@pytest.fixture(scope="module")
def wheel(tmp_path_factory: pytest.TempPathFactory) -> Path:
    folder = tmp_path_factory.mktemp("wheel")
    command = [sys.executable, "-m", "hatchling", "build", "-t", "wheel", "-d", str(folder)]
    subprocess.run(command, cwd=ROOT, check=True, capture_output=True)
    (made,) = folder.glob("*.whl")
    return made


def test_resources_and_samples_travel_inside(wheel: Path) -> None:
    with zipfile.ZipFile(wheel) as archive:
        names = set(archive.namelist())
    for file in ("resources", "sample_panels"):
        for path in (ROOT / file).rglob("*"):
            if path.is_file() and "__pycache__" not in path.parts:
                assert f"coatgui/{path.relative_to(ROOT).as_posix()}" in names
    assert not any(name.startswith(("tests/", "resources/", "sample_panels/")) for name in names)


def test_an_installed_program_works_from_any_folder(wheel: Path, tmp_path: Path) -> None:
    with zipfile.ZipFile(wheel) as archive:
        archive.extractall(tmp_path / "installed")
    code = (
        "from coatgui.shipped import resource, sample_panels; from coatgui.circuits import "
        "catalogue; print(len(catalogue()), (sample_panels() / 'panels.csv').is_file(), "
        "resource('licence.txt').is_file(), sample_panels())"
    )
    elsewhere = tmp_path / "elsewhere"
    elsewhere.mkdir()
    path = f"import sys; sys.path.insert(0, {str(tmp_path / 'installed')!r})\n"
    shown = subprocess.run(
        [sys.executable, "-P", "-c", path + code],
        cwd=elsewhere,
        capture_output=True,
        text=True,
        check=True,
    ).stdout
    assert "True True" in shown
    assert "installed" in shown
