"""Whose spectrum a piece of a file is, and when it was taken: from what a person said, a readings
list, the file's columns, its name, the lines above its table, or a date and a start."""

from __future__ import annotations

from dataclasses import dataclass, replace
from datetime import datetime
from pathlib import PurePosixPath

from coatgui.intake.errors import Unclear
from coatgui.intake.impedance import WAYS
from coatgui.intake.labels import moment_in
from coatgui.intake.lists import ListedReading
from coatgui.intake.names import NameSays, panel_and_hours
from coatgui.intake.proposals import Correction, Told
from coatgui.intake.spectra import Piece
from coatgui.intake.units import kind_of
from coatgui.records import FoundPanel, FoundReading, Source, Spectrum

_START_COLUMNS = ("start", "exposure_start", "start_of_exposure")
_HOUR_S = 3600.0


@dataclass(frozen=True)
class Known:
    """All that is known besides the file itself."""

    told: Told
    listed: dict[tuple[str, str], ListedReading]
    panels: dict[str, FoundPanel]


def assigned(
    piece: Piece, file: str, digest: str, known: Known, *, alone: bool, several_panels: bool
) -> tuple[FoundReading, tuple[str, ...]]:
    """The reading and what to doubt about it. Raises Unclear where panel, time or area is not
    known. `alone` says that it is the file's only spectrum, `several_panels` that the file names
    more than one panel."""
    said = known.told.about(file, piece.part)
    listed = known.listed.get((file, piece.part)) or known.listed.get((file, ""))
    by_name = _name_says(file, known.told)
    doubts = list(piece.doubts)
    panel = _panel(piece, file, said, listed, by_name, several_panels, doubts)
    hours = _hours(piece, panel, said, listed, by_name, known, alone, several_panels, doubts)
    if not panel or hours is None:
        raise Unclear(
            "Neither its name nor its columns nor a readings list says which panel and exposure "
            "time it belongs to: name it like A1_168h.csv, or add a line to readings.csv."
        )
    piece = _per_specimen(piece, panel, known)
    reading = FoundReading(
        spectrum=piece.spectrum,
        source=Source(file, digest, piece.part, piece.dialect),
        panel=panel,
        exposure_h=hours,
        temperature_c=_listed_or(
            listed.temperature_c if listed else None, piece.temperature_span_c
        ),
        amplitude_mv=listed.amplitude_mv if listed else None,
        potential_mv=_listed_or(listed.potential_mv if listed else None, piece.potential_span_mv),
        remark=listed.remark if listed else "",
        temperature_span_c=piece.temperature_span_c,
        potential_span_mv=piece.potential_span_mv,
    )
    return reading, tuple(doubts)


def _listed_or(listed: float | None, within: tuple[float, float] | None) -> float | None:
    """What the list says, else the middle of what the file says point by point."""
    if listed is not None or within is None:
        return listed
    return (within[0] + within[1]) / 2


def _name_says(file: str, told: Told) -> NameSays:
    """By the pattern a person gave; what that leaves open, by the form known without asking."""
    by_form = panel_and_hours(file)
    if told.pattern is None:
        return by_form
    by_pattern = told.pattern.says(file)
    return NameSays(
        by_pattern.panel or by_form.panel,
        by_form.exposure_h if by_pattern.exposure_h is None else by_pattern.exposure_h,
        by_pattern.moment,
    )


def _panel(
    piece: Piece,
    file: str,
    said: Correction,
    listed: ListedReading | None,
    by_name: NameSays,
    several_panels: bool,
    doubts: list[str],
) -> str:
    told = said.panel or (listed.panel if listed else "")
    if told:
        return told
    if piece.panel and (piece.named_by_column or several_panels):
        return piece.panel
    # A line above the table is often left over from the sample before: the name counts more.
    if piece.panel and by_name.panel and piece.panel.casefold() != by_name.panel.casefold():
        doubts.append(
            f"A line in the file names '{piece.panel}', the file's name {by_name.panel}: the name "
            "was taken."
        )
    if by_name.panel or piece.panel:
        return by_name.panel or piece.panel
    return PurePosixPath(file).stem if piece.exposure_h is not None else ""


def _hours(
    piece: Piece,
    panel: str,
    said: Correction,
    listed: ListedReading | None,
    by_name: NameSays,
    known: Known,
    alone: bool,
    several_panels: bool,
    doubts: list[str],
) -> float | None:
    if said.exposure_h is not None:
        return said.exposure_h
    # One time for a file of several would make them all the same reading.
    if (
        listed is not None
        and listed.exposure_h is not None
        and (alone or listed.part or piece.exposure_h is None)
    ):
        return listed.exposure_h
    if piece.exposure_h is not None:
        named = by_name.exposure_h
        if alone and named is not None and abs(named - piece.exposure_h) > 0.01 * named + 0.01:
            doubts.append(
                f"The file says {piece.exposure_h:g} h and its name {named:g} h: the file's own "
                "was taken."
            )
        return piece.exposure_h
    if by_name.exposure_h is not None:
        if not alone and not several_panels:
            raise Unclear(
                "The file holds several spectra, and its name gives all of them one panel and "
                "time: say in readings.csv, with its column 'part', which is which."
            )
        return by_name.exposure_h
    return _since_start(piece, panel, by_name, known)


def _since_start(piece: Piece, panel: str, by_name: NameSays, known: Known) -> float | None:
    moment = by_name.moment or piece.moment
    start = _start(panel, known)
    if moment is None or start is None:
        return None
    if by_name.moment is None and piece.moment_unsure:
        raise Unclear(
            "The date in the file could have day and month the other way round: say when it was "
            "measured."
        )
    hours = (moment - start).total_seconds() / _HOUR_S
    if hours < 0:
        raise Unclear(
            f"It was measured on {moment:%Y-%m-%d %H:%M}, before the exposure of {panel} started "
            f"({start:%Y-%m-%d %H:%M}): correct one of them."
        )
    return hours


def _start(panel: str, known: Known) -> datetime | None:
    told = known.told.started.get(panel) or known.told.started.get("")
    if told is not None or panel not in known.panels:
        return told
    for heading, text in known.panels[panel].notes:
        if heading.casefold().replace(" ", "_") in _START_COLUMNS:
            moment, unsure = moment_in(text)
            if unsure:
                raise Unclear(
                    f"The start of exposure of {panel}, {text}, could have day and month the other "
                    "way round: write it like 2026-03-01."
                )
            return moment
    return None


def _per_specimen(piece: Piece, panel: str, known: Known) -> Piece:
    """Impedance per area divided by the panel's area, for spectra are kept per specimen."""
    if not piece.per_area:
        return piece
    listed = known.panels.get(panel)
    area = listed.area_cm2 if listed is not None else None
    area = known.told.areas_cm2.get(panel) if area is None else area
    if area is None:
        raise Unclear(
            f"The values are per area (Ω cm²), and the area of panel {panel} is not known: add "
            "area_cm2 to panels.csv, or export the values in Ω."
        )
    way = next(w for w in WAYS if {c.role for c in piece.dialect.columns} >= set(w))
    columns = tuple(
        replace(c, factor=c.factor * _of_specimen(c.role, area)) if c.role in way else c
        for c in piece.dialect.columns
    )
    remark = f"The values are per area and were divided by the panel's {area:g} cm²."
    dialect = replace(piece.dialect, columns=columns, remarks=(*piece.dialect.remarks, remark))
    spectrum = Spectrum(piece.spectrum.frequency_hz, piece.spectrum.impedance_ohm / area)
    return replace(piece, spectrum=spectrum, dialect=dialect, per_area=False)


def _of_specimen(role: str, area_cm2: float) -> float:
    """What a written value per area is multiplied with; phases are the same for any area."""
    kind = kind_of(role.removeprefix("log_"))
    return {"impedance": 1.0 / area_cm2, "angle": 1.0}.get(kind, area_cm2)
