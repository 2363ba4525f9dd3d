"""Files made to do harm: each is read or refused in a process of its own, with its time and peak
memory printed; then thousands of small files broken at random, of which none may crash.

    python tests/benchmarks/intake_hostile.py [HOW_MANY_BROKEN_FILES]
"""

from __future__ import annotations

import io
import multiprocessing
import random
import sys
import time
import zipfile
from collections import Counter
from collections.abc import Callable
from pathlib import Path

import numpy as np

from coatgui.intake import Unreadable, read_spectra

SIZE = 10_000_000
SECONDS, MEGABYTES = 2.0, 500.0


def rows(count: int, form: str = "{:.6g};{:.6g};{:.6g}") -> list[str]:
    f = np.logspace(5, -2, 60)
    z = 120 + 1 / (2e-9j * f + 1 / 4e6)
    block = [form.format(a, b.real, b.imag) for a, b in zip(f, z, strict=True)]
    return (block * (count // 60 + 1))[:count]


def text(line: str, head: str = "") -> bytes:
    return (head + line * (SIZE // len(line))).encode()


def book(sheet: bytes, more: dict[str, bytes] | None = None) -> bytes:
    """A workbook around the XML of one sheet."""
    parts = {
        "xl/workbook.xml": b'<workbook xmlns:r="r"><sheets><sheet name="S" r:id="1"/></sheets>'
        b"</workbook>",
        "xl/_rels/workbook.xml.rels": b'<Relationships><Relationship Id="1" '
        b'Target="worksheets/sheet1.xml"/></Relationships>',
        "xl/worksheets/sheet1.xml": sheet,
        **(more or {}),
    }
    buffer = io.BytesIO()
    with zipfile.ZipFile(buffer, "w", zipfile.ZIP_DEFLATED) as archive:
        for name, content in parts.items():
            archive.writestr(name, content)
    return buffer.getvalue()


def cells(count: int, cell: str = "<c><v>{}</v></c>") -> bytes:
    body = "".join(
        "<row>" + "".join(cell.format(r * 4 + i) for i in range(4)) + "</row>"
        for r in range(count // 4)
    )
    return f"<worksheet><sheetData>{body}</sheetData></worksheet>".encode()


HEAD = "f (Hz);Z' (Ohm);Z'' (Ohm)\n"
LARGE: dict[str, Callable[[], bytes]] = {
    "a good table": lambda: (HEAD + "\n".join(rows(SIZE // 30))).encode(),
    "a good table, parted thousands": lambda: (
        HEAD + "\n".join(rows(SIZE // 36, "{:,.3f};{:,.6f};{:,.6f}"))).encode(),
    "a table with a label column": lambda: (
        "panel;" + HEAD + "\n".join("A1;" + r for r in rows(SIZE // 33))).encode(),
    "labels that change in every row": lambda: (
        "panel;" + HEAD + "\n".join(f"A{i};{r}" for i, r in enumerate(rows(SIZE // 33)))).encode(),
    "a frequency that leaps": lambda: (
        HEAD + "\n".join(f"{1 + i % 2 * 9999};5;-6" for i in range(SIZE // 9))).encode(),
    "random numbers": lambda: "\n".join(
        f"{random.random()};{random.random()};{random.random()}" for _ in range(SIZE // 57)
    ).encode(),
    "rows of words between rows of numbers": lambda: text("1;2;3\nA;B;C\n"),
    "headings over every row": lambda: text(HEAD + "1;2;-3\n"),
    "short blocks": lambda: text(HEAD + "\n".join(rows(7)) + "\nnext\n"),
    "a line without end": lambda: b"1;" * (SIZE // 2),
    "lines of many cells": lambda: text("1;" * 40_000 + "\n"),
    "lines of 499 cells": lambda: text("1;" * 498 + "1\n"),
    "nothing but delimiters": lambda: text(";;;;;;;;;;;;;;;;;;;;;;;;\n"),
    "nothing but line ends": lambda: b"\n" * SIZE,
    "nothing but blanks": lambda: text(" " * 1000 + "\n"),
    "quotation marks": lambda: text('"1";"2";"3\n'),
    "signs that are nearly numbers": lambda: text("1'''''''''''''''''''''''''1e;+-+-;1..,,..2\n"),
    "digits without end": lambda: text("9" * 30_000 + ";" + "9" * 30_000 + ";1\n"),
    "headings without end": lambda: text("Z' (" * 20_000 + ";f;Z''\n", HEAD),
    "prose": lambda: text("It was measured at 5 in the morning, with 3 cups and 2 clamps.\n"),
    "zeros": lambda: bytes(SIZE),
    "noise": lambda: random.Random(1).randbytes(SIZE),
    "UTF-16 noise": lambda: b"\xff\xfe" + random.Random(1).randbytes(SIZE),
    "a workbook of 400 000 cells": lambda: book(cells(400_000)),
    "a workbook of 3 million cells": lambda: book(cells(3_000_000)),
    "a workbook of texts": lambda: book(
        cells(400_000, '<c t="inlineStr"><is><t>Z{}</t></is></c>')),
    "a workbook that unpacks to 1 GB": lambda: book(
        b"<worksheet><sheetData>" + b"<row/>" * 170_000_000 + b"</sheetData></worksheet>"),
    "a workbook nested a million deep": lambda: book(b"<a>" * 3_000_000),
    "a workbook of attributes": lambda: book(
        b"<worksheet " + b" ".join(b'a%d="1"' % i for i in range(500_000)) + b"/>"),
    "a workbook of a tag of 30 MB": lambda: book(
        b"<worksheet " + b" ".join(b'a%d="1"' % i for i in range(2_500_000)) + b"/>"),
    "a table and then nothing but line ends": lambda: (
        HEAD + "\n".join(rows(60))).encode() + b"\n" * (SIZE - 3000),
    "a table with an empty line after each": lambda: (
        HEAD + "\n\n".join(rows(SIZE // 33))).encode(),
    "cells in quotation marks": lambda: (
        HEAD + "\n".join(rows(SIZE // 36, '"{:.6g}";"{:.6g}";"{:.6g}"'))).encode(),
    "complex cells": lambda: (
        "f;Z\n" + "\n".join(rows(SIZE // 30, "{:.6g};{:.6g}{:+.6g}j"))).encode(),
    "what looks complex": lambda: text("1;(1 (1 (1-1- 1,1,1 1j;(((((1,1)i;1-1-1-1-j\n",
        "f;Z\n" + "\n".join(rows(300, "{:.6g};{:.6g}{:+.6g}j"))),
    "a table and then nothing but comments": lambda: text("#\n", HEAD + "\n".join(rows(60)) + "\n"),
    "rows of many words": lambda: text("panel," * 300 + "f\n1,2,-3\n2,3,-4\n3,4,-5\n",
        "f,Z',Z''\n" + "\n".join(rows(300, "{:.6g},{:.6g},{:.6g}"))),
    "a quotation mark at every line's end": lambda: text('1;2;"3\n', HEAD),
    "a workbook of empty rows": lambda: book(
        b"<worksheet><sheetData>" + b"<row/>" * 8_000_000 + b"</sheetData></worksheet>"),
}  # fmt: skip


def peak_mb() -> float:
    """The most memory that this process had at a time; what its parent had is not in it."""
    for line in Path("/proc/self/status").read_text(encoding="ascii").splitlines():
        if line.startswith("VmHWM"):
            return int(line.split()[1]) / 1024
    raise OSError("no peak memory is told")


def _read(data: bytes, answer: multiprocessing.Queue[tuple[str, float, float]]) -> None:
    start = time.process_time()
    try:
        said = f"{len(read_spectra(data))} spectra"
    except Unreadable as problem:
        said = str(problem)
    answer.put((said, time.process_time() - start, peak_mb()))


def large_files() -> bool:
    context = multiprocessing.get_context("spawn")
    good = True
    for name, make in LARGE.items():
        data = make()
        answer: multiprocessing.Queue[tuple[str, float, float]] = context.Queue()
        process = context.Process(target=_read, args=(data, answer))
        process.start()
        said, used, memory = answer.get()
        process.join()
        within = used <= SECONDS and memory <= MEGABYTES
        good &= within
        print(f"{'' if within else 'TOO MUCH: '}{name} ({len(data) / 1e6:.1f} MB): {used:.2f} s, "
              f"{memory:.0f} MB: {said[:90]}")  # fmt: skip
    return good


def broken(seed: int) -> bytes:
    """A small file that was whole once."""
    chance = random.Random(seed)
    whole = [HEAD, "", "Frequenz [kHz]\tBetrag [kOhm]\tPhase\n", "panel;time (h);" + HEAD]
    forms = ["{:.6g};{:.6g};{:.6g}", "{:.3f},{:.3f},{:.3f}", "{:.6e}\t{:.6e}\t{:.6e}",
             "A1;24;{:.6g};{:.6g};{:.6g}"]  # fmt: skip
    kind = chance.randrange(4)
    data = bytearray((whole[kind] + "\n".join(rows(130, forms[kind]))).encode(
        chance.choice(["utf-8", "utf-16", "cp1252"])))  # fmt: skip
    if chance.random() < 0.15:
        data = bytearray(book(cells(400)))
    for _ in range(chance.choice([1, 1, 3, 10, 100])):
        place = chance.randrange(len(data) or 1)
        what = chance.randrange(6)
        if what == 0:
            data[place : place + 1] = bytes([chance.randrange(256)])
        elif what == 1:
            del data[place : place + chance.randrange(1, 60)]
        elif what == 2:
            data[place:place] = data[chance.randrange(len(data) or 1) :][: chance.randrange(200)]
        elif what == 3:
            data[place:place] = chance.choice(
                [b";", b",", b"\n", b"\x00", b'"', b"1e999", b"nan", b"-", b"=1+1", b"\xff", b"'",
                 b"(", b"|Z|", b"/", b"log ", b"24 h\n", b"Panel: A1\n", b"mohm"])  # fmt: skip
        elif what == 4:
            del data[place:]
        else:
            data += data[:place]
        data = data[:2_000_000]
    return bytes(data)


def broken_files(count: int) -> bool:
    outcomes: Counter[str] = Counter()
    slowest = 0.0
    for seed in range(count):
        data = broken(seed)
        start = time.process_time()
        try:
            read_spectra(data)
            outcomes["read"] += 1
        except Unreadable as problem:
            outcomes[type(problem).__name__] += 1
        except Exception as error:
            outcomes["CRASHED"] += 1
            print(f"seed {seed}: {type(error).__name__}: {error}")
        slowest = max(slowest, time.process_time() - start)
    print(f"{count} broken files: {dict(outcomes)}, the slowest {slowest:.2f} s")
    return not outcomes["CRASHED"]


if __name__ == "__main__":
    sound = broken_files(int(sys.argv[1]) if len(sys.argv) > 1 else 3000)
    sound &= large_files()
    sys.exit(not sound)
