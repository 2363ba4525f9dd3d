"""A campaign file of 2 GB: made, opened, edited, copied while open, checked.

    PYTHONPATH=. python tests/robustness/large_trial.py [GIGABYTES]

Prints the time of each step and the largest memory of the process; needs three times the space.
"""

from __future__ import annotations

import hashlib
import resource
import sys
import tempfile
import time
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from pathlib import Path
from random import Random

import numpy as np

from coatgui.campaign import CampaignFile, campaign_from_found, check_file, operations
from coatgui.records import Found, FoundReading, Source, Spectrum

PIECE_BYTES = 50_000_000


def made_of(number: int) -> Found:
    content = Random(number).randbytes(PIECE_BYTES)
    sha256 = hashlib.sha256(content).hexdigest()
    random = np.random.default_rng(number)
    z = random.normal(size=60) + 1j * random.normal(size=60)
    spectrum = Spectrum(np.logspace(5, -2, 60), z * 1e6)
    reading = FoundReading(spectrum, Source(f"P1_{number}h.csv", sha256), "P1", float(number))
    return Found((), (reading,), None, (), {sha256: content})


@contextmanager
def timed(what: str) -> Iterator[None]:
    began = time.monotonic()
    yield
    most = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1e3
    print(f"{what}: {time.monotonic() - began:.1f} s, memory up to {most:.0f} MB", flush=True)


def main(gigabytes: float) -> int:
    with tempfile.TemporaryDirectory() as place:
        path = Path(place) / "large.coatgui"
        file = CampaignFile.create(path, campaign_from_found(Found(), "Large"), {})
        with timed("imports"):
            for number in range(int(gigabytes * 1e9 / PIECE_BYTES)):
                file.apply(operations.import_found(file.campaign, made_of(number)))
        file.close()
        print(f"{path.stat().st_size / 1e9:.2f} GB")
        problems: list[str] = []
        with timed("open"):
            file = CampaignFile.open(path)
        with timed("edit"):
            file.apply(operations.rename_campaign(file.campaign, "Larger"))
        with timed("undo"):
            file.undo()
        with timed("rolling copy"):
            copy = file.keep_copy()
        file.close()
        steps: dict[str, Callable[[], object]] = {
            "check": lambda: problems.extend(check_file(path)),
            "check of the copy": lambda: problems.extend(check_file(copy or path)),
        }
        for what, does in steps.items():
            with timed(what):
                does()
        print(problems or "sound")
        return int(bool(problems))


if __name__ == "__main__":
    sys.exit(main(float(sys.argv[1]) if len(sys.argv) > 1 else 2.0))
