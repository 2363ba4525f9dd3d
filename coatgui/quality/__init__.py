"""Can this reading be trusted? Checks before conclusions."""

from coatgui.quality.checks import check_spectra, hertz
from coatgui.quality.leads import leads_admittance

__all__ = ["check_spectra", "hertz", "leads_admittance"]
