"""What readings, panels and formulations say: `assess(campaign)` is the one computation."""

from coatgui.assessment.assess import assess
from coatgui.assessment.cache import ResultCache

__all__ = ["ResultCache", "assess"]
