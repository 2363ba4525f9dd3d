"""The program opens no connection: neither its code nor anything it loads does, while it works."""

import ast
import os
import subprocess
import sys
from pathlib import Path

import pytest

PACKAGE = Path(__file__).resolve().parents[2] / "coatgui"
NETWORK = {
    "socket",
    "ssl",
    "http",
    "urllib.request",
    "ftplib",
    "smtplib",
    "imaplib",
    "poplib",
    "telnetlib",
    "xmlrpc",
    "socketserver",
    "asyncio",
    "requests",
    "webbrowser",
    "PySide6.QtNetwork",
    "PySide6.QtWebEngineCore",
}

# Every event of Python's own sockets but those of Unix sockets, which stay on this computer and
# which the system's own libraries use.
_WATCH = """
import socket, sys
def watch(event, arguments):
    if not event.startswith("socket."):
        return
    if event == "socket.__new__" and arguments[1] == getattr(socket, "AF_UNIX", None):
        return
    if event in ("socket.bind", "socket.connect") and isinstance(arguments[1], (str, bytes)):
        return
    print("NETWORK", event, arguments[1:], file=sys.stderr, flush=True)
    import os
    os._exit(99)
sys.addaudithook(watch)
"""


def run(code: str, tmp_path: Path) -> subprocess.CompletedProcess[str]:
    return subprocess.run(
        [sys.executable, "-c", _WATCH + code, str(tmp_path)],
        env={
            **os.environ,
            "PYTHONPATH": os.pathsep.join(sys.path),
            "QT_QPA_PLATFORM": "offscreen",
            "COATGUI_DATA": str(tmp_path / "data"),
        },
        capture_output=True,
        text=True,
        check=False,
    )


def test_the_watch_sees_a_connection(tmp_path: Path) -> None:
    for code in (
        "socket.create_connection(('127.0.0.1', 9))",
        "socket.getaddrinfo('localhost', 80)",
        "socket.socket(socket.AF_INET, socket.SOCK_DGRAM)",
    ):
        assert run(code, tmp_path).returncode == 99


def test_assessing_and_checking_opens_no_socket(tmp_path: Path) -> None:
    code = """
from pathlib import Path
from coatgui.cli import main
from coatgui.shipped import sample_panels
import shutil
here = Path(sys.argv[1])
few = here / "few"
few.mkdir()
for name in ("panels.csv", "readings.csv"):
    if (sample_panels() / name).exists():
        shutil.copy(sample_panels() / name, few)
for path in sorted(sample_panels().glob("K1_*.csv"))[:4]:
    shutil.copy(path, few)
out = str(here / "few.coatgui")
status = main(["assess", str(few), "--campaign", out, "--json", str(here / "few.json"),
    "--workbook", str(here / "few.xlsx"), "--workers", "1", "--quiet"])
assert status in (0, 1), status
assert main(["check", out]) == 0
"""
    ended = run(code, tmp_path)
    assert ended.returncode == 0, ended.stderr
    assert (tmp_path / "few.xlsx").exists()


@pytest.mark.window
def test_the_window_opens_no_socket(tmp_path: Path) -> None:
    code = """
from PySide6.QtCore import QSettings, QTimer
from PySide6.QtWidgets import QApplication
import coatgui.window
from coatgui.window import main_window
application = QApplication([])
settings = QSettings(sys.argv[1] + "/settings.ini", QSettings.Format.IniFormat)
window = main_window.MainWindow(settings, False)
window.show()
QTimer.singleShot(500, application.quit)
application.exec()
assert not [name for name in sys.modules if "QtNetwork" in name]
"""
    ended = run(code, tmp_path)
    assert ended.returncode == 0, ended.stderr


@pytest.mark.parametrize("path", sorted(PACKAGE.rglob("*.py")), ids=lambda p: p.stem)
def test_no_module_imports_what_could_connect(path: Path) -> None:
    for node in ast.walk(ast.parse(path.read_text(encoding="utf-8"))):
        names = []
        if isinstance(node, ast.Import):
            names = [alias.name for alias in node.names]
        elif isinstance(node, ast.ImportFrom) and node.module:
            names = [node.module, *(f"{node.module}.{alias.name}" for alias in node.names)]
        for name in names:
            reached = {name, name.split(".")[0]}
            assert not reached & NETWORK, f"{path.name} imports {name}"
