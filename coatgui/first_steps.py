"""Everything a fresh machine needs, in one command; runs on the system's own Python.

    python3 -m coatgui.first_steps sample    install, then the main job on the sample campaign
    python3 -m coatgui.first_steps tests     install, then every check

Only the standard library is used, for nothing else is there yet. Where this runs as root on Debian
the system packages that are lacking are installed; elsewhere they are named, and it goes on as far
as it can.
"""

from __future__ import annotations

import os
import shutil
import subprocess
import sys
from collections.abc import Mapping, Sequence
from pathlib import Path

ROOT = Path(__file__).resolve().parent.parent
ENVIRONMENT = ROOT / ".venv"
OUTPUT = ROOT / "assessment"

# Qt's own libraries, drawing off the screen (tests, pictures) and in a real window.
OFF_SCREEN = ("libglib2.0-0", "libgl1", "libegl1", "libdbus-1-3", "libfontconfig1", "libxkbcommon0")
WINDOW = (
    "libxcb-cursor0",
    "libxcb-icccm4",
    "libxcb-keysyms1",
    "libxcb-shape0",
    "libxcb-xkb1",
    "libxkbcommon-x11-0",
)
# Newer Debian releases renamed packages; the first name that is known is taken.
RENAMED = {"libglib2.0-0": ("libglib2.0-0t64", "libglib2.0-0")}

_TRY_QT = "from PySide6.QtGui import QGuiApplication; QGuiApplication([])"


def say(text: str) -> None:
    print(f"coatgui: {text}", flush=True)


def run(command: Sequence[str | Path], extra: Mapping[str, str] | None = None) -> int:
    """Run a command from the checkout's root, showing what it prints."""
    words = [str(word) for word in command]
    return subprocess.call(words, cwd=ROOT, env={**os.environ, **(extra or {})})


def quiet(command: Sequence[str | Path], extra: Mapping[str, str] | None = None) -> bool:
    """Whether a command succeeds; what it prints is not shown."""
    try:
        done = subprocess.run(
            [str(word) for word in command],
            cwd=ROOT,
            env={**os.environ, **(extra or {})},
            stdin=subprocess.DEVNULL,
            capture_output=True,
            check=False,
        )
    except OSError:
        return False
    return done.returncode == 0


def is_debian_root() -> bool:
    return (
        hasattr(os, "geteuid")
        and os.geteuid() == 0
        and shutil.which("apt-get") is not None
        and shutil.which("dpkg") is not None
    )


def lacking(packages: Sequence[str]) -> list[str]:
    """Of some Debian packages, those that are not installed. Empty where there is no dpkg."""
    if shutil.which("dpkg") is None:
        return []
    return [
        name
        for name in packages
        if not any(quiet(["dpkg", "-s", n]) for n in RENAMED.get(name, (name,)))
    ]


def install_packages(packages: Sequence[str]) -> None:
    """Install Debian packages that are lacking, or name them."""
    missing = lacking(packages)
    if not missing:
        return
    if not is_debian_root():
        say(f"these system packages are lacking: {' '.join(missing)}")
        say(f"as root: apt-get install {' '.join(missing)}")
        return
    say(f"installing system packages: {' '.join(missing)}")
    settings = {"DEBIAN_FRONTEND": "noninteractive"}
    quiet(["apt-get", "update"], settings)
    names = [
        next((n for n in RENAMED.get(p, (p,)) if quiet(["apt-cache", "show", n])), p)
        for p in missing
    ]
    command = ["apt-get", "install", "-y", "-qq", "--no-install-recommends", *names]
    if not quiet(command, settings):
        say("they could not all be installed; going on without")


def python_inside() -> Path:
    folder = "Scripts" if os.name == "nt" else "bin"
    return ENVIRONMENT / folder / ("python.exe" if os.name == "nt" else "python")


def prepare(what: Sequence[str]) -> int:
    """Make the virtual environment where it lacks, and install `what` into it."""
    python = python_inside()
    if not quiet([python, "-m", "pip", "--version"]):
        say(f"making a virtual environment in {ENVIRONMENT.name}")
        make: list[str | Path] = [sys.executable, "-m", "venv", "--clear", ENVIRONMENT]
        if not quiet(make):
            install_packages(("python3-venv",))
            if run(make) != 0:
                say("Python cannot make a virtual environment: install python3-venv and try again.")
                return 2
    say("installing the program and its libraries")
    return run([python, "-m", "pip", "install", "-q", "--disable-pip-version-check", *what])


def has_display() -> bool:
    if sys.platform in ("win32", "darwin"):
        return True
    return bool(os.environ.get("DISPLAY") or os.environ.get("WAYLAND_DISPLAY"))


def sample() -> int:
    """Install, then show the sample campaign in the window, or assess it without one."""
    if sys.platform.startswith("linux"):
        install_packages((*OFF_SCREEN, *WINDOW))
    status = prepare(["."])
    if status != 0:
        return status
    python = python_inside()
    shown = quiet([python, "-c", "from coatgui.shipped import sample_panels"])
    if not shown:
        say("The program was installed but cannot be started: delete .venv and try again.")
        return 2
    if has_display() and quiet([python, "-c", _TRY_QT]):
        say("opening the window on the sample campaign")
        return run([python, "-m", "coatgui", ROOT / "sample_panels"])
    if has_display():
        say("there is a display, but Qt's system libraries are missing; assessing without a window")
    else:
        say("there is no display; assessing the sample campaign without a window")
    return assess_sample(python)


def assess_sample(python: Path) -> int:
    """Write the workbook, the data and the inspection summary of the sample campaign."""
    OUTPUT.mkdir(exist_ok=True)
    off_screen = {"QT_QPA_PLATFORM": "offscreen"} if sys.platform.startswith("linux") else {}
    pages = quiet([python, "-c", _TRY_QT], off_screen)
    written = {
        "workbook": OUTPUT / "sample_panels.xlsx",
        "json": OUTPUT / "sample_panels.json",
        "summary": OUTPUT / f"sample_panels.{'pdf' if pages else 'html'}",
    }
    command: list[str | Path] = [python, "-m", "coatgui", "assess", ROOT / "sample_panels"]
    for what, path in written.items():
        command += [f"--{what}", path]
    status = run(command)
    if status not in (0, 1):
        return status
    if status == 1:
        say("some files of the sample are refused, as named above: they were made to be.")
    say("   ".join(f"{what}: {path.relative_to(ROOT)}" for what, path in written.items()))
    if not pages:
        say("the summary is HTML: for a PDF, Qt's system libraries are missing")
    if sys.platform.startswith("linux"):
        say(f"the window needs a display and, on Debian, {' '.join((*OFF_SCREEN, *WINDOW))}")
    return 0


def checks() -> list[tuple[str, list[str], dict[str, str]]]:
    """Name, arguments to Python, and environment of every check, in order."""
    one_thread = {"OPENBLAS_NUM_THREADS": "1", "OMP_NUM_THREADS": "1", "MKL_NUM_THREADS": "1"}
    off_screen = {**one_thread, "QT_QPA_PLATFORM": "offscreen"}
    without_qt = {**one_thread, "COATGUI_WITHOUT_QT": "1"}
    result = [
        ("ruff check", ["-m", "ruff", "check", "."], {}),
        ("ruff format", ["-m", "ruff", "format", "--check", "."], {}),
        ("mypy", ["-m", "mypy"], {}),
        (
            "tests of all rooms but the window's, as if Qt were not installed",
            ["-m", "pytest", "-n", "2", "tests", "--ignore=tests/window"],
            without_qt,
        ),
    ]
    if any((ROOT / "tests" / "window").glob("test_*.py")):
        result.append(
            (
                "tests of the window and of printed pages",
                ["-m", "pytest", "-n", "2", "tests/window", "tests/output/test_summary.py"],
                off_screen,
            )
        )
    return result


def tests() -> int:
    """Install with what the tests need, then run every check; stops at the first that fails."""
    if sys.platform.startswith("linux"):
        install_packages(OFF_SCREEN)
    status = prepare(["-e", ".[test]"])
    if status != 0:
        return status
    for name, arguments, settings in checks():
        say(name)
        status = run([python_inside(), *arguments], settings)
        if status != 0:
            say(f"{name}: failed")
            return status
    say("all checks passed")
    return 0


COMMANDS = {"sample": sample, "tests": tests}


def main(arguments: Sequence[str]) -> int:
    if tuple(sys.version_info) < (3, 11):
        say("Python 3.11 or newer is needed; this is " + sys.version.split()[0] + ".")
        return 2
    if len(arguments) != 1 or arguments[0] not in COMMANDS:
        say("say what to do: python3 -m coatgui.first_steps sample, or … tests")
        return 2
    return COMMANDS[arguments[0]]()


if __name__ == "__main__":
    sys.exit(main(sys.argv[1:]))
