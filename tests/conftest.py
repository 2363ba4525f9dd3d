"""Set up for every test: with COATGUI_WITHOUT_QT set, Qt behaves as if it were not installed.

Generated examples are the same in every run, so that a failure belongs to the change that made
it. COATGUI_NEW_EXAMPLES=1 draws new ones, which is how new faults are looked for."""

from __future__ import annotations

import os
import sys
from importlib.abc import MetaPathFinder
from importlib.machinery import ModuleSpec

from hypothesis import settings

settings.register_profile("same examples", derandomize=True, database=None, deadline=None)
if not os.environ.get("COATGUI_NEW_EXAMPLES"):
    settings.load_profile("same examples")

_QT = ("PySide6", "shiboken6", "pyqtgraph")


class _WithoutQt(MetaPathFinder):
    def find_spec(self, name: str, path: object = None, target: object = None) -> ModuleSpec | None:
        if name.split(".")[0] in _QT:
            raise ModuleNotFoundError(f"{name} is kept out of this run of the tests", name=name)
        return None


if os.environ.get("COATGUI_WITHOUT_QT"):
    sys.meta_path.insert(0, _WithoutQt())
