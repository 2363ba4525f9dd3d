"""What readings, panels and formulations say: `assess(campaign)` is the one computation.

It is loaded when first asked for: a window that opens needs single modules of this room, and not
all that judging needs.
"""

import sys
from types import ModuleType
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from coatgui.assessment.assess import assess
    from coatgui.assessment.cache import ResultCache

__all__ = ["ResultCache", "assess"]


class _Room(ModuleType):
    @property
    def assess(self) -> Any:
        from coatgui.assessment.assess import assess

        return assess

    @assess.setter
    def assess(self, module: ModuleType) -> None:
        """Loading the module of that name puts nothing in the function's place."""

    @property
    def ResultCache(self) -> Any:
        from coatgui.assessment.cache import ResultCache

        return ResultCache


sys.modules[__name__].__class__ = _Room
