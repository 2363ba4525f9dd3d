"""Records as rows of the tables and back, exactly.

Numbers are stored as they are; lists as JSON text, in which Python writes every float so that the
same float is read back. The same record always gives the same row, so that rows can be compared.
"""

from __future__ import annotations

import hashlib
import json
from collections.abc import Iterable, Mapping
from functools import lru_cache
from typing import Any

import numpy as np

from coatgui.campaign import rows_asked
from coatgui.campaign.cells import (
    as_float,
    list_of,
    number,
    number_or_none,
    object_of,
    string,
    to_json,
    whole,
)
from coatgui.campaign.changes import Cell, Row
from coatgui.campaign.rows_seen import identification_cells
from coatgui.records import (
    Column,
    Criterion,
    Dialect,
    Formulation,
    Identification,
    Panel,
    Reading,
    Refusal,
    Settings,
    Source,
    Spectrum,
)

# ---------------------------------------------------------------------------------------------
# Records to rows


def campaign_row(campaign_id: str, title: str, remark: str, named: Identification) -> Row:
    return {
        "campaign_id": campaign_id,
        "title": title,
        "remark": remark,
        **identification_cells(named),
    }


def settings_row(campaign_id: str, settings: Settings) -> Row:
    return {
        "campaign_id": campaign_id,
        "temperature_c": float(settings.temperature_c),
        "modulus_frequencies_hz": to_json([float(f) for f in settings.modulus_frequencies_hz]),
        "capacitance_frequency_hz": float(settings.capacitance_frequency_hz),
        "mains_hz": float(settings.mains_hz),
        "criteria": to_json(
            [
                {
                    "name": c.name,
                    "frequency_hz": float(c.frequency_hz),
                    "ohm_cm2": float(c.ohm_cm2),
                    "source": c.source,
                }
                for c in settings.criteria
            ]
        ),
        "thresholds": to_json([[name, float(value)] for name, value in settings.thresholds]),
        "input_resistance_ohm": as_float(settings.input_resistance_ohm),
        "input_capacitance_f": as_float(settings.input_capacitance_f),
        "take_leads_away": int(settings.take_leads_away),
        "own_models": to_json([json.loads(text) for text in settings.own_models]),
        **rows_asked.cells_of(settings),
    }


def formulation_row(formulation: Formulation) -> Row:
    return {
        "formulation_id": formulation.formulation_id,
        "name": formulation.name,
        "remark": formulation.remark,
    }


def panel_row(panel: Panel) -> Row:
    return {
        "panel_id": panel.panel_id,
        "name": panel.name,
        "formulation_id": panel.formulation_id,
        "area_cm2": as_float(panel.area_cm2),
        "thickness_um": as_float(panel.thickness_um),
        "substrate": panel.substrate,
        "electrolyte": panel.electrolyte,
        "temperature_c": as_float(panel.temperature_c),
        "regime": panel.regime,
        "remark": panel.remark,
        "notes": to_json(panel.notes),
    }


def reading_row(reading: Reading) -> Row:
    return {
        "reading_id": reading.reading_id,
        "panel_id": reading.panel_id,
        "exposure_h": float(reading.exposure_h),
        "spectrum_id": reading.spectrum.content_key(),
        **_source_cells(reading.source),
        "temperature_c": as_float(reading.temperature_c),
        "amplitude_mv": as_float(reading.amplitude_mv),
        "potential_mv": as_float(reading.potential_mv),
        "remark": reading.remark,
        "left_out": to_json(reading.left_out),
        "kept_in": to_json(reading.kept_in),
        "pinned_model": reading.pinned_model,
        "overruled_because": reading.overruled_because,
        **_span_cells("temperature", "c", reading.temperature_span_c),
        **_span_cells("potential", "mv", reading.potential_span_mv),
    }


def _span_cells(what: str, unit: str, span: tuple[float, float] | None) -> Row:
    low, high = (None, None) if span is None else span
    return {f"{what}_low_{unit}": as_float(low), f"{what}_high_{unit}": as_float(high)}


def open_lead_row(campaign_id: str, spectrum: Spectrum, source: Source | None) -> Row:
    return {
        "campaign_id": campaign_id,
        "spectrum_id": spectrum.content_key(),
        **_source_cells(source),
    }


def refusal_row(refusal: Refusal) -> Row:
    return {
        "refusal_id": refusal_key(refusal),
        "file": refusal.file,
        "reason": refusal.reason,
    }


def refusal_key(refusal: Refusal) -> str:
    """A refusal is known by what it says; saying it twice adds nothing."""
    said = to_json([refusal.file, refusal.reason]).encode("utf-8", "surrogatepass")
    return hashlib.sha256(said).hexdigest()[:32]


def spectrum_row(spectrum: Spectrum) -> Row:
    return {
        "spectrum_id": spectrum.content_key(),
        "frequency_hz": to_json(spectrum.frequency_hz.tolist()),
        "real_ohm": to_json(spectrum.impedance_ohm.real.tolist()),
        "imaginary_ohm": to_json(spectrum.impedance_ohm.imag.tolist()),
    }


def _source_cells(source: Source | None) -> dict[str, Cell]:
    if source is None:
        return {"file": None, "sha256": None, "part": None, "dialect": None}
    return {
        "file": source.file,
        "sha256": source.sha256,
        "part": source.part,
        "dialect": None if source.dialect is None else _dialect_text(source.dialect),
    }


@lru_cache(maxsize=256)
def _dialect_text(dialect: Dialect) -> str:
    return to_json(
        {
            "encoding": dialect.encoding,
            "delimiter": dialect.delimiter,
            "decimal_sign": dialect.decimal_sign,
            "first_data_line": dialect.first_data_line,
            "ascending": dialect.ascending,
            "columns": [
                {
                    "position": c.position,
                    "heading": c.heading,
                    "role": c.role,
                    "unit": c.unit,
                    "factor": float(c.factor),
                }
                for c in dialect.columns
            ],
            "remarks": dialect.remarks,
        }
    )


# ---------------------------------------------------------------------------------------------
# Rows to records. They raise one of `cells.UNREADABLE` where a row is not as we write it.


def settings_of(row: Row) -> Settings:
    return Settings(
        temperature_c=number(row["temperature_c"]),
        modulus_frequencies_hz=tuple(map(number, list_of(row["modulus_frequencies_hz"]))),
        capacitance_frequency_hz=number(row["capacitance_frequency_hz"]),
        mains_hz=number(row["mains_hz"]),
        criteria=tuple(
            Criterion(
                string(c["name"]),
                number(c["frequency_hz"]),
                number(c["ohm_cm2"]),
                string(c["source"]),
            )
            for c in list_of(row["criteria"])
        ),
        thresholds=tuple(
            (string(name), number(value)) for name, value in list_of(row["thresholds"])
        ),
        input_resistance_ohm=number_or_none(row["input_resistance_ohm"]),
        input_capacitance_f=number_or_none(row["input_capacitance_f"]),
        take_leads_away=bool(whole(row["take_leads_away"])),
        own_models=tuple(to_json(object_of(model)) for model in list_of(row["own_models"])),
        **rows_asked.read(row),
    )


def formulation_of(row: Row) -> Formulation:
    return Formulation(string(row["formulation_id"]), string(row["name"]), string(row["remark"]))


def panel_of(row: Row) -> Panel:
    return Panel(
        panel_id=string(row["panel_id"]),
        name=string(row["name"]),
        formulation_id=string(row["formulation_id"]),
        area_cm2=number_or_none(row["area_cm2"]),
        thickness_um=number_or_none(row["thickness_um"]),
        substrate=string(row["substrate"]),
        electrolyte=string(row["electrolyte"]),
        temperature_c=number_or_none(row["temperature_c"]),
        regime=string(row["regime"]),
        remark=string(row["remark"]),
        notes=tuple((string(heading), string(text)) for heading, text in list_of(row["notes"])),
    )


def reading_of(row: Row, spectra: Mapping[str, Spectrum]) -> Reading:
    """`spectra` must hold the one that the row names."""
    source = source_of(row)
    if source is None:
        raise ValueError("A reading must name the file it came from.")
    spectrum = spectra[string(row["spectrum_id"])]
    left_out = tuple((whole(point), string(reason)) for point, reason in list_of(row["left_out"]))
    kept_in = tuple(map(whole, list_of(row["kept_in"])))
    if not all(0 <= point < len(spectrum) for point in (*(p for p, _ in left_out), *kept_in)):
        raise ValueError("A point is named that the spectrum does not have.")
    return Reading(
        reading_id=string(row["reading_id"]),
        panel_id=string(row["panel_id"]),
        exposure_h=number(row["exposure_h"]),
        spectrum=spectrum,
        source=source,
        temperature_c=number_or_none(row["temperature_c"]),
        amplitude_mv=number_or_none(row["amplitude_mv"]),
        potential_mv=number_or_none(row["potential_mv"]),
        remark=string(row["remark"]),
        left_out=left_out,
        kept_in=kept_in,
        pinned_model=string(row["pinned_model"]),
        overruled_because=string(row["overruled_because"]),
        temperature_span_c=_span_of(row, "temperature", "c"),
        potential_span_mv=_span_of(row, "potential", "mv"),
    )


def _span_of(row: Row, what: str, unit: str) -> tuple[float, float] | None:
    low, high = (number_or_none(row[f"{what}_{end}_{unit}"]) for end in ("low", "high"))
    if low is None or high is None:
        if low is not high:
            raise ValueError(f"Of a {what} within the sweep only one end is there.")
        return None
    return low, high


def refusal_of(row: Row) -> Refusal:
    return Refusal(string(row["file"]), string(row["reason"]))


def source_of(row: Row) -> Source | None:
    if row["file"] is None:
        return None
    dialect = row["dialect"]
    return Source(
        file=string(row["file"]),
        sha256=string(row["sha256"]),
        part=string(row["part"]),
        dialect=None if dialect is None else _dialect_of(string(dialect)),
    )


@lru_cache(maxsize=256)
def _dialect_of(text: str) -> Dialect:
    told = json.loads(text)
    return Dialect(
        encoding=string(told["encoding"]),
        delimiter=string(told["delimiter"]),
        decimal_sign=string(told["decimal_sign"]),
        first_data_line=whole(told["first_data_line"]),
        columns=tuple(
            Column(
                whole(c["position"]),
                string(c["heading"]),
                string(c["role"]),
                string(c["unit"]),
                number(c["factor"]),
            )
            for c in told["columns"]
        ),
        ascending=bool(told["ascending"]),
        remarks=tuple(map(string, told["remarks"])),
    )


def spectra_of(rows: Iterable[tuple[str, str, str, str]]) -> dict[str, Spectrum]:
    """Spectra by their id, from (id, frequency_hz, real_ohm, imaginary_ohm) as stored."""
    spectra = {}
    # Readings of a campaign mostly share their list of frequencies: parse each list once.
    frequencies: dict[str, Any] = {}
    for spectrum_id, frequency_text, real, imaginary in rows:
        frequency = frequencies.get(frequency_text)
        if frequency is None:
            frequency = frequencies[frequency_text] = _floats(frequency_text)
        # Set part by part: a sum real + 1j·imaginary would lose the sign of a negative zero.
        impedance = np.empty(frequency.shape, dtype=np.complex128)
        impedance.real = _floats(real, frequency.size)
        impedance.imag = _floats(imaginary, frequency.size)
        spectra[spectrum_id] = Spectrum(frequency, impedance)
    return spectra


def _floats(text: str, wanted: int | None = None) -> Any:
    numbers = np.array(json.loads(text), dtype=np.float64)
    if numbers.ndim != 1 or (wanted is not None and numbers.size != wanted):
        raise ValueError("The lists of a spectrum differ in length.")
    return numbers
