"""Which readings are doubtful for a quantity, so that means say on how many of them they rest.

They stay in the means: what is taken out is a person's decision, not the program's. The table of
doubts and quantities is `resources/assessment_doubts.toml`.
"""

from __future__ import annotations

from functools import cache

from coatgui.assessment.rules import table
from coatgui.records import ReadingAssessment, Severity


@cache
def _codes(quantity: str) -> frozenset[str]:
    return frozenset(
        str(code)
        for entry in table("assessment_doubts")["doubt"]
        if quantity in entry["quantities"]
        for code in entry["codes"]
    )


def has_doubt(reading: ReadingAssessment) -> bool:
    """Whether there is a doubt about anything of the reading."""
    return any(f.severity is Severity.DOUBT for f in reading.findings)


def doubtful(reading: ReadingAssessment, quantity: str) -> bool:
    """Whether a doubt about the reading is one about this quantity of it: modulus (or
    modulus_<Hz>), coating_capacitance, pore_resistance or water_uptake."""
    codes = _codes("modulus" if quantity.startswith("modulus") else quantity)
    return any(f.severity is Severity.DOUBT and f.code in codes for f in reading.findings)
