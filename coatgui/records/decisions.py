"""What an assessment says of whole formulations: limits, trends, comparisons, what to do next."""

from __future__ import annotations

from dataclasses import dataclass

from coatgui.records.questions import Limit, ProjectionWanted, Question
from coatgui.records.results import Quantity, Rank


@dataclass(frozen=True, slots=True)
class Standing:
    """A panel against a limit: broken after `after_h` (None: before the first reading) and by
    `by_h` (None: not broken up to `watched_h`)."""

    panel: str
    after_h: float | None
    by_h: float | None
    watched_h: float | None


@dataclass(frozen=True, slots=True)
class CurveStep:
    """Share of panels that still hold at an exposure time: Turnbull's estimate (equal to Kaplan and
    Meier's where every time is known; two ends where the data leave it open) and 95 % limits."""

    exposure_h: float
    share_low: float
    share_high: float
    low: float
    high: float


@dataclass(frozen=True, slots=True)
class WeibullFit:
    """S(t) = exp(−(t/η)^β) by maximum likelihood, with 95 % limits by likelihood."""

    shape: Quantity
    scale_h: Quantity
    median_h: Quantity
    tenth_h: Quantity


@dataclass(frozen=True, slots=True)
class LimitStudy:
    """One formulation against one limit, over exposure time."""

    limit: Limit
    formulation: str
    standings: tuple[Standing, ...]
    curve: tuple[CurveStep, ...]
    weibull: WeibullFit | None
    text: str


@dataclass(frozen=True, slots=True)
class Trend:
    """How a formulation's course runs: `shape` is plateau, linear or segmented; `slope` is per
    1,000 h (in decades where the quantity is logarithmic) in its last part, which began between
    `since_h`. `candidates` gives each shape's AICc."""

    formulation: str
    course: str
    shape: str
    slope: Quantity
    since_h: tuple[float, float]
    candidates: tuple[tuple[str, float], ...]
    text: str


@dataclass(frozen=True, slots=True)
class Projection:
    """A course carried beyond its last reading; `quantity` holds the 95 % prediction band for a new
    panel and is None where the data do not support a projection, with the reason in `text`."""

    formulation: str
    wanted: ProjectionWanted
    quantity: Quantity | None
    text: str


@dataclass(frozen=True, slots=True)
class PairTest:
    """Two formulations compared: difference of their means on the footing of the comparison (first
    less second; None for ranks), probability alone and after correction."""

    first: str
    second: str
    difference: Quantity | None
    probability: float
    adjusted: float
    differ: bool


@dataclass(frozen=True, slots=True)
class Comparison:
    question: Question
    what: str
    exposure_h: float | None
    ranks: tuple[Rank, ...]
    pairs: tuple[PairTest, ...]
    text: str
    effort: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True)
class RatingCourse:
    """The ratings of one formulation on one scale at one inspection, panel by panel, never
    averaged; `worst` and `best` are as the scale writes them, `edition` is what they were rated
    by."""

    formulation: str
    scale: str
    exposure_h: float
    ratings: tuple[tuple[str, str], ...]
    best: str
    worst: str
    edition: str = ""


@dataclass(frozen=True, slots=True)
class RatingCorrelation:
    """Spearman's rank correlation of a quantity with a rating, one pair of values a panel. Signed
    so that + means: the higher the quantity, the better the rating."""

    scale: str
    quantity: str
    panels: int
    coefficient: float
    probability: float
    text: str


@dataclass(frozen=True, slots=True)
class NextInspection:
    """When to measure next and which panels; `by_h` None where nothing presses."""

    by_h: float | None
    panels: tuple[str, ...]
    text: str
