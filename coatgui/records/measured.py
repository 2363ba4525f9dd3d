"""What is measured and where it came from: spectra, sources, what intake finds."""

from __future__ import annotations

import hashlib
from dataclasses import dataclass, field
from enum import StrEnum
from typing import Any

import numpy as np
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]
ComplexArray = NDArray[np.complex128]
BoolArray = NDArray[np.bool_]


class Severity(StrEnum):
    """How much a finding weighs: a remark, a doubt for a person to settle, or a rejection."""

    NOTE = "note"
    DOUBT = "doubt"
    REJECT = "reject"


class Bound(StrEnum):
    """What the data say about a quantity.

    TWO_SIDED: value with `low` and `high`. AT_LEAST: only `low` is held by the data. AT_MOST: only
    `high` is. FIXED: not estimated. UNDETERMINED: the data do not hold it at all.
    """

    TWO_SIDED = "two_sided"
    AT_LEAST = "at_least"
    AT_MOST = "at_most"
    FIXED = "fixed"
    UNDETERMINED = "undetermined"


class ModulusStatus(StrEnum):
    """How |Z| at a wanted frequency was come by; outside the measured range it is not."""

    MEASURED = "measured"
    INTERPOLATED = "interpolated"
    NOT_REACHED = "not_reached"


def _frozen(values: Any, dtype: type) -> Any:
    array: NDArray[Any] = np.array(values, dtype=dtype)
    array.setflags(write=False)
    return array


@dataclass(frozen=True, slots=True, eq=False)
class Spectrum:
    """Impedance against frequency as measured, per specimen (Ω, not Ω cm²).

    `frequency_hz` (N,) positive and finite; `impedance_ohm` (N,) complex and finite. Points given
    in any order are stored from the highest frequency to the lowest; equal frequencies keep their
    order. The arrays cannot be written to. Raises ValueError where the shapes differ, nothing is
    given, or a number is not finite or a frequency not positive.
    """

    frequency_hz: FloatArray
    impedance_ohm: ComplexArray

    def __post_init__(self) -> None:
        frequency = np.asarray(self.frequency_hz, dtype=np.float64)
        impedance = np.asarray(self.impedance_ohm, dtype=np.complex128)
        if frequency.ndim != 1 or frequency.shape != impedance.shape or not frequency.size:
            raise ValueError("A spectrum needs one impedance for each of its frequencies.")
        if not (np.isfinite(frequency).all() and (frequency > 0).all()):
            raise ValueError("Every frequency of a spectrum must be a positive number.")
        if not np.isfinite(impedance).all():
            raise ValueError("Every impedance of a spectrum must be a finite number.")
        order = np.argsort(-frequency, kind="stable")
        object.__setattr__(self, "frequency_hz", _frozen(frequency[order], np.float64))
        object.__setattr__(self, "impedance_ohm", _frozen(impedance[order], np.complex128))

    def __len__(self) -> int:
        return int(self.frequency_hz.size)

    def __eq__(self, other: object) -> bool:
        if not isinstance(other, Spectrum):
            return NotImplemented
        return np.array_equal(self.frequency_hz, other.frequency_hz) and np.array_equal(
            self.impedance_ohm, other.impedance_ohm
        )

    def __hash__(self) -> int:
        return hash(self.content_key())

    def content_key(self) -> str:
        """SHA-256 of the numbers, the same on every machine."""
        digest = hashlib.sha256()
        digest.update(self.frequency_hz.astype("<f8").tobytes())
        digest.update(self.impedance_ohm.astype("<c16").tobytes())
        return digest.hexdigest()


@dataclass(frozen=True, slots=True)
class Column:
    """One column of a table as it was understood.

    `role` is one of frequency, angular_frequency, real, imaginary, modulus, phase,
    admittance_real, …_imaginary, …_modulus, …_phase, capacitance_real, …_imaginary,
    parallel_resistance, …_capacitance, series_resistance, …_capacitance, time, panel, date,
    temperature, potential, other, or one of them with "log_" before it for decimal logarithms.
    `factor` multiplies the written number to give Hz, rad/s, Ω, S, F, rad, h, °C (K where the unit
    is) or mV, per specimen. For imaginary parts and phases, a negative factor says that the file
    counts them the other way round.
    """

    position: int
    heading: str
    role: str
    unit: str
    factor: float = 1.0


@dataclass(frozen=True, slots=True)
class Dialect:
    """How a table of a file was read, so that a person can check and correct it."""

    encoding: str
    delimiter: str
    decimal_sign: str
    first_data_line: int
    columns: tuple[Column, ...]
    ascending: bool = False
    remarks: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True)
class Source:
    """The file a spectrum came from. `file` is relative to the folder read, with forward slashes;
    `part` says which piece of the file, where it holds several spectra."""

    file: str
    sha256: str
    part: str = ""
    dialect: Dialect | None = None


@dataclass(frozen=True, slots=True)
class Refusal:
    """Something that could not be used, by name, with one sentence saying why and what to do."""

    file: str
    reason: str


@dataclass(frozen=True, slots=True)
class FoundPanel:
    """A row of a panel list, before it belongs to a campaign. Absent facts are None or empty."""

    panel: str
    formulation: str = ""
    area_cm2: float | None = None
    thickness_um: float | None = None
    substrate: str = ""
    electrolyte: str = ""
    temperature_c: float | None = None
    regime: str = ""
    remark: str = ""
    notes: tuple[tuple[str, str], ...] = ()


@dataclass(frozen=True, slots=True)
class FoundReading:
    """A spectrum as intake hands it over: whose it is, when it was taken, where it came from. The
    spans are the lowest and the highest within the sweep, where the file gives every point's."""

    spectrum: Spectrum
    source: Source
    panel: str
    exposure_h: float
    temperature_c: float | None = None
    amplitude_mv: float | None = None
    potential_mv: float | None = None
    remark: str = ""
    temperature_span_c: tuple[float, float] | None = None
    potential_span_mv: tuple[float, float] | None = None


@dataclass(frozen=True, slots=True)
class FoundRating:
    """A row of a ratings list: a visual rating before its panel belongs to a campaign."""

    file: str
    panel: str
    exposure_h: float
    scale: str
    value: str
    edition: str = ""
    rater: str = ""
    remark: str = ""


@dataclass(frozen=True, slots=True)
class Found:
    """All that intake made of a folder or of some files.

    `raw` maps a SHA-256 to the unchanged bytes of a file that something was read from.
    """

    panels: tuple[FoundPanel, ...] = ()
    readings: tuple[FoundReading, ...] = ()
    open_lead: tuple[Spectrum, Source] | None = None
    refused: tuple[Refusal, ...] = ()
    raw: dict[str, bytes] = field(default_factory=dict)
    ratings: tuple[FoundRating, ...] = ()
