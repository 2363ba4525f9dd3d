"""A small share of each trial, for every run of the suite; the rest is run by hand."""

import os
import shutil
import subprocess
import sys
from pathlib import Path

import pytest
from full_disk_trials import can_mount

HERE = Path(__file__).parent


def run(script: str, *arguments: str) -> None:
    """In a process of its own: the trials fork, set alarms, and kill."""
    ended = subprocess.run(
        [sys.executable, HERE / script, *arguments],
        env={**os.environ, "PYTHONPATH": os.pathsep.join(sys.path)},
        capture_output=True,
        text=True,
        check=False,
    )
    assert ended.returncode == 0, ended.stdout + ended.stderr


@pytest.mark.skipif(not hasattr(os, "fork"), reason="needs fork")
def test_killed_at_random_instants() -> None:
    run("kill_trials.py", "4", "5")


@pytest.mark.skipif(
    sys.platform != "linux" or shutil.which("cc") is None, reason="needs Linux and a C compiler"
)
def test_a_failing_disk() -> None:
    run("fault_trials.py", "160")


@pytest.mark.skipif(not can_mount(), reason="needs the right to mount a disk in memory")
def test_a_full_disk() -> None:
    run("full_disk_trials.py", "8")


@pytest.mark.skipif(sys.platform == "win32", reason="needs alarms")
def test_damaged_campaign_files() -> None:
    run("campaign_trials.py", "200", "5")


@pytest.mark.skipif(sys.platform == "win32", reason="needs alarms")
def test_damaged_input_files() -> None:
    run("input_trials.py", "400", "5")


@pytest.mark.skipif(not hasattr(os, "fork"), reason="needs fork and alarms")
def test_fuzzed_input_files() -> None:
    # By seed alone, so that the same inputs are tried in every run; growing, where a machine's
    # load shows, is left to runs by hand.
    run("fuzz_readers.py", "60", "5", "560", "ungrown")
