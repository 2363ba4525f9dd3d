"""How fast and in how much memory files are read.

    python tests/benchmarks/intake.py

Every figure is printed beside what plain Python needs to split and convert the same text, for
machines differ; memory is the peak of the process.
"""

from __future__ import annotations

import resource
import subprocess
import sys
import tempfile
import time
from pathlib import Path

import numpy as np

from coatgui.intake import read_folder, read_spectra

POINTS = 60
FILES = 1_000
LARGE = 100_000_000


def spectrum(size: float) -> list[str]:
    f = np.logspace(5, -2, POINTS)
    s = 2j * np.pi * f
    z = size * (120 + 1 / (2e-9 * s**0.95 + 1 / (4e6 + 1 / (3e-7 * s**0.85))))
    return [f"{a:.6g};{b.real:.6g};{b.imag:.6g}" for a, b in zip(f, z, strict=True)]


def plainly(text: str) -> float:
    """Seconds to split and convert every line, and nothing else."""
    start = time.process_time()
    for line in text.splitlines()[1:]:
        list(map(float, line.split(";")))
    return time.process_time() - start


def many_files() -> None:
    heading = "Frequency (Hz);Zreal (Ohm);Zimag (Ohm)"
    texts = ["\n".join([heading, *spectrum(1 + i / FILES)]) + "\n" for i in range(FILES)]
    with tempfile.TemporaryDirectory() as folder:
        for i, text in enumerate(texts):
            (Path(folder) / f"P{i % 50}_{1 + i // 50}h.csv").write_text(text, encoding="utf-8")
        start = time.process_time()
        found = read_folder(Path(folder))
        used = time.process_time() - start
    assert len(found.readings) == FILES
    plain = sum(map(plainly, texts))
    print(f"{FILES} files of {POINTS} points: {used:.2f} s on one core, {used / plain:.0f} times "
          "splitting and converting")  # fmt: skip


def one_large_file() -> None:
    """Read in a process of its own, for its peak memory."""
    block = spectrum(1.0)
    count = LARGE // sum(len(line) + 8 for line in block)
    with tempfile.TemporaryDirectory() as folder:
        path = Path(folder) / "large.csv"
        with path.open("w", encoding="utf-8") as file:
            file.write("Exposure (h);f (Hz);Z' (Ohm);Z'' (Ohm)\n")
            for i in range(count):
                file.writelines(f"{i / 8};{line}\n" for line in block)
        subprocess.run([sys.executable, __file__, str(path)], check=True)


def large(path: Path) -> None:
    data = path.read_bytes()
    start = time.process_time()
    found = read_spectra(data)
    used = time.process_time() - start
    peak = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024
    plain = plainly("\n".join(data[: 10**7].decode().splitlines()[:-1])) * len(data) / 1e7
    print(f"one file of {len(data) / 1e6:.0f} MB, {len(found)} spectra: {used:.1f} s, "
          f"{used / plain:.1f} times splitting and converting; peak {peak:.0f} MB")  # fmt: skip


if __name__ == "__main__":
    if sys.argv[1:]:
        large(Path(sys.argv[1]))
    else:
        many_files()
        one_large_file()
