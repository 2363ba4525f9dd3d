"""A process that works on a campaign is killed at random instants: nothing committed is lost.

    PYTHONPATH=. python tests/robustness/kill_trials.py [TRIALS] [SEED]

The process imports, edits, undoes, redoes, judges (checks and fits, kept in the file), makes a
rolling copy and exports, and says after each step that it is done. It gets SIGKILL at a random
instant of a random step. Then the file must pass `check_file`, open for writing, know that it was
left open, and hold exactly the state after the last step said, or after the one under way. The
expected states come from the same steps without a kill. Exported files must be absent or
whole under their names.
"""

from __future__ import annotations

import hashlib
import json
import os
import shutil
import signal
import struct
import sys
import tempfile
import time
import traceback
from collections import Counter
from collections.abc import Callable, Iterator
from contextlib import closing
from pathlib import Path
from random import Random

import numpy as np
from repeatable import repeatable

from coatgui.assessment import assess
from coatgui.campaign import CampaignFile, campaign_from_found, check_file, operations
from coatgui.output import write_json, write_workbook
from coatgui.records import Campaign, Found, FoundPanel, FoundReading, Source, Spectrum

ROUNDS = 2


def found(number: int) -> Found:
    raw = {}
    readings = []
    random = np.random.default_rng(number)
    frequency = np.logspace(4, -1, 12)
    for panel in ("A1", "A2", "B1"):
        content = f"{panel} {number}".encode() * 200
        sha256 = hashlib.sha256(content).hexdigest()
        raw[sha256] = content
        z = 1e3 + 1e8 / (1 + 2j * np.pi * frequency * 0.1 * random.uniform(0.5, 2))
        source = Source(f"{panel}_{number}h.csv", sha256)
        readings.append(FoundReading(Spectrum(frequency, z), source, panel, float(number)))
    panels = tuple(FoundPanel(p, p[0], 10.0, 60.0) for p in ("A1", "A2", "B1"))
    return Found(panels if number == 1 else (), tuple(readings), None, (), raw)


def steps(file: CampaignFile, folder: Path) -> Iterator[str]:
    """Work on a file, one yield after each step, with what the step was."""
    for number in range(1, ROUNDS + 1):
        file.apply(operations.import_found(file.campaign, found(number)))
        yield "import"
        panel = file.campaign.panels[number % 3]
        file.apply(operations.edit_panel(file.campaign, panel.panel_id, area_cm2=number + 0.5))
        yield "edit"
        reading = file.campaign.readings[-1].reading_id
        file.apply(operations.leave_out_points(file.campaign, reading, [number], "a spike"))
        yield "edit"
        file.undo()
        yield "undo"
        file.undo()
        yield "undo"
        file.redo()
        yield "redo"
        file.apply(operations.rename_campaign(file.campaign, f"Round {number}"))
        yield "edit"
        if number % 2:
            assessment = assess(file.campaign, cache=file)
            yield "fit"
        file.save_copy(folder / "copy.coatgui", replace=True)
        yield "export"
        file.keep_copy()
        yield "copy"
        write_json(assessment, folder / "out.json")
        yield "export"
        if number == ROUNDS:
            write_workbook(assessment, file.campaign, folder / "out.xlsx")
            yield "export"


def start(folder: Path) -> Path:
    path = folder / "trial.coatgui"
    empty = campaign_from_found(Found(), "Killed")
    CampaignFile.create(path, empty, {}).close()
    return path


def expected() -> tuple[list[Campaign], list[str], list[float]]:
    """The state after each step, what each step was, and how long it took in s."""
    with tempfile.TemporaryDirectory() as place, repeatable():
        folder = Path(place)
        path = start(folder)
        began = time.monotonic()
        with CampaignFile.open(path) as file:
            states, kinds, took_s = [file.campaign], ["open"], [time.monotonic() - began]
            began = time.monotonic()
            for kind in steps(file, folder):
                states.append(file.campaign)
                kinds.append(kind)
                took_s.append(time.monotonic() - began)
                began = time.monotonic()
        return states, kinds, took_s


def _work(folder: Path, ready: int, said: int) -> None:
    """In the process that is killed."""
    status = 1
    try:
        with repeatable():
            path = start(folder)
            os.write(ready, b"r")
            with CampaignFile.open(path) as file:
                os.write(said, struct.pack("<i", 0))
                for number, _ in enumerate(steps(file, folder), start=1):
                    os.write(said, struct.pack("<i", number))
        status = 0
    except BaseException:
        traceback.print_exc()
    os._exit(status)


def trial(
    number: int, seed: int, states: list[Campaign], kinds: list[str], took_s: list[float]
) -> tuple[str, str]:
    """What was under way when the process was killed, and what is wrong ("" for nothing)."""
    folder = Path(tempfile.mkdtemp())
    try:
        ready_r, ready_w = os.pipe()
        said_r, said_w = os.pipe()
        child = os.fork()
        if child == 0:
            _work(folder, ready_w, said_w)
        os.close(ready_w)
        os.close(said_w)
        if not os.read(ready_r, 1):
            return "never began", "the process failed"
        random = Random(f"{seed}/{number}")
        step = random.randrange(len(kinds))
        told = b""
        while len(told) < 4 * step:
            more = os.read(said_r, 4 * step - len(told))
            if not more:
                break
            told += more
        time.sleep(random.uniform(0, 1.2 * took_s[step]))
        os.kill(child, signal.SIGKILL)
        _, status = os.waitpid(child, 0)
        told += b"".join(iter(lambda: os.read(said_r, 65536), b""))
        os.close(ready_r)
        os.close(said_r)
        done = struct.unpack_from("<i", told, len(told) - 4)[0] if told else -1
        if os.WIFEXITED(status) and os.WEXITSTATUS(status):
            return "failed", "the process failed by itself"
        under_way = kinds[done + 1] if done + 1 < len(kinds) else "closing"
        return under_way, _what_is_wrong(folder, states, done, killed=os.WIFSIGNALED(status))
    finally:
        shutil.rmtree(folder)


def _what_is_wrong(folder: Path, states: list[Campaign], done: int, *, killed: bool) -> str:
    path = folder / "trial.coatgui"
    problems = check_file(path)
    if problems:
        return f"check: {problems}"
    with CampaignFile.open(path) as file:
        if file.read_only_because:
            return f"read only: {file.read_only_because}"
        if killed and 0 <= done < len(states) - 1 and file.left_open is None:
            return "not known that it was left open"
        allowed = states[max(done, 0) : done + 2]
        if file.campaign not in allowed:
            return f"after step {done}: another state"
        file.apply(operations.rename_campaign(file.campaign, "Goes on"))
        file.undo()
        if file.campaign not in allowed:
            return "another state after one more edit and undo"
    return _exports_wrong(folder)


def _exports_wrong(folder: Path) -> str:
    checks: dict[str, Callable[[Path], object]] = {
        "out.json": lambda p: json.loads(p.read_text(encoding="utf-8")),
        "out.xlsx": _read_workbook,
    }
    copies = [folder / "copy.coatgui", *(folder / "trial copies").glob("*.coatgui")]
    for copy in copies:
        if copy.exists() and check_file(copy):
            return f"{copy.name}: {check_file(copy)}"
    for name, read in checks.items():
        if (folder / name).exists():
            try:
                read(folder / name)
            except Exception as problem:
                return f"{name}: {problem}"
    return ""


def _read_workbook(path: Path) -> object:
    from openpyxl import load_workbook

    with closing(load_workbook(path, read_only=True)) as book:
        return book.sheetnames


def trials(count: int, seed: int) -> tuple[Counter[str], list[str]]:
    """How often the process was killed during what, and the failures."""
    states, kinds, took_s = expected()
    counts: Counter[str] = Counter()
    failures = []
    for number in range(count):
        during, wrong = trial(number, seed, states, kinds, took_s)
        counts[during] += 1
        if wrong:
            failures.append(f"trial {number} during {during}: {wrong}")
        if (number + 1) % 100 == 0:
            print(f"{number + 1}: {dict(counts)}, {len(failures)} failures", flush=True)
    return counts, failures


if __name__ == "__main__":
    wanted = int(sys.argv[1]) if len(sys.argv) > 1 else 1000
    shown, failed = trials(wanted, int(sys.argv[2]) if len(sys.argv) > 2 else 1)
    print(f"killed {wanted} times, during: {dict(shown)}; {len(failed)} failures")
    print("\n".join(failed[:20]))
    sys.exit(bool(failed))
