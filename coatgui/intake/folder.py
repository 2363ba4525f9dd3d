"""A folder, or some files, as one find: panels, readings, the open lead, and what was refused; or,
as a dry run, what each file would become."""

from __future__ import annotations

import hashlib
import os
from collections.abc import Iterator, Sequence
from pathlib import Path

import numpy as np

from coatgui.intake.assign import Known, assigned
from coatgui.intake.decode import LARGEST_FILE
from coatgui.intake.errors import Unclear, Unreadable
from coatgui.intake.lists import ListedReading, read_panels, read_readings
from coatgui.intake.proposals import Correction, DryRun, Proposal, Standing, Told
from coatgui.intake.ratings_list import read_ratings
from coatgui.intake.reading import read_as_told, read_spectra
from coatgui.intake.spectra import Piece
from coatgui.intake.template import read_lists
from coatgui.intake.workbook import is_workbook
from coatgui.progress import Progress
from coatgui.records import Found, FoundPanel, FoundRating, FoundReading, Refusal, Source, Spectrum

SPECTRUM_ENDINGS = (".csv", ".txt", ".dat", ".tsv", ".xlsx")
_PANEL_LIST, _READINGS_LIST, _RATINGS_LIST = "panels.csv", "readings.csv", "ratings.csv"
_OPEN_LEAD = "open_lead"
_LISTS = (_PANEL_LIST, _READINGS_LIST, _RATINGS_LIST)
_DEEPEST = 12
_MOST_FILES = 50_000
_MOST_BYTES = 2_000_000_000


class UnreadableFolder(Exception):
    """The folder as a whole cannot be used; the message is one sentence for a person."""


def read_folder(
    folder: Path, *, told: Told | None = None, progress: Progress | None = None
) -> Found:
    """Everything usable in a folder and the folders below it. Links that lead out of it are not
    followed. Raises UnreadableFolder where there is no such folder or nothing in it to read."""
    return propose_folder(folder, told=told, progress=progress).found


def propose_folder(
    folder: Path, *, told: Told | None = None, progress: Progress | None = None
) -> DryRun:
    """What `read_folder` would make of every file. Raises UnreadableFolder as that does."""
    if not folder.is_dir():
        raise UnreadableFolder(f"There is no folder '{folder}': check the path.")
    files = list(files_in(folder))
    run = _Run(folder, told or Told()).over(files, progress or Progress())
    if all(p.standing is Standing.PASSED_OVER for p in run.proposals):
        raise UnreadableFolder(
            f"The folder '{folder.name}' holds no file that could be a spectrum "
            f"({', '.join(SPECTRUM_ENDINGS)})."
        )
    return run


def read_files(
    files: Sequence[Path], *, told: Told | None = None, progress: Progress | None = None
) -> Found:
    """Loose files; lists and an open-lead run among them are known by their names."""
    return propose_files(files, told=told, progress=progress).found


def propose_files(
    files: Sequence[Path],
    *,
    below: Path | None = None,
    told: Told | None = None,
    progress: Progress | None = None,
) -> DryRun:
    """What `read_files` would make of every file. Files in a folder `below` which they are chosen
    have the names that they would have if all of it were read."""
    return _Run(below, told or Told(), chosen=True).over(list(files), progress or Progress())


def files_in(folder: Path) -> Iterator[Path]:
    """Files in a folder and below it, in the order of their names; hidden ones and links that lead
    out of the folder are left aside. Raises UnreadableFolder where there are far too many."""
    root = folder.resolve()
    count = 0
    for place, below, names in os.walk(folder, followlinks=False):
        depth = len(Path(place).relative_to(folder).parts)
        below[:] = sorted(b for b in below if not b.startswith(".")) if depth < _DEEPEST else []
        for name in sorted(names):
            path = Path(place) / name
            if name.startswith(".") or not path.is_file():
                continue
            if path.is_symlink() and not path.resolve().is_relative_to(root):
                continue
            count += 1
            if count > _MOST_FILES:
                raise UnreadableFolder(
                    f"The folder '{folder.name}' holds over {_MOST_FILES} files: choose one below."
                )
            yield path


class _Run:
    """Going through files once, collecting proposals and the find at the same time."""

    def __init__(self, folder: Path | None, told: Told, *, chosen: bool = False) -> None:
        self._folder, self._chosen = folder, chosen
        self._told = told
        self._panels: tuple[FoundPanel, ...] = ()
        self._listed: dict[tuple[str, str], ListedReading] = {}
        self._ratings: tuple[FoundRating, ...] = ()
        self._open_lead: tuple[Spectrum, Source] | None = None
        self._readings: list[FoundReading] = []
        self._refused: dict[Refusal, None] = {}
        self._raw: dict[str, bytes] = {}
        self._first_of: dict[str, str] = {}
        self._bytes = 0
        self._proposals: list[Proposal] = []

    def over(self, files: Sequence[Path], progress: Progress) -> DryRun:
        # What lists say is needed for all others; a workbook may hold lists.
        lists_first = sorted(
            files,
            key=lambda p: p.name not in _LISTS and p.suffix != ".xlsx",
        )
        for number, path in enumerate(lists_first):
            progress.at("Reading files", number, len(files))
            self._take(path)
        present = {self._name(path) for path in files}
        for name in dict.fromkeys(file for file, _ in self._listed if file not in present):
            self._refuse(name, "The readings list names this file, but it is not there.")
        progress.at("Reading files", len(files), len(files))
        order = {self._name(path): place for place, path in enumerate(files)}
        self._readings.sort(key=lambda r: order[r.source.file])
        found = Found(
            self._panels,
            tuple(self._readings),
            self._open_lead,
            tuple(self._refused),
            self._raw,
            self._ratings,
        )
        proposals = sorted(self._proposals, key=lambda p: order.get(p.file, len(order)))
        return DryRun(tuple(proposals), found)

    def _name(self, path: Path) -> str:
        if self._folder is None or not path.is_relative_to(self._folder):
            return path.name
        return path.relative_to(self._folder).as_posix()

    def _take(self, path: Path) -> None:
        name = self._name(path)
        if self._told.about(name, "").leave_out:
            self._propose(name, Standing.LEFT_OUT, "nothing")
            return
        expected = path.suffix.casefold() in SPECTRUM_ENDINGS or self._chosen
        try:
            self._read(path, name)
        except Unclear as question:
            self._refuse(name, str(question), Standing.ASKED)
        except Unreadable as problem:
            if expected:
                self._refuse(name, str(problem))
            else:
                self._propose(name, Standing.PASSED_OVER, "nothing", (str(problem),))
        except OSError as error:
            self._refuse(name, f"The file cannot be opened: {error.strerror}.")

    def _read(self, path: Path, name: str) -> None:
        data = self._data(path)
        if path.name == _PANEL_LIST:
            self._take_panels(read_panels(data, name), name)
            return
        if path.name == _READINGS_LIST:
            self._take_listed(read_readings(data, name), name)
            return
        if path.name == _RATINGS_LIST:
            self._take_ratings(read_ratings(data, name), name)
            return
        if is_workbook(data) and (lists := read_lists(data, name)) is not None:
            self._take_panels(lists.panels, name)
            self._take_listed(lists.readings, name)
            if lists.ratings:
                self._take_ratings(lists.ratings, name)
            return
        digest = hashlib.sha256(data).hexdigest()
        if digest in self._first_of:
            raise Unreadable(
                f"The file is the same, byte for byte, as {self._first_of[digest]}: remove one."
            )
        said = self._told.about(name, "").dialect
        pieces = read_spectra(data, name) if said is None else read_as_told(data, said)
        if path.stem == _OPEN_LEAD:
            self._take_open_lead(pieces[0], name, digest)
        else:
            several = len({piece.panel for piece in pieces if piece.panel}) > 1
            known = Known(self._told, self._listed, {p.panel: p for p in self._panels})
            for piece in pieces:
                self._take_piece(piece, name, digest, data, known, len(pieces) == 1, several)
        self._first_of[digest] = name
        self._raw[digest] = data

    def _data(self, path: Path) -> bytes:
        size = path.stat().st_size
        if size > LARGEST_FILE:
            raise Unreadable("The file is larger than 200 MB: split it.")
        self._bytes += size
        if self._bytes > _MOST_BYTES:
            raise Unreadable("With this file the folder exceeds 2 GB: import it in parts.")
        return path.read_bytes()

    def _take_panels(self, panels: tuple[FoundPanel, ...], name: str) -> None:
        self._panels += panels
        self._propose(name, Standing.LIST, f"a list of {_count(len(panels), 'panel')}")

    def _take_listed(self, listed: dict[tuple[str, str], ListedReading], name: str) -> None:
        self._listed.update(listed)
        self._propose(name, Standing.LIST, f"a list of {_count(len(listed), 'reading')}")

    def _take_ratings(self, ratings: tuple[FoundRating, ...], name: str) -> None:
        self._ratings += ratings
        self._propose(name, Standing.LIST, f"a list of {_count(len(ratings), 'rating')}")

    def _take_open_lead(self, piece: Piece, name: str, digest: str) -> None:
        if piece.per_area:
            raise Unclear("An open-lead run has no area: export its values in Ω.")
        self._open_lead = (piece.spectrum, Source(name, digest, "", piece.dialect))
        self._propose(name, Standing.LIST, "the open-lead run", piece.dialect.remarks, piece)

    def _take_piece(
        self,
        piece: Piece,
        name: str,
        digest: str,
        data: bytes,
        known: Known,
        alone: bool,
        several_panels: bool,
    ) -> None:
        said: Correction = self._told.about(name, piece.part)
        if said.leave_out:
            self._propose(name, Standing.LEFT_OUT, "nothing", (), piece)
            return
        try:
            own = self._told.corrections.get((name, piece.part))
            if piece.part and own is not None and own.dialect is not None:
                (piece,) = read_as_told(data, own.dialect, piece.part)
            reading, doubts = assigned(
                piece, name, digest, known, alone=alone, several_panels=several_panels
            )
        except Unreadable as problem:
            standing = Standing.ASKED if isinstance(problem, Unclear) else Standing.REFUSED
            self._refuse(name, str(problem), standing, piece)
            return
        self._readings.append(reading)
        self._propose(
            name,
            Standing.DOUBTFUL if doubts else Standing.READY,
            f"a reading of {reading.panel} at {reading.exposure_h:g} h",
            tuple(dict.fromkeys((*doubts, *piece.dialect.remarks))),
            piece,
            reading,
        )

    def _refuse(
        self,
        name: str,
        reason: str,
        standing: Standing = Standing.REFUSED,
        piece: Piece | None = None,
    ) -> None:
        self._refused.setdefault(Refusal(name, reason))
        self._propose(name, standing, "nothing yet" if standing is Standing.ASKED else "nothing",
                      (reason,), piece)  # fmt: skip

    def _propose(
        self,
        name: str,
        standing: Standing,
        becomes: str,
        sentences: tuple[str, ...] = (),
        piece: Piece | None = None,
        reading: FoundReading | None = None,
    ) -> None:
        if piece is None:
            self._proposals.append(Proposal(name, standing, becomes, sentences=sentences))
            return
        size = np.abs(piece.spectrum.impedance_ohm)
        self._proposals.append(
            Proposal(
                name,
                standing,
                becomes,
                piece.part,
                piece.panel if reading is None else reading.panel,
                piece.exposure_h if reading is None else reading.exposure_h,
                len(piece.spectrum),
                float(piece.spectrum.frequency_hz[-1]),
                float(piece.spectrum.frequency_hz[0]),
                float(size.min()),
                float(size.max()),
                sentences,
                piece.dialect,
            )
        )


def _count(number: int, what: str) -> str:
    return f"{number} {what}" if number == 1 else f"{number} {what}s"
