"""A campaign on a small disk that is really full: nothing committed is lost.

    PYTHONPATH=. python tests/robustness/full_disk_trials.py [EVERY]

Needs Linux and the right to mount in a namespace of one's own (`unshare`). A disk in memory of
4 MB is filled until so many KiB are left, from none to more than each act needs. Every case does
one thing on it, as in `fault_trials`: it must be done or refused in a sentence, a copy on another
disk must hold the campaign, and when there is room again the file must pass `check_file` and hold
the state before or after. One more case imports until the disk is full.
"""

from __future__ import annotations

import shutil
import subprocess
import sys
import tempfile
import traceback
from collections import Counter
from pathlib import Path

from campaign_trials import sample
from fault_trials import ACTS, copy_wrong, file_wrong
from kill_trials import found

from coatgui.campaign import CampaignFile, CampaignFileError, operations

SIZE = "4m"
LEFT_KIB = (0, 4, 8, 12, 16, 20, 24, 32, 40, 48, 64, 80, 96, 128, 160, 200, 256)
_NAMESPACE = ["unshare", "--user", "--map-root-user", "--mount"]


def can_mount() -> bool:
    """Whether this system lets a process mount a disk in memory for itself."""
    if sys.platform != "linux" or shutil.which("unshare") is None:
        return False
    with tempfile.TemporaryDirectory() as place:
        tried = subprocess.run(
            [*_NAMESPACE, "mount", "-t", "tmpfs", "-o", f"size={SIZE}", "tmpfs", place],
            capture_output=True,
            check=False,
        )
    return tried.returncode == 0


def fill(disk: Path, left_kib: int) -> Path:
    """Fill a disk but for so many KiB; returns the file that does it."""
    ballast = disk / "ballast"
    with ballast.open("wb", buffering=0) as file:
        try:
            while True:
                file.write(bytes(4096))
        except OSError:
            size = file.tell() - 1024 * left_kib
            file.truncate(size - size % 4096)
    return ballast


def case(disk: Path, act: str, left_kib: int) -> tuple[str, str]:
    """What became of an act with so much room, and what is wrong ("" for nothing)."""
    folder, elsewhere = disk / "campaigns", Path(tempfile.mkdtemp())
    folder.mkdir()
    path = folder / "trial.coatgui"
    try:
        sample(path)
        with CampaignFile.open(path) as file:
            before = file.campaign
            ballast = fill(disk, left_kib)
            outcome = "done"
            try:
                if act == "import until it is full":
                    outcome, before = _import_on_and_on(file)
                else:
                    ACTS[act](file, folder)
            except CampaignFileError as problem:
                outcome = "refused"
                if not str(problem).strip() or "\n" in str(problem):
                    return outcome, f"no sentence: {problem}"
            in_memory = file.campaign
            if outcome == "refused" and in_memory != before:
                return outcome, "refused, but changed in memory"
            file.save_copy(elsewhere / "copy.coatgui")
            wrong = copy_wrong(elsewhere / "copy.coatgui", in_memory)
            ballast.unlink()
            if wrong:
                return outcome, wrong
        return outcome, file_wrong(path, in_memory)
    except Exception:
        return "crash", traceback.format_exc()
    finally:
        shutil.rmtree(folder)
        (disk / "ballast").unlink(missing_ok=True)
        shutil.rmtree(elsewhere)


def _import_on_and_on(file: CampaignFile) -> tuple[str, object]:
    """Import until that is refused; what the campaign then was."""
    for number in range(1, 10_000):
        before = file.campaign
        try:
            file.apply(operations.import_found(before, found(number)))
        except CampaignFileError:
            return "refused", before
    return "never full", file.campaign


def trials(every: int = 1) -> tuple[Counter[str], list[str]]:
    """All cases, or every so-manyth: counts of what happened, and the failures. Only in a process
    started by `run`."""
    counts: Counter[str] = Counter()
    failures = []
    with tempfile.TemporaryDirectory() as place:
        disk = Path(place)
        mount = ["mount", "-t", "tmpfs", "-o", f"size={SIZE}", "tmpfs", place]
        subprocess.run(mount, check=True)
        try:
            cases = [(act, left) for act in ACTS for left in LEFT_KIB]
            cases += [("import until it is full", left) for left in (64, 512)]
            for act, left in cases[::every]:
                outcome, wrong = case(disk, act, left)
                counts[outcome] += 1
                if wrong or outcome == "never full":
                    failures.append(f"{act}, {left} KiB left: {outcome} {wrong}")
        finally:
            subprocess.run(["umount", place], check=True)
    return counts, failures


def run(every: int = 1) -> subprocess.CompletedProcess[str]:
    """The trials in a process of their own, where a disk can be mounted."""
    return subprocess.run(
        [*_NAMESPACE, sys.executable, __file__, "inside", str(every)],
        capture_output=True,
        text=True,
        check=False,
    )


if __name__ == "__main__":
    if sys.argv[1:2] != ["inside"]:
        if not can_mount():
            sys.exit("This system lets no process mount a disk for itself: nothing was tried.")
        ended = run(int(sys.argv[1]) if len(sys.argv) > 1 else 1)
        print(ended.stdout, ended.stderr, sep="")
        sys.exit(ended.returncode)
    shown, wrong_ones = trials(int(sys.argv[2]))
    print(f"{sum(shown.values())} cases on a full disk: {dict(shown)}; {len(wrong_ones)} failures")
    print("\n".join(wrong_ones[:30]))
    sys.exit(bool(wrong_ones))
