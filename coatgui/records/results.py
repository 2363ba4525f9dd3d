"""What is found out: quantities with their bounds, findings, fits, assessments."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

from coatgui.records.campaign import Criterion
from coatgui.records.measured import (
    BoolArray,
    Bound,
    ComplexArray,
    FloatArray,
    ModulusStatus,
    Refusal,
    Severity,
)
from coatgui.records.quick import quickly_made

if TYPE_CHECKING:
    from coatgui.records.decisions import (
        Comparison,
        LimitStudy,
        NextInspection,
        Projection,
        RatingCorrelation,
        RatingCourse,
        Trend,
    )


@quickly_made
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


@quickly_made
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


@quickly_made
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
    `optimum` (p,) holds their values at the optimum, also where the data hold no more than a bound
    of one; it is for drawing the curve and its band, never a number to be shown.
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
    optimum: FloatArray | None = None

    def parameter(self, symbol: str) -> Quantity | None:
        """The quantity of the parameter with this symbol, or None if the model has none."""
        return next((p.quantity for p in self.parameters if p.symbol == symbol), None)


@dataclass(frozen=True, slots=True)
class LeftOutPoint:
    frequency_hz: float
    reason: str


@quickly_made
@dataclass(frozen=True, slots=True)
class Modulus:
    """|Z|·A at one frequency. `quantity` is None where the frequency was not reached."""

    frequency_hz: float
    status: ModulusStatus
    quantity: Quantity | None


@quickly_made
@dataclass(frozen=True, slots=True)
class WaterUptake:
    """Apparent water uptake by Brasher–Kingsbury; `reference_h` is the exposure time of the dry
    reference (0 where it was extrapolated). `law_percent` gives what the laws of `law_names` make
    of the same capacitances, in volume-percent (None where a law fails), `law_low` and `law_high`
    the ends over those that count as mixtures: the bracket that the choice of law leaves, apart
    from scatter."""

    quantity: Quantity
    reference_h: float
    law_low: float | None = None
    law_high: float | None = None
    law_names: tuple[str, ...] = ()
    law_percent: tuple[float | None, ...] = ()

    @property
    def by_law(self) -> tuple[tuple[str, float | None], ...]:
        """What every mixing law makes of the same capacitances, by name."""
        return tuple(zip(self.law_names, self.law_percent, strict=True))


@quickly_made
@dataclass(frozen=True, slots=True)
class Breakpoint:
    """Where the phase of a film with pores passes −45° and where it is least, after the circuit
    R_po, C_c, C_dl with R_ct → ∞ and R_s → 0. `ratio` is C_c/C_dl; above 0.207 the phase never
    comes above −45° and `valid` is False: the formula's numbers then mean nothing and are None.
    `measured_hz` is the crossing in the measured points, None where there is none."""

    measured_hz: float | None
    from_fit_hz: float | None
    minimum_phase_hz: float | None
    minimum_phase_deg: float | None
    ratio: float | None
    valid: bool | None
    text: str


@quickly_made
@dataclass(frozen=True, slots=True)
class ActiveArea:
    """Delaminated or active share of the area by up to three routes; `low` and `high` are the ends
    over all routes and their limits. The routes rest on different assumptions and may differ by
    decades: it is a bracket, not a measurement."""

    routes: tuple[tuple[str, Quantity], ...]
    low: float
    high: float
    text: str


@quickly_made
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
    relative_permittivity: Quantity | None = None
    film_resistivity: Quantity | None = None
    breakpoint: Breakpoint | None = None
    active_area: ActiveArea | None = None

    def modulus_at(self, frequency_hz: float) -> Modulus | None:
        return next((m for m in self.modulus if m.frequency_hz == frequency_hz), None)


@dataclass(frozen=True, slots=True)
class Event:
    """Something that happened to a panel between two inspections.

    `code` is one of film_saturated, pores_conducting, interface_reacting, diffusion_control,
    modulus_falling, rebound, dried_out, wetted_again, second_stage_sorption. `after_h` is None
    where it had happened before the first reading: that reading cannot date it. `confirmed` is
    False where only one reading shows it.
    """

    code: str
    text: str
    after_h: float | None
    by_h: float | None
    confirmed: bool = True


@dataclass(frozen=True, slots=True)
class LimitCrossing:
    """When a panel fell below a criterion: between `after_h` and `by_h`. `after_h` is None where
    the first reading was already below; both are None where it was never below. `watched_h` is the
    last reading that told anything: until then a panel that never fell is known to have held."""

    criterion: Criterion
    after_h: float | None
    by_h: float | None
    text: str
    watched_h: float | None = None


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
    dry_permittivity: Quantity | None = None
    saturation_uptake: WaterUptake | None = None
    saturation_mass_percent: Quantity | None = None
    advice: tuple[str, ...] = ()


@quickly_made
@dataclass(frozen=True, slots=True)
class CoursePoint:
    """Replicate panels of a formulation at one exposure time: mean, t-limits, how many panels.

    For quantities on a logarithmic footing the mean is geometric. `censored` counts the panels
    that only gave a bound, which the mean takes at that bound, `doubtful` those with a reading
    under a doubt that concerns the quantity; `sound` is the mean without these, None where there
    are none or no others."""

    exposure_h: float
    quantity: Quantity
    panels: int
    censored: int = 0
    doubtful: int = 0
    sound: Quantity | None = None


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
    bootstrap_low: int | None = None
    bootstrap_high: int | None = None


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
    limit_studies: tuple[LimitStudy, ...] = ()
    trends: tuple[Trend, ...] = ()
    comparison: Comparison | None = None
    further_comparisons: tuple[Comparison, ...] = ()
    projections: tuple[Projection, ...] = ()
    ratings: tuple[RatingCourse, ...] = ()
    rating_correlations: tuple[RatingCorrelation, ...] = ()
    next_inspection: NextInspection | None = None

    def reading(self, reading_id: str) -> ReadingAssessment | None:
        return next((r for r in self.readings if r.reading_id == reading_id), None)
