"""Does the suite notice faults? A sample of small faults is put into the rooms that compute.

    PYTHONPATH=. python tests/robustness/mutation_trials.py [--number 300] [--seed 1] [--rooms …]

Needs `coverage`. First the rooms' tests run once, to learn which test files run which line. Then
each mutant is put into a copy of the checkout, and only the files that run its line are tried, the
quickest first, until one fails. A mutant on a line that no test runs survives. Survivors are
listed with their line, to be read: one that changes nothing that can be seen (a loop that runs once
more, a bound that is never met) is named as such by whoever reads it. Random examples are the same
for all. Ends with status 1 where fewer than 85 % are noticed.
"""

from __future__ import annotations

import argparse
import os
import random
import shutil
import sqlite3
import subprocess
import sys
import tempfile
import time
from collections import defaultdict
from pathlib import Path

from mutants import Mutant, mutants

ROOT = Path(__file__).resolve().parent.parent.parent
ROOMS = ("circuits", "fitting", "assessment")
WANTED = 0.85
LONGEST_S = 300.0
COPIED = ("coatgui", "resources", "sample_panels", "tests", "pyproject.toml", "README.md")
CONFIG = """[run]
dynamic_context = test_function
source = coatgui
data_file = {data}
"""


def environment() -> dict[str, str]:
    return {
        **os.environ,
        "OPENBLAS_NUM_THREADS": "1",
        "QT_QPA_PLATFORM": "offscreen",
        "PYTHONDONTWRITEBYTECODE": "1",
    }


def copy(folder: Path) -> Path:
    folder.mkdir()
    for name in COPIED:
        source = ROOT / name
        if source.is_dir():
            shutil.copytree(source, folder / name, ignore=shutil.ignore_patterns("__pycache__"))
        else:
            shutil.copy(source, folder)
    return folder


def run(where: Path, files: list[str], command: tuple[str, ...] = ()) -> tuple[bool, float]:
    """Whether the tests of these files pass, and how long they took."""
    began = time.monotonic()
    try:
        done = subprocess.run(
            [sys.executable, *command, "-m", "pytest", "-x", "-q", "-p", "no:cacheprovider",
             *files],
            cwd=where, env={**environment(), "PYTHONPATH": str(where)},
            capture_output=True, timeout=LONGEST_S, check=False,
        )  # fmt: skip
    except subprocess.TimeoutExpired:
        return False, LONGEST_S
    return done.returncode == 0, time.monotonic() - began


def lines_of(
    where: Path, files: list[str]
) -> tuple[dict[tuple[str, int], set[str]], dict[str, float]]:
    """For every line of the program the test files that run it, and how long each file takes."""
    from coverage.numbits import numbits_to_nums

    runs: dict[tuple[str, int], set[str]] = defaultdict(set)
    took: dict[str, float] = {}
    for file in files:
        data, config = where / "lines.db", where / "coverage.ini"
        data.unlink(missing_ok=True)
        config.write_text(CONFIG.format(data=data), encoding="utf-8")
        _, took[file] = run(where, [file], ("-m", "coverage", "run", f"--rcfile={config}"))
        if not data.exists():
            continue
        connection = sqlite3.connect(data)
        for path, bits in connection.execute(
            "SELECT path, numbits FROM line_bits JOIN file ON file.id = file_id "
            "JOIN context ON context.id = context_id WHERE context != ''"
        ):
            name = Path(path).relative_to(where).as_posix()
            for line in numbits_to_nums(bits):
                runs[name, line].add(file)
        connection.close()
        print(f"  {file}: {took[file]:.0f} s", flush=True)
    return runs, took


def main() -> int:
    parser = argparse.ArgumentParser(description=(__doc__ or "").split("\n", 1)[0])
    parser.add_argument("--number", type=int, default=300)
    parser.add_argument("--seed", type=int, default=1)
    parser.add_argument("--rooms", nargs="+", default=list(ROOMS))
    wanted = parser.parse_args()
    every: list[tuple[str, Mutant]] = []
    for room in wanted.rooms:
        for path in sorted((ROOT / "coatgui" / room).rglob("*.py")):
            name = path.relative_to(ROOT).as_posix()
            every += [(name, mutant) for mutant in mutants(path.read_text(encoding="utf-8"))]
    chosen = random.Random(wanted.seed).sample(every, min(wanted.number, len(every)))
    with tempfile.TemporaryDirectory() as folder:
        where = copy(Path(folder).resolve() / "copy")
        files = [
            path.relative_to(where).as_posix()
            for room in (*ROOMS, "test_sample_panels.py")
            for path in sorted(
                (where / "tests").glob(f"{room}/test_*.py" if "." not in room else room)
            )
        ]
        print(f"{len(every)} mutants are possible, {len(chosen)} are tried. Lines first:")
        runs, took = lines_of(where, files)
        noticed = 0
        for number, (name, mutant) in enumerate(chosen, 1):
            target = where / name
            sound = target.read_text(encoding="utf-8")
            # What runs when a module is read belongs to no test: any test of the room shows it.
            tried = runs.get((name, mutant.line)) or {f for f in files if name.split("/")[1] in f}
            target.write_text(mutant.put_into(sound), encoding="utf-8")
            found = any(not run(where, [file])[0] for file in sorted(tried, key=lambda f: took[f]))
            target.write_text(sound, encoding="utf-8")
            noticed += found
            if not found:
                print(f"SURVIVED {name}:{mutant.line}  {mutant.before} → {mutant.text.strip()}")
            if number % 10 == 0:
                print(f"{noticed} of {number} noticed", flush=True)
    share = noticed / len(chosen)
    print(f"{noticed} of {len(chosen)} noticed: {100 * share:.1f} % (wanted: {100 * WANTED:.0f} %)")
    return 0 if share >= WANTED else 1


if __name__ == "__main__":
    sys.exit(main())
