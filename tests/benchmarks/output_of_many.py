"""How long the outputs of a large campaign take, and how much memory.

Run it with `python -m tests.benchmarks.output_of_many [copies]`. The campaign is the sample's 12
panels, copied (93 copies are just under 10,000 readings), ten copies to a formulation. The targets,
for 10,000 readings: the workbook in 20 seconds and 500 MB. Prints each time, and beside it how many
times as long it takes as a fixed piece of text work on the same machine, so that machines can be
compared.
"""

from __future__ import annotations

import resource
import sys
import tempfile
import time
from collections.abc import Callable, Mapping, Sequence
from dataclasses import replace
from pathlib import Path

from coatgui.assessment import assess
from coatgui.campaign import campaign_from_found
from coatgui.intake import read_folder
from coatgui.output import write_json, write_summary, write_tables, write_workbook
from coatgui.records import Campaign, Formulation, Panel, Reading
from coatgui.shipped import sample_panels

COPIES, COPIES_OF_FORMULATION = 93, 10


class Kept:
    """Fits by content, as a campaign file keeps them: copies need none of their own."""

    def __init__(self) -> None:
        self.results: dict[str, bytes] = {}

    def cached_results(self, keys: Sequence[str]) -> dict[str, bytes]:
        return {key: self.results[key] for key in keys if key in self.results}

    def keep_results(self, results: Mapping[str, bytes]) -> None:
        self.results |= results


def many(sample: Campaign, copies: int) -> Campaign:
    formulations: list[Formulation] = []
    panels: list[Panel] = []
    readings: list[Reading] = []
    for i in range(copies):
        batch = i // COPIES_OF_FORMULATION
        if i % COPIES_OF_FORMULATION == 0:
            formulations += [
                replace(f, formulation_id=f"{f.formulation_id}{batch}", name=f"{f.name} {batch}")
                for f in sample.formulations
            ]
        panels += [
            replace(
                p,
                panel_id=f"{p.panel_id}{i}",
                name=f"{p.name}-{i}",
                formulation_id=f"{p.formulation_id}{batch}",
            )
            for p in sample.panels
        ]
        readings += [
            replace(r, reading_id=f"{r.reading_id}{i}", panel_id=f"{r.panel_id}{i}")
            for r in sample.readings
        ]
    return replace(
        sample,
        formulations=tuple(formulations),
        panels=tuple(panels),
        readings=tuple(readings),
    )


def timed(work: Callable[[], object]) -> float:
    start = time.process_time()  # of this process, however busy the machine is
    work()
    return time.process_time() - start


def text_work() -> int:
    return sum(len(f"<c r='A{i}'><v>{i / 7!r}</v></c>") for i in range(1_000_000))


def peak_mb() -> float:
    return resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024


def main() -> None:
    copies = int(sys.argv[1]) if len(sys.argv) > 1 else COPIES
    sample = campaign_from_found(read_folder(sample_panels()), "Sample")
    cache = Kept()
    assess(sample, cache=cache)
    campaign = many(sample, copies)
    assessment = assess(campaign, cache=cache)
    unit = timed(text_work)
    print(f"{len(assessment.readings)} readings; {peak_mb():.0f} MB before anything is written")
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        works: dict[str, Callable[[], object]] = {
            "workbook": lambda: write_workbook(assessment, campaign, folder / "o.xlsx"),
            "JSON": lambda: write_json(assessment, folder / "o.json"),
            "tables": lambda: write_tables(assessment, campaign, folder / "tables"),
            "HTML summary": lambda: write_summary(assessment, campaign, folder / "o.html"),
            "PDF summary": lambda: write_summary(assessment, campaign, folder / "o.pdf"),
        }
        for what, work in works.items():
            seconds = timed(work)
            print(
                f"{what}: {seconds:.1f} s, {seconds / unit:.1f} times the text work; "
                f"peak so far {peak_mb():.0f} MB"
            )


if __name__ == "__main__":
    main()
