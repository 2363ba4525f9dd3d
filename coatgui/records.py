"""The vocabulary: the frozen records that every room speaks in.

Conventions, everywhere in the program:

* exp(+jωt): a capacitor has a negative imaginary part (ASTM G3).
* SI units, except area in cm², thickness in µm and exposure time in h, as the trade writes them.
  Units live in names.
* The points of a spectrum run from the highest frequency to the lowest; a point is known by its
  place in that order. A point is never removed from a spectrum, only left out with a reason.
* Where a number can be uncertain it is a `Quantity`: value, 95 % limits, kind of bound, unit.
"""

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


# ---------------------------------------------------------------------------------------------
# Where a number came from


@dataclass(frozen=True, slots=True)
class Column:
    """One column of a table as it was understood.

    `role` is one of frequency, angular_frequency, real, imaginary, modulus, phase, time, panel,
    other; `factor` multiplies the written number to give Hz, rad/s, Ω, rad or h. For the imaginary
    part and the phase, a negative factor says that the file counts them the other way round.
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
    """A spectrum as intake hands it over: whose it is, when it was taken, where it came from."""

    spectrum: Spectrum
    source: Source
    panel: str
    exposure_h: float
    temperature_c: float | None = None
    amplitude_mv: float | None = None
    potential_mv: float | None = None
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


# ---------------------------------------------------------------------------------------------
# A campaign


@dataclass(frozen=True, slots=True)
class Formulation:
    formulation_id: str
    name: str
    remark: str = ""


@dataclass(frozen=True, slots=True)
class Panel:
    panel_id: str
    name: str
    formulation_id: str
    area_cm2: float | None = None
    thickness_um: float | None = None
    substrate: str = ""
    electrolyte: str = ""
    temperature_c: float | None = None
    regime: str = ""
    remark: str = ""
    notes: tuple[tuple[str, str], ...] = ()


@dataclass(frozen=True, slots=True)
class Reading:
    """One spectrum of one panel at one exposure time, with what a person decided about it.

    `left_out` and `kept_in` are places of points: those a person takes out, and those a person
    keeps although the checks suggest leaving them out. `pinned_model` names a coating model that a
    person insists on. `overruled_because` is a person's reason for using a rejected reading.
    """

    reading_id: str
    panel_id: str
    exposure_h: float
    spectrum: Spectrum
    source: Source
    temperature_c: float | None = None
    amplitude_mv: float | None = None
    potential_mv: float | None = None
    remark: str = ""
    left_out: tuple[tuple[int, str], ...] = ()
    kept_in: tuple[int, ...] = ()
    pinned_model: str = ""
    overruled_because: str = ""


@dataclass(frozen=True, slots=True)
class Criterion:
    """A limit that panels are held against: |Z|·A at a frequency falling below a value."""

    name: str
    frequency_hz: float
    ohm_cm2: float
    source: str


@dataclass(frozen=True, slots=True)
class Settings:
    """What a person can set for a campaign. `thresholds` override single entries of
    `resources/checks.toml`, by name."""

    temperature_c: float = 25.0
    modulus_frequencies_hz: tuple[float, ...] = (0.1, 0.01)
    capacitance_frequency_hz: float = 10_000.0
    mains_hz: float = 50.0
    criteria: tuple[Criterion, ...] = ()
    thresholds: tuple[tuple[str, float], ...] = ()


@dataclass(frozen=True, slots=True)
class Campaign:
    """A campaign whole. Ids are random and stable; names may change."""

    campaign_id: str
    title: str
    settings: Settings = Settings()
    formulations: tuple[Formulation, ...] = ()
    panels: tuple[Panel, ...] = ()
    readings: tuple[Reading, ...] = ()
    open_lead: Spectrum | None = None
    open_lead_source: Source | None = None
    refused: tuple[Refusal, ...] = ()
    remark: str = ""


# ---------------------------------------------------------------------------------------------
# What is found out


@dataclass(frozen=True, slots=True)
class Quantity:
    """A number that the data hold, or the bound they leave.

    `low` and `high` are 95 % limits; the one the data do not hold is None. `value` is the best
    estimate, or, for a one-sided bound, that bound; None where nothing can be said. `method` names
    the law or procedure in words that can be shown.
    """

    value: float | None
    low: float | None
    high: float | None
    bound: Bound
    unit: str
    method: str = ""


@dataclass(frozen=True, slots=True)
class Finding:
    """One thing a check found out about a reading, a panel or a campaign.

    `code` is stable and in lower-case words joined by underscores; `text` is a plain sentence;
    `points` are places in the spectrum; `evidence` are named numbers the sentence rests on.
    """

    code: str
    severity: Severity
    text: str
    points: tuple[int, ...] = ()
    evidence: tuple[tuple[str, float], ...] = ()


@dataclass(frozen=True, slots=True)
class Check:
    """The checks' answer for one spectrum: findings, and which points to leave out and why."""

    findings: tuple[Finding, ...] = ()
    suggested: tuple[tuple[int, str], ...] = ()

    @property
    def rejected(self) -> bool:
        return any(f.severity is Severity.REJECT for f in self.findings)


@dataclass(frozen=True, slots=True)
class Parameter:
    """One fitted parameter of a coating model. `layer` counts from the outside: 0 is the solution
    and the leads, 1 the outermost layer."""

    symbol: str
    meaning: str
    layer: int
    quantity: Quantity


@dataclass(frozen=True, slots=True)
class Trial:
    """One model that was tried on a spectrum, and why it was or was not taken."""

    model: str
    parameters: int
    residual_rms_percent: float | None
    aicc: float | None
    remark: str


@dataclass(frozen=True, slots=True, eq=False)
class Fit:
    """A coating model laid on one spectrum, per specimen.

    `modelled_ohm` (N,) is the model at every frequency of the spectrum; `used` (N,) says which
    points were fitted. The residual is (Z − Z_model)/|Z|, complex. `residual_rms_percent` is the
    root mean square of its parts over the used points, in percent. `log_covariance` (p, p) is the
    covariance of the parameters' natural logarithms, in the order of `parameters` (zero for fixed
    ones), or None where it is not known; what is derived from several parameters needs it.
    """

    model: str
    model_name: str
    parameters: tuple[Parameter, ...]
    modelled_ohm: ComplexArray
    used: BoolArray
    residual_rms_percent: float
    converged: bool
    message: str
    trials: tuple[Trial, ...] = ()
    log_covariance: FloatArray | None = None

    def parameter(self, symbol: str) -> Quantity | None:
        """The quantity of the parameter with this symbol, or None if the model has none."""
        return next((p.quantity for p in self.parameters if p.symbol == symbol), None)


@dataclass(frozen=True, slots=True)
class LeftOutPoint:
    frequency_hz: float
    reason: str


@dataclass(frozen=True, slots=True)
class Modulus:
    """|Z|·A at one frequency. `quantity` is None where the frequency was not reached."""

    frequency_hz: float
    status: ModulusStatus
    quantity: Quantity | None


@dataclass(frozen=True, slots=True)
class WaterUptake:
    """Apparent water uptake; `reference_h` is the exposure time of the dry reference (0 where it
    was extrapolated)."""

    quantity: Quantity
    reference_h: float


@dataclass(frozen=True, slots=True, eq=False)
class ReadingAssessment:
    """All that is concluded from one reading. Quantities are per cm² where the panel has an area,
    else per specimen, and their unit says which. `counts` is False where the reading is kept out
    of trends and comparisons."""

    reading_id: str
    panel_id: str
    panel: str
    formulation: str
    exposure_h: float
    file: str
    sha256: str
    points_read: int
    points_used: int
    left_out: tuple[LeftOutPoint, ...]
    findings: tuple[Finding, ...]
    counts: bool
    modulus: tuple[Modulus, ...]
    fit: Fit | None
    parameters: tuple[Parameter, ...]
    coating_capacitance: Quantity | None
    capacitance_at_high_frequency: Quantity | None
    pore_resistance: Quantity | None
    water_uptake: WaterUptake | None

    def modulus_at(self, frequency_hz: float) -> Modulus | None:
        return next((m for m in self.modulus if m.frequency_hz == frequency_hz), None)


@dataclass(frozen=True, slots=True)
class Event:
    """Something that happened to a panel between two inspections."""

    code: str
    text: str
    after_h: float | None
    by_h: float | None


@dataclass(frozen=True, slots=True)
class LimitCrossing:
    """When a panel fell below a criterion: between `after_h` and `by_h`. `after_h` is None where
    the first reading was already below; both are None where it was never below."""

    criterion: Criterion
    after_h: float | None
    by_h: float | None
    text: str


@dataclass(frozen=True, slots=True)
class PanelAssessment:
    panel_id: str
    panel: str
    formulation: str
    area_cm2: float | None
    thickness_um: float | None
    dry_capacitance: Quantity | None
    diffusion_coefficient: Quantity | None
    findings: tuple[Finding, ...] = ()
    events: tuple[Event, ...] = ()
    limit_crossings: tuple[LimitCrossing, ...] = ()


@dataclass(frozen=True, slots=True)
class CoursePoint:
    """Replicate panels of a formulation at one exposure time: mean, t-limits, how many panels.

    For quantities on a logarithmic footing the mean is geometric. `censored` counts the panels
    that only gave a bound, which the mean takes at that bound."""

    exposure_h: float
    quantity: Quantity
    panels: int
    censored: int = 0


@dataclass(frozen=True, slots=True)
class Course:
    """`code` is one of modulus_0.1, modulus_0.01, coating_capacitance, pore_resistance,
    water_uptake (and, for other wanted frequencies, modulus_<Hz>)."""

    code: str
    name: str
    points: tuple[CoursePoint, ...]


@dataclass(frozen=True, slots=True)
class FormulationAssessment:
    formulation_id: str
    formulation: str
    panels: int
    courses: tuple[Course, ...]
    text: str = ""


@dataclass(frozen=True, slots=True)
class Rank:
    """Between which places a formulation stands; formulations that share a letter in `group`
    cannot be told apart."""

    formulation: str
    rank_low: int
    rank_high: int
    group: str


@dataclass(frozen=True, slots=True, eq=False)
class Assessment:
    """What `assess(campaign)` gives: the one computation behind window, files and tests."""

    title: str
    readings: tuple[ReadingAssessment, ...]
    panels: tuple[PanelAssessment, ...]
    formulations: tuple[FormulationAssessment, ...]
    ranking: tuple[Rank, ...]
    ranking_text: str
    refused: tuple[Refusal, ...]
    findings: tuple[Finding, ...]
    cautions: tuple[str, ...]
    headline: str = ""

    def reading(self, reading_id: str) -> ReadingAssessment | None:
        return next((r for r in self.readings if r.reading_id == reading_id), None)
