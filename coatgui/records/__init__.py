"""The vocabulary: the frozen records that every room speaks in.

Conventions, everywhere in the program:

* exp(+jωt): a capacitor has a negative imaginary part (ASTM G3).
* SI units, except area in cm², thickness in µm and exposure time in h, as the trade writes them.
  Units live in names.
* The points of a spectrum run from the highest frequency to the lowest; a point is known by its
  place in that order. A point is never removed from a spectrum, only left out with a reason.
* Where a number can be uncertain it is a `Quantity`: value, 95 % limits, kind of bound, unit.
"""

from coatgui.records.campaign import (
    Campaign,
    Criterion,
    Formulation,
    Panel,
    Reading,
    Settings,
)
from coatgui.records.measured import (
    BoolArray,
    Bound,
    Column,
    ComplexArray,
    Dialect,
    FloatArray,
    Found,
    FoundPanel,
    FoundReading,
    ModulusStatus,
    Refusal,
    Severity,
    Source,
    Spectrum,
)
from coatgui.records.results import (
    ActiveArea,
    Assessment,
    Breakpoint,
    Check,
    Course,
    CoursePoint,
    Event,
    Finding,
    Fit,
    FormulationAssessment,
    LeftOutPoint,
    LimitCrossing,
    Modulus,
    PanelAssessment,
    Parameter,
    Quantity,
    Rank,
    ReadingAssessment,
    Trial,
    WaterUptake,
)

__all__ = [
    "ActiveArea",
    "Assessment",
    "BoolArray",
    "Bound",
    "Breakpoint",
    "Campaign",
    "Check",
    "Column",
    "ComplexArray",
    "Course",
    "CoursePoint",
    "Criterion",
    "Dialect",
    "Event",
    "Finding",
    "Fit",
    "FloatArray",
    "Formulation",
    "FormulationAssessment",
    "Found",
    "FoundPanel",
    "FoundReading",
    "LeftOutPoint",
    "LimitCrossing",
    "Modulus",
    "ModulusStatus",
    "Panel",
    "PanelAssessment",
    "Parameter",
    "Quantity",
    "Rank",
    "Reading",
    "ReadingAssessment",
    "Refusal",
    "Settings",
    "Severity",
    "Source",
    "Spectrum",
    "Trial",
    "WaterUptake",
]
