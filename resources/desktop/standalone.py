"""Build the program as a folder that needs no Python, on the system this runs on.

    python resources/desktop/standalone.py

The extra `standalone` must be installed (`pip install -e '.[standalone]'`). The result stands in
`dist/coatgui` (`dist/coatgui.app` on macOS) and is tried before this ends: the sample campaign is
assessed by it, in a folder of its own.
"""

from __future__ import annotations

import os
import shutil
import subprocess
import sys
import tempfile
from pathlib import Path

import coatgui
from coatgui.shipped import resource, sample_panels

TOP = Path(__file__).resolve().parents[2]
ICON = {"win32": "ico", "darwin": "icns"}.get(sys.platform, "png")
ASSOCIATE = """@echo off
rem Opens *.coatgui with this program, for this user. To take it back:
rem   reg delete HKCU\\Software\\Classes\\.coatgui /f
rem   reg delete HKCU\\Software\\Classes\\coatgui.campaign /f
reg add HKCU\\Software\\Classes\\.coatgui /ve /d coatgui.campaign /f
reg add HKCU\\Software\\Classes\\coatgui.campaign /ve /d "Campaign of coated panels" /f
reg add HKCU\\Software\\Classes\\coatgui.campaign\\DefaultIcon /ve /d "%~dp0coatgui.exe,0" /f
reg add HKCU\\Software\\Classes\\coatgui.campaign\\shell\\open\\command /ve ^
  /d "\\"%~dp0coatgui.exe\\" \\"%%1\\"" /f
"""


def paint_icon(to: Path) -> None:
    """The icon as this system wants it, painted from the drawing."""
    os.environ.setdefault("QT_QPA_PLATFORM", "offscreen")
    from PySide6.QtGui import QGuiApplication, QIcon

    application = QGuiApplication.instance() or QGuiApplication([])
    picture = QIcon(str(resource("icons", "coatgui.svg"))).pixmap(256, 256)
    if not picture.save(str(to)):
        raise SystemExit(
            f"The icon cannot be written as {to.suffix}: Qt's plug-in for it is missing."
        )
    del application


def beside(folder: Path) -> None:
    """What ties the program to its files on this system."""
    if sys.platform == "win32":
        (folder / "associate.cmd").write_text(ASSOCIATE, encoding="ascii", newline="\r\n")
    elif sys.platform != "darwin":
        for name, *where in (
            ("desktop/coatgui.desktop", "applications"),
            ("desktop/coatgui.xml", "mime", "packages"),
            ("icons/coatgui.svg", "icons", "hicolor", "scalable", "apps"),
        ):
            target = folder.joinpath("share", *where)
            target.mkdir(parents=True, exist_ok=True)
            shutil.copy(resource(*name.split("/")), target)


def tried(program: Path) -> None:
    """The built program does the main job; SystemExit where it does not."""
    with tempfile.TemporaryDirectory() as folder:
        book = Path(folder) / "sample.xlsx"
        done = subprocess.run(
            [str(program), "assess", str(sample_panels()), "--workbook", str(book), "--quiet"],
            cwd=folder,
            check=False,
        )
        # 1: all was done, and the sample's three unusable files were refused by name.
        if done.returncode != 1 or not book.is_file():
            raise SystemExit(f"The built program failed on the sample (status {done.returncode}).")


def main() -> None:
    build = TOP / "build"
    build.mkdir(exist_ok=True)
    icon = build / f"coatgui.{ICON}"
    paint_icon(icon)
    subprocess.run(
        [
            sys.executable, "-m", "PyInstaller", "--noconfirm", "--clean", "--log-level", "WARN",
            "--distpath", str(TOP / "dist"), "--workpath", str(build),
            str(TOP / "resources" / "desktop" / "coatgui.spec"),
        ],
        check=True,
        env={**os.environ, "COATGUI_ICON": str(icon), "COATGUI_VERSION": coatgui.__version__},
    )  # fmt: skip
    folder = TOP / "dist" / "coatgui"
    beside(folder)
    tried(folder / ("coatgui.exe" if sys.platform == "win32" else "coatgui"))
    size = sum(path.stat().st_size for path in folder.rglob("*") if path.is_file())
    print(f"Built and tried: {folder}, {size / 1e6:.0f} MB")


if __name__ == "__main__":
    main()
