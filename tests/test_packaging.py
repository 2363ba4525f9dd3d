"""The wheel carries all that the program needs, and works from any folder."""

from __future__ import annotations

import json
import os
import shutil
import subprocess
import sys
import sysconfig
import zipfile
from pathlib import Path
from xml.etree import ElementTree

import pytest

from coatgui.campaign.schema import APPLICATION_ID

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


def _clean_environment(folder: Path) -> Path:
    """The Python of an environment in which coatgui is not installed, but what it rests on is: the
    libraries of the environment the tests run in are seen by it, nothing is fetched."""
    subprocess.run(
        [sys.executable, "-m", "venv", str(folder)], check=True, capture_output=True, cwd=ROOT
    )
    python = folder / ("Scripts/python.exe" if os.name == "nt" else "bin/python")
    asked = "import sysconfig; print(sysconfig.get_path('purelib'))"
    shown = subprocess.run([str(python), "-c", asked], capture_output=True, text=True, check=True)
    # A path written there is searched, but its own *.pth files (a checkout's, say) are not read.
    libraries = "\n".join({sysconfig.get_path("purelib"), sysconfig.get_path("platlib")})
    Path(shown.stdout.strip(), "libraries.pth").write_text(libraries, encoding="utf-8")
    return python


@pytest.mark.parametrize("kind", ["wheel", "sdist"])
def test_what_is_built_can_be_installed_and_does_the_job(tmp_path: Path, kind: str) -> None:
    subprocess.run(
        [sys.executable, "-m", "hatchling", "build", "-t", kind, "-d", str(tmp_path)],
        cwd=ROOT, check=True, capture_output=True,
    )  # fmt: skip
    (made,) = [path for path in tmp_path.iterdir() if path.is_file()]
    python = _clean_environment(tmp_path / "environment")
    without = {k: v for k, v in os.environ.items() if k not in ("PYTHONPATH", "PYTHONHOME")}
    install = [str(python), "-m", "pip", "install", "--quiet", "--no-index", "--no-deps",
               "--no-build-isolation", "--force-reinstall", str(made)]  # fmt: skip
    subprocess.run(install, cwd=tmp_path, env=without, check=True, capture_output=True)
    where = "import coatgui, pathlib; print(pathlib.Path(coatgui.__file__).resolve())"
    shown = subprocess.run(
        [str(python), "-c", where],
        cwd=tmp_path, env=without, capture_output=True, text=True, check=True,
    )  # fmt: skip
    assert Path(shown.stdout.strip()).is_relative_to((tmp_path / "environment").resolve())
    folder = tmp_path / "campaign"
    folder.mkdir()
    for name in ("panels.csv", "P1_1h.dat", "P1_24h.dat"):
        shutil.copy(ROOT / "sample_panels" / name, folder)
    command = python.with_name("coatgui.exe" if os.name == "nt" else "coatgui")
    done = subprocess.run(
        [str(command), "assess", str(folder), "--json", "out.json", "--quiet"],
        cwd=tmp_path, env=without, capture_output=True, text=True,
    )  # fmt: skip
    assert done.returncode == 0, done.stderr
    assert len(json.loads((tmp_path / "out.json").read_text(encoding="utf-8"))["readings"]) == 2


def test_a_desktop_finds_the_program_and_its_files(wheel: Path) -> None:
    with zipfile.ZipFile(wheel) as archive:
        named = {name.split(".data/data/")[-1]: name for name in archive.namelist()}
        entry = archive.read(named["share/applications/coatgui.desktop"]).decode()
        kind = ElementTree.fromstring(archive.read(named["share/mime/packages/coatgui.xml"]))
        ElementTree.fromstring(archive.read(named["share/icons/hicolor/scalable/apps/coatgui.svg"]))
    space = "{http://www.freedesktop.org/standards/shared-mime-info}"
    mime = kind.find(f"{space}mime-type")
    assert mime is not None
    assert f"MimeType={mime.get('type')};" in entry
    glob = mime.find(f"{space}glob")
    assert glob is not None
    assert glob.get("pattern") == "*.coatgui"
    # The bytes that SQLite keeps the file's kind in.
    match = mime.find(f"{space}magic/{space}match/{space}match")
    assert match is not None
    value = (match.get("value") or "").encode()
    assert (int(match.get("offset") or 0), value) == (68, APPLICATION_ID.to_bytes(4, "big"))
