"""What intake proposes to make of files, before anything is made of them, and what a person says
to it."""

from __future__ import annotations

from collections import Counter
from collections.abc import Mapping
from dataclasses import dataclass, field
from datetime import datetime
from enum import StrEnum

from coatgui.intake.names import NamePattern
from coatgui.records import Dialect, Found


class Standing(StrEnum):
    """READY: nothing to say. DOUBTFUL: will be taken, but look at it. ASKED: a person must say
    something first. REFUSED: cannot be used. LIST: a panel list, readings list or open-lead run.
    LEFT_OUT: a person does not want it. PASSED_OVER: another kind of file with no spectrum in it.
    """

    READY = "ready"
    DOUBTFUL = "doubtful"
    ASKED = "asked"
    REFUSED = "refused"
    LIST = "list"
    LEFT_OUT = "left out"
    PASSED_OVER = "passed over"


@dataclass(frozen=True, slots=True)
class Proposal:
    """One file, or one spectrum of a file of several, and what it would become. `sentences` say
    what was understood, what is doubtful or why it is refused."""

    file: str
    standing: Standing
    becomes: str
    part: str = ""
    panel: str = ""
    exposure_h: float | None = None
    points: int = 0
    lowest_hz: float | None = None
    highest_hz: float | None = None
    lowest_ohm: float | None = None
    highest_ohm: float | None = None
    sentences: tuple[str, ...] = ()
    dialect: Dialect | None = None

    @property
    def may_be_read(self) -> bool:
        """Whether a person could make a reading of it by saying what its columns are."""
        return self.standing in (Standing.ASKED, Standing.REFUSED, Standing.DOUBTFUL)


@dataclass(frozen=True, slots=True)
class Correction:
    """What a person says of a file, or of one part of it. A `dialect` is taken at its word; its
    `first_data_line` 0 stands for every table of the file."""

    panel: str = ""
    exposure_h: float | None = None
    dialect: Dialect | None = None
    leave_out: bool = False


@dataclass(frozen=True)
class Told:
    """What is known before files are read: corrections by (file, part), with part "" for the whole
    file; a pattern of names; when exposure started, by panel, "" for all others; the areas of
    panels that a campaign knows already."""

    corrections: Mapping[tuple[str, str], Correction] = field(default_factory=dict)
    pattern: NamePattern | None = None
    started: Mapping[str, datetime] = field(default_factory=dict)
    areas_cm2: Mapping[str, float] = field(default_factory=dict)

    def about(self, file: str, part: str) -> Correction:
        """What holds for one spectrum: what was said of it, else of its file."""
        whole = self.corrections.get((file, ""), Correction())
        own = self.corrections.get((file, part), Correction()) if part else whole
        return Correction(
            own.panel or whole.panel,
            whole.exposure_h if own.exposure_h is None else own.exposure_h,
            own.dialect or whole.dialect,
            own.leave_out or whole.leave_out,
        )


@dataclass(frozen=True)
class DryRun:
    """All proposals, in the order of the files, and the find that importing them would bring."""

    proposals: tuple[Proposal, ...]
    found: Found

    def count(self, standing: Standing) -> int:
        return sum(p.standing is standing for p in self.proposals)

    def summary(self) -> str:
        """One line: how many of each standing."""
        counts = Counter(p.standing for p in self.proposals)
        return ", ".join(f"{counts[s]} {s}" for s in Standing if counts[s]) or "no files"

    def table(self) -> str:
        """Every proposal on lines of text."""
        lines = []
        for p in self.proposals:
            what = f"{p.file} ({p.part})" if p.part else p.file
            reach = ""
            if p.points and p.lowest_hz is not None and p.highest_hz is not None:
                reach = f", {p.points} points from {p.highest_hz:g} to {p.lowest_hz:g} Hz"
            lines.append(f"{p.standing:11}  {what}: {p.becomes}{reach}")
            lines += [f"{'':11}    {sentence}" for sentence in p.sentences]
        return "\n".join([*lines, self.summary()])
