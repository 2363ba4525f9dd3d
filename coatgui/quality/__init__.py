"""Can this reading be trusted? Checks before conclusions."""

from coatgui.quality.checks import check_spectra, kramers_kronig_residuals
from coatgui.quality.circuit_residuals import circuit_residuals
from coatgui.quality.leads import leads_admittance
from coatgui.quality.thresholds import thresholds
from coatgui.quality.words import hertz

__all__ = [
    "check_spectra",
    "circuit_residuals",
    "hertz",
    "kramers_kronig_residuals",
    "leads_admittance",
    "thresholds",
]
