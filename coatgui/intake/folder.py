"""A folder, or some files, as one find: panels, readings, the open lead, and what was refused."""

from __future__ import annotations

import hashlib
from collections.abc import Sequence
from pathlib import Path

from coatgui.intake.decode import LARGEST_FILE
from coatgui.intake.errors import Unreadable
from coatgui.intake.lists import ListedReading, read_panels, read_readings
from coatgui.intake.names import panel_and_hours
from coatgui.intake.reading import read_spectra
from coatgui.intake.spectra import Piece
from coatgui.progress import Progress
from coatgui.records import Found, FoundPanel, FoundReading, Refusal, Source, Spectrum

SPECTRUM_ENDINGS = (".csv", ".txt", ".dat", ".tsv", ".xlsx")
_PANEL_LIST, _READINGS_LIST, _OPEN_LEAD = "panels.csv", "readings.csv", "open_lead"


class UnreadableFolder(Exception):
    """The folder as a whole cannot be used; the message is one sentence for a person."""


def read_folder(folder: Path, *, progress: Progress | None = None) -> Found:
    """Everything usable in a folder and the folders below it. Links that lead out of it are not
    followed. Raises UnreadableFolder where there is no such folder or nothing in it to read."""
    if not folder.is_dir():
        raise UnreadableFolder(f"There is no folder '{folder}': check the path.")
    root = folder.resolve()
    files = [
        path
        for path in sorted(folder.rglob("*"))
        if path.is_file()
        and path.suffix.lower() in SPECTRUM_ENDINGS
        and not any(part.startswith(".") for part in path.relative_to(folder).parts)
        and path.resolve().is_relative_to(root)
    ]
    if not files:
        raise UnreadableFolder(
            f"The folder '{folder.name}' holds no file that could be a spectrum "
            f"({', '.join(SPECTRUM_ENDINGS)})."
        )
    return _read(files, folder, progress or Progress())


def read_files(files: Sequence[Path], *, progress: Progress | None = None) -> Found:
    """Loose files; lists and an open-lead run among them are known by their names."""
    chosen = [path for path in files if path.suffix.lower() in SPECTRUM_ENDINGS]
    others = tuple(
        Refusal(path.name, "This kind of file holds no spectrum the program reads.")
        for path in files
        if path not in chosen
    )
    found = _read(chosen, None, progress or Progress())
    return Found(
        found.panels, found.readings, found.open_lead, (*others, *found.refused), found.raw
    )


def _name(path: Path, folder: Path | None) -> str:
    return path.name if folder is None else path.relative_to(folder).as_posix()


def _bytes(path: Path) -> bytes:
    if path.stat().st_size > LARGEST_FILE:
        raise Unreadable("The file is larger than 200 MB: split it.")
    return path.read_bytes()


def _read(files: Sequence[Path], folder: Path | None, progress: Progress) -> Found:
    panels: tuple[FoundPanel, ...] = ()
    listed: dict[str, ListedReading] = {}
    open_lead: tuple[Spectrum, Source] | None = None
    readings: list[FoundReading] = []
    refused: list[Refusal] = []
    raw: dict[str, bytes] = {}
    first_of: dict[str, str] = {}
    lists_first = sorted(files, key=lambda p: p.name not in (_PANEL_LIST, _READINGS_LIST))
    for number, path in enumerate(lists_first):
        progress.at("Reading files", number, len(files))
        name = _name(path, folder)
        try:
            data = _bytes(path)
            if path.name == _PANEL_LIST:
                panels = read_panels(data, name)
                continue
            if path.name == _READINGS_LIST:
                listed = read_readings(data, name)
                continue
            digest = hashlib.sha256(data).hexdigest()
            if digest in first_of:
                raise Unreadable(
                    f"The file is the same, byte for byte, as {first_of[digest]}: remove one."
                )
            found = read_spectra(data, name)
            if path.stem == _OPEN_LEAD:
                open_lead = (found[0].spectrum, Source(name, digest, "", found[0].dialect))
            else:
                readings += [
                    _reading(piece, name, digest, listed.get(name), alone=len(found) == 1)
                    for piece in found
                ]
            first_of[digest] = name
            raw[digest] = data
        except Unreadable as error:
            refused.append(Refusal(name, str(error)))
        except OSError as error:
            refused.append(Refusal(name, f"The file cannot be opened: {error.strerror}."))
    present = {_name(path, folder) for path in files}
    refused += [
        Refusal(name, "The readings list names this file, but it is not there.")
        for name in listed
        if name not in present
    ]
    progress.at("Reading files", len(files), len(files))
    return Found(panels, tuple(readings), open_lead, tuple(refused), raw)


def _reading(
    piece: Piece, name: str, digest: str, listed: ListedReading | None, *, alone: bool
) -> FoundReading:
    if piece.per_area:
        raise Unreadable("The impedance is per area (Ω cm²): export it per specimen, in Ω.")
    by_name = panel_and_hours(name)
    stem = Path(name).stem
    panel = (
        (listed.panel if listed else "")
        or piece.panel
        or (by_name[0] if by_name else "")
        or (stem if piece.exposure_h is not None else "")
    )
    hours = piece.exposure_h
    # One time for a file of several would make them all the same reading.
    if listed and listed.exposure_h is not None and (alone or hours is None):
        hours = listed.exposure_h
    if hours is None and by_name:
        hours = by_name[1]
    if not panel or hours is None:
        raise Unreadable(
            "Neither its name nor its columns nor a readings list says which panel and exposure "
            "time it belongs to: name it like A1_168h.csv, or add a line to readings.csv."
        )
    return FoundReading(
        spectrum=piece.spectrum,
        source=Source(name, digest, piece.part, piece.dialect),
        panel=panel,
        exposure_h=hours,
        temperature_c=listed.temperature_c if listed else None,
        amplitude_mv=listed.amplitude_mv if listed else None,
        potential_mv=listed.potential_mv if listed else None,
        remark=listed.remark if listed else "",
    )
