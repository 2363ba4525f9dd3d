"""Coverage-guided fuzzing of the readers: no crash, no hang, no memory without end.

    PYTHONPATH=. python tests/robustness/fuzz_readers.py [MINUTES] [SEED] [EXECUTIONS]

A corpus of the project's own dialects is mutated; what reaches an arc between two lines of
`coatgui/intake` that nothing reached before joins the corpus. Of those that join, every second, and
now and then another, is grown to 10 MB and read in a process of its own, which may take 2 s of
processor time and 500 MB. What must hold of every input: it is read as spectra (finite, not zero,
five points or more) or refused in one sentence, and a dialect that was found reads the same numbers
again.

Ends after MINUTES, or after EXECUTIONS where given, with counts, and with status 1 where anything
failed. The same seed makes the same inputs in the same order; one that failed is kept in the
current folder as `failed_SEED_NUMBER`.
"""

from __future__ import annotations

import codecs
import gc
import io
import os
import resource
import signal
import sys
import time
import traceback
import zipfile
from collections import Counter
from collections.abc import Callable
from pathlib import Path
from random import Random
from types import CodeType, FrameType
from typing import Any

import numpy as np
from growing import grown
from mutations import mutated, mutated_text

import coatgui.intake
from coatgui.intake import Unreadable, first_guess, read_as_told, read_lists, read_spectra
from coatgui.intake.lists import read_panels, read_readings
from coatgui.intake.workbook import is_workbook

HERE = Path(__file__).resolve().parent
sys.path.insert(0, str(HERE.parent / "intake"))

INTAKE = str(Path(coatgui.intake.__file__).parent)
PATIENCE_S = 20
SECONDS, MEGABYTES = 2.0, 500.0
_LONGEST = 20_000  # bytes of a mutated file; what size does, growing shows
_RECENT = 60
_GROWN_EVERY = 500


class TooLong(Exception):
    pass


def _too_long(_signal: int, _frame: FrameType | None) -> None:
    raise TooLong


# ---------------------------------------------------------------------------------------------
# What must hold


def _sentence(problem: Unreadable) -> None:
    text = str(problem)
    assert text.strip(), "a refusal without a word"
    assert "\n" not in text, f"not one line: {text!r}"


def _lists(data: bytes) -> None:
    for read in (read_panels, read_readings):
        try:
            read(data, "list.csv")
        except Unreadable as problem:
            _sentence(problem)


def check(data: bytes) -> str:
    """What became of the bytes. Raises whatever goes wrong."""
    if is_workbook(data):
        try:
            read_lists(data)
        except Unreadable as problem:
            _sentence(problem)
    elif len(data) < 5_000:
        _lists(data)
    try:
        pieces = read_spectra(data)
    except Unreadable as problem:
        _sentence(problem)
        try:
            first_guess(data)
        except Unreadable as other:
            _sentence(other)
        return type(problem).__name__
    for piece in pieces:
        spectrum = piece.spectrum
        assert len(spectrum) >= 5
        assert np.isfinite(spectrum.impedance_ohm).all()
        assert (spectrum.impedance_ohm != 0).all()
        assert np.isfinite(spectrum.frequency_hz).all()
        assert (spectrum.frequency_hz > 0).all()
    first = pieces[0]
    try:
        again = read_as_told(data, first.dialect)
    except Unreadable as problem:
        raise AssertionError(f"not read again: {problem}") from None
    assert again[0].spectrum == first.spectrum, "read again, and otherwise"
    return "read"


# ---------------------------------------------------------------------------------------------
# Coverage


class Arcs:
    """Which line of the readers followed which, gathered by tracing."""

    def __init__(self) -> None:
        self.seen: set[tuple[CodeType, int, int]] = set()
        self._last = 0

    def of(self, action: Callable[[], str]) -> tuple[str, int]:
        """What the action gives, and how many arcs were new."""
        before = len(self.seen)
        self._last = 0
        sys.settrace(self._called)
        try:
            said = action()
        finally:
            sys.settrace(None)
        return said, len(self.seen) - before

    def _called(self, frame: FrameType, _event: str, _arg: Any) -> Any:
        return self._line if frame.f_code.co_filename.startswith(INTAKE) else None

    def _line(self, frame: FrameType, event: str, _arg: Any) -> Any:
        if event == "line":
            number = frame.f_lineno
            self.seen.add((frame.f_code, self._last, number))
            self._last = number
        return self._line

    def lines(self) -> int:
        return len({(code.co_filename, line) for code, _, line in self.seen})


# ---------------------------------------------------------------------------------------------
# Inputs


def seeds() -> list[bytes]:
    """Files of every dialect the matrix knows, and of every kind that it leaves out."""
    import test_dialects
    from input_trials import samples
    from more_dialects import texts

    # Few points: most of a reader's work is not for the number of rows.
    test_dialects.FREQUENCY = np.logspace(5, -1, 9)
    test_dialects.S = 2j * np.pi * test_dialects.FREQUENCY
    made = [test_dialects.write(d)[0] for d in test_dialects.matrix(400, seed=11)]
    made += [content for _, content in samples()[-8:]]
    made += texts()
    return made


def _workbook(data: bytes, chance: Random) -> bytes:
    """A workbook with one of its parts mutated."""
    held = io.BytesIO()
    try:
        with zipfile.ZipFile(io.BytesIO(data)) as source, zipfile.ZipFile(held, "w") as target:
            infos = source.infolist()
            chosen = chance.choice(infos).filename
            if chance.random() < 0.6:
                chosen = next((i.filename for i in infos if "sheet1" in i.filename), chosen)
            for info in infos:
                content = source.read(info)
                if info.filename == chosen:
                    content = mutated_text(content, content, chance)[:_LONGEST]
                target.writestr(info.filename, content)
    except Exception:  # broken as an archive by an earlier mutation
        return mutated(data, chance)
    return held.getvalue()


def offspring(corpus: list[bytes], chance: Random) -> bytes:
    parent = chance.choice(corpus[-_RECENT:] if chance.random() < 0.5 else corpus)
    if is_workbook(parent):
        return _workbook(parent, chance) if chance.random() < 0.8 else mutated(parent, chance)
    encoding = "utf-16" if parent.startswith(codecs.BOM_UTF16) else "utf-8"
    for _ in range(chance.choice((1, 1, 2, 4))):
        if chance.random() < 0.25:
            parent = mutated(parent, chance)
        elif encoding == "utf-8":
            parent = mutated_text(parent, chance.choice(corpus), chance)
        else:
            plain = parent.decode(encoding, errors="replace").encode()
            changed = mutated_text(plain, chance.choice(corpus), chance)
            parent = changed.decode(errors="replace").encode(encoding)
    return parent[:_LONGEST]


# ---------------------------------------------------------------------------------------------
# Growing


def read_alone(data: bytes) -> tuple[str, float, float]:
    """What became of the bytes in a process of its own, its seconds and its peak memory in MB."""
    source, sink = os.pipe()
    sys.stdout.flush()
    child = os.fork()
    if child == 0:
        try:
            resource.setrlimit(resource.RLIMIT_CPU, (PATIENCE_S, PATIENCE_S + 1))
            start = time.process_time()
            try:
                said = f"{len(read_spectra(data))} spectra"
            except Unreadable as problem:
                said = str(problem)
            except BaseException as error:
                said = f"CRASH {type(error).__name__}: {error}"
            used = time.process_time() - start
            os.write(sink, f"{used} {said}".encode()[:900])
        finally:
            os._exit(0)
    os.close(sink)
    with os.fdopen(source, "rb") as pipe:
        told = pipe.read().decode(errors="replace")
    _, _, usage = os.wait4(child, 0)
    used, _, said = told.partition(" ")
    return said or "HANG", float(used or PATIENCE_S), usage.ru_maxrss / 1024


class Fuzzer:
    def __init__(self, seed: int) -> None:
        self.seed, self.arcs = seed, Arcs()
        self.corpus: list[bytes] = []
        self.counts: Counter[str] = Counter()
        self.grown_counts: Counter[str] = Counter()
        self.slowest = (0.0, "")
        self.largest = (0.0, "")
        self.failures: list[str] = []
        self.number = 0
        signal.signal(signal.SIGALRM, _too_long)

    def begin(self) -> None:
        for data in seeds():
            if self._try(data):
                self.corpus.append(data)

    def step(self) -> None:
        chance = Random(f"{self.seed}/{self.number}")
        data = offspring(self.corpus, chance)
        new = self._try(data)
        if new:
            self.corpus.append(data)
        if chance.random() < (0.5 if new else 1 / _GROWN_EVERY):
            self._grow(data, chance)

    def _try(self, data: bytes) -> int:
        """How many arcs the bytes reach that nothing reached before."""
        self.number += 1
        signal.alarm(PATIENCE_S)
        try:
            said, new = self.arcs.of(lambda: check(data))
        except TooLong:
            said, new = "HANG", 0
        except Exception:
            said, new = f"CRASH {traceback.format_exc()}", 0
        finally:
            signal.alarm(0)
        self.counts[said.split(" ", 1)[0]] += 1
        if said.startswith(("HANG", "CRASH")):
            self._failed(data, said)
        return new

    def _grow(self, data: bytes, chance: Random) -> None:
        how, large = grown(data, chance)
        said, used, megabytes = read_alone(large)
        where = f"{how}, execution {self.number}: {said[:80]}"
        self.slowest = max(self.slowest, (used, where))
        self.largest = max(self.largest, (megabytes, where))
        wrong = said.startswith(("HANG", "CRASH")) or used > SECONDS or megabytes > MEGABYTES
        self.grown_counts["TOO MUCH" if wrong else "within"] += 1
        if wrong:
            self._failed(large, f"{used:.2f} s, {megabytes:.0f} MB, {where}")

    def _failed(self, data: bytes, said: str) -> None:
        self.failures.append(f"execution {self.number}: {said}")
        if len(self.failures) <= 40:
            Path(f"failed_{self.seed}_{self.number}").write_bytes(data)
            print(self.failures[-1], flush=True)

    def report(self, minutes: float) -> str:
        return (
            f"{self.number} executions in {minutes:.1f} min, {len(self.corpus)} in the corpus, "
            f"{len(self.arcs.seen)} arcs over {self.arcs.lines()} lines of intake: "
            f"{dict(self.counts)}; grown to 10 MB: {dict(self.grown_counts)}, "
            f"the slowest {self.slowest[0]:.2f} s ({self.slowest[1]}), "
            f"the largest {self.largest[0]:.0f} MB ({self.largest[1]})"
        )


def main(minutes: float, seed: int, executions: int) -> int:
    fuzzer = Fuzzer(seed)
    start = told = time.monotonic()
    fuzzer.begin()
    at_start = len(fuzzer.arcs.seen)
    print(f"the corpus of {len(fuzzer.corpus)} files reaches {at_start} arcs over "
          f"{fuzzer.arcs.lines()} lines", flush=True)  # fmt: skip
    gc.freeze()
    while fuzzer.number < executions and time.monotonic() - start < 60 * minutes:
        fuzzer.step()
        if time.monotonic() - told > 120:
            told = time.monotonic()
            print(fuzzer.report((told - start) / 60), flush=True)
    print(fuzzer.report((time.monotonic() - start) / 60))
    print(f"{len(fuzzer.arcs.seen) - at_start} arcs found beyond the corpus")
    print("\n".join(fuzzer.failures[:20]) or "nothing failed")
    return 1 if fuzzer.failures else 0


if __name__ == "__main__":
    given = [float(word) for word in sys.argv[1:]] + [20.0, 1.0, 1e12][len(sys.argv) - 1 :]
    sys.exit(main(given[0], int(given[1]), int(given[2])))
