"""Starting values, the batched least-squares solver, choice of model, limits and bounds."""

from coatgui.fitting.engine import ENGINE_VERSION, fit_spectra
from coatgui.fitting.scatter import scatter_of_repeats

__all__ = ["ENGINE_VERSION", "fit_spectra", "scatter_of_repeats"]
