"""The disk fails in every place it can while a campaign is worked on: nothing committed is lost.

    PYTHONPATH=. python tests/robustness/fault_trials.py

Needs Linux and a C compiler: `failing_disk.c` is put before the C library, and the n-th write,
flush, truncation, deletion or opening of a file in the campaign's folder fails, once or from there
on, as on a full disk or one that breaks. Every case does one thing (import, edit, undo, redo, copy,
rolling copy, keep results, create, bring up to date, open) while it fails. It must then either be
done, or refused in a sentence (CampaignFileError, nothing else). The campaign in memory must be
what it was, or what it should become; a copy elsewhere must hold it; and when the disk works again
the file must pass `check_file` and hold the state before or after.
"""

from __future__ import annotations

import ctypes
import errno
import os
import shutil
import subprocess
import sys
import tempfile
import traceback
from collections import Counter
from collections.abc import Callable
from itertools import product
from pathlib import Path

from campaign_trials import sample
from kill_trials import found

from coatgui.campaign import CampaignFile, CampaignFileError, check_file, operations
from coatgui.records import Campaign

MARKER = "failing disk"
KINDS = {"write": 1, "flush": 2, "truncate": 4, "unlink": 8, "open": 16, "lock": 32, "read": 64}
ERRORS = {
    "write": (errno.ENOSPC, errno.EIO, errno.EDQUOT),
    "flush": (errno.EIO, errno.ENOSPC),
    "truncate": (errno.EIO,),
    "unlink": (errno.EIO, errno.EACCES),
    "open": (errno.ENOSPC, errno.EMFILE, errno.EROFS),
    "read": (errno.EIO,),
}
AFTER = (0, 1, 2, 3, 5, 8, 13)
OLD = Path(__file__).parent.parent / "campaign" / "old_versions" / "version_1.sql"


def _rename(file: CampaignFile, _: Path) -> object:
    return file.apply(operations.rename_campaign(file.campaign, "Renamed"))


def _import(file: CampaignFile, _: Path) -> object:
    return file.apply(operations.import_found(file.campaign, found(1)))


ACTS: dict[str, Callable[[CampaignFile, Path], object]] = {
    "import": _import,
    "edit": _rename,
    "undo": lambda file, _: file.undo(),
    "redo": lambda file, _: file.redo(),
    "keep results": lambda file, _: file.keep_results({"k": b"v" * 9000}),
    "copy": lambda file, folder: file.save_copy(folder / "copy.coatgui", replace=True),
    "rolling copy": lambda file, _: file.keep_copy(),
    "read": lambda file, _: file.history(),
}


class Disk:
    def __init__(self) -> None:
        shim = ctypes.CDLL(None)
        self._set = shim.failing_disk
        self._set.argtypes = [ctypes.c_char_p, *[ctypes.c_int] * 4]
        self._hits = shim.failing_disk_hits

    def fail(self, kind: str, after: int, error: int, *, lasting: bool) -> None:
        self._set(MARKER.encode(), KINDS[kind], after, error, int(lasting))

    def mend(self) -> int:
        """Returns how many calls failed."""
        hits = int(self._hits())
        self._set(None, 0, 0, 0, 0)
        return hits


def case(disk: Disk, act: str, kind: str, after: int, error: int, lasting: bool) -> tuple[str, str]:
    """What became of it, and what is wrong ("" for nothing)."""
    base = Path(tempfile.mkdtemp())
    folder, elsewhere = base / MARKER, base / "elsewhere"
    folder.mkdir()
    elsewhere.mkdir()
    path = folder / "trial.coatgui"
    sample(path)
    try:
        with CampaignFile.open(path) as file:
            before = file.campaign
            disk.fail(kind, after, error, lasting=lasting)
            outcome = "done"
            try:
                ACTS[act](file, folder)
            except CampaignFileError as problem:
                outcome = "refused"
                if not str(problem).strip() or "\n" in str(problem):
                    return outcome, f"no sentence: {problem}"
            in_memory = file.campaign
            if outcome == "refused" and in_memory != before:
                return outcome, "refused, but changed in memory"
            if not lasting or kind != "read":
                file.save_copy(elsewhere / "copy.coatgui")
            hits = disk.mend()
            wrong = copy_wrong(elsewhere / "copy.coatgui", in_memory)
            if wrong:
                return outcome, wrong
        return (outcome if hits else "not reached"), file_wrong(path, in_memory)
    except Exception:
        return "crash", traceback.format_exc()
    finally:
        disk.mend()
        shutil.rmtree(base)


def copy_wrong(copy: Path, in_memory: Campaign) -> str:
    if not copy.exists():
        return ""
    if check_file(copy):
        return f"the copy elsewhere: {check_file(copy)}"
    with CampaignFile.open(copy) as other:
        return "" if other.campaign == in_memory else "the copy elsewhere is another campaign"


def file_wrong(path: Path, in_memory: Campaign) -> str:
    """After the disk works again: the file, and what may lie beside it."""
    for one in [path, *path.parent.rglob("*.coatgui")]:
        if check_file(one):
            return f"{one.name}: {check_file(one)}"
    with CampaignFile.open(path) as again:
        if again.campaign != in_memory:
            return "the file holds another state than was shown"
        again.apply(operations.rename_campaign(again.campaign, "Goes on"))
    return ""


def whole_case(
    disk: Disk, act: str, kind: str, after: int, error: int, lasting: bool
) -> tuple[str, str]:
    """Acts without an open file: create a new one, open one, open one of an older version."""
    base = Path(tempfile.mkdtemp())
    folder = base / MARKER
    folder.mkdir()
    path = folder / "trial.coatgui"
    try:
        sample(base / "as it was.coatgui")
        with CampaignFile.open(base / "as it was.coatgui") as file:
            campaign = file.campaign
            raw = {r.source.sha256: file.raw(r.source.sha256) or b"" for r in campaign.readings}
        if act == "open":
            shutil.copy(base / "as it was.coatgui", path)
        elif act == "bring up to date":
            import sqlite3

            shell = sqlite3.connect(path)
            shell.executescript(OLD.read_text(encoding="utf-8"))
            shell.close()
        disk.fail(kind, after, error, lasting=lasting)
        outcome = "done"
        try:
            if act == "create":
                CampaignFile.create(path, campaign, raw).close()
            else:
                CampaignFile.open(path).close()
        except CampaignFileError as problem:
            outcome = "refused"
            if not str(problem).strip() or "\n" in str(problem):
                return outcome, f"no sentence: {problem}"
        hits = disk.mend()
        if act == "create" and outcome == "refused" and not path.exists():
            return outcome, ""
        wrong = check_file(path)
        if wrong:
            return outcome, f"{wrong}"
        with CampaignFile.open(path) as again:
            if act != "bring up to date" and again.campaign != campaign:
                return outcome, "another campaign"
            again.apply(operations.rename_campaign(again.campaign, "Goes on"))
        return (outcome if hits else "not reached"), ""
    except Exception:
        return "crash", traceback.format_exc()
    finally:
        disk.mend()
        shutil.rmtree(base)


def cases() -> list[tuple[str, str, int, int, bool]]:
    acts = (*ACTS, "create", "open", "bring up to date")
    return [
        (act, kind, after, error, lasting)
        for act, kind, after, lasting in product(acts, ERRORS, AFTER, (False, True))
        for error in ERRORS[kind]
    ]


def trials(every: int = 1) -> tuple[Counter[str], list[str]]:
    """All cases, or every so-manyth: counts of what happened, and the failures. Only in a process
    started by `run`."""
    disk = Disk()
    counts: Counter[str] = Counter()
    failures = []
    for number, (act, kind, after, error, lasting) in enumerate(cases()[::every]):
        does = case if act in ACTS else whole_case
        outcome, wrong = does(disk, act, kind, after, error, lasting)
        counts[outcome] += 1
        if wrong:
            how = "from there on" if lasting else "once"
            failures.append(
                f"{act}, {kind} {after} fails {how} ({errno.errorcode[error]}): {wrong}"
            )
        if (number + 1) % 200 == 0:
            print(f"{number + 1}: {dict(counts)}, {len(failures)} failures", flush=True)
    return counts, failures


def run(every: int = 1) -> subprocess.CompletedProcess[str]:
    """The trials in a process of their own, on a disk that can be made to fail."""
    with tempfile.TemporaryDirectory() as place:
        shim = Path(place) / "failing_disk.so"
        source = Path(__file__).with_name("failing_disk.c")
        subprocess.run(
            ["cc", "-shared", "-fPIC", "-O1", "-w", "-o", shim, source, "-ldl"], check=True
        )
        return subprocess.run(
            [sys.executable, __file__, "inside", str(every)],
            env={**os.environ, "LD_PRELOAD": str(shim)},
            capture_output=True,
            text=True,
            check=False,
        )


if __name__ == "__main__":
    if sys.argv[1:2] != ["inside"]:
        ended = run(int(sys.argv[1]) if len(sys.argv) > 1 else 1)
        print(ended.stdout, ended.stderr, sep="")
        sys.exit(ended.returncode)
    shown, wrong_ones = trials(int(sys.argv[2]))
    reached = sum(shown.values()) - shown["not reached"]
    print(f"{reached} cases in which the disk failed: {dict(shown)}; {len(wrong_ones)} failures")
    print("\n".join(wrong_ones[:30]))
    sys.exit(bool(wrong_ones))
