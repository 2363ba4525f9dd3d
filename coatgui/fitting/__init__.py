"""Starting values, the batched least-squares solver, choice of model, limits and bounds."""

from coatgui.fitting.engine import ENGINE_VERSION, fit_spectra

__all__ = ["ENGINE_VERSION", "fit_spectra"]
