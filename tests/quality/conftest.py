"""Clean spectra and faults come from the benchmark's own module, so that table and tests agree."""

from __future__ import annotations

import importlib.util
import sys
from pathlib import Path
from types import ModuleType

import pytest


def _benchmark_module(name: str) -> ModuleType:
    path = Path(__file__).parents[1] / "benchmarks" / f"{name}.py"
    spec = importlib.util.spec_from_file_location(name, path)
    assert spec is not None
    assert spec.loader is not None
    module = importlib.util.module_from_spec(spec)
    sys.modules[name] = module
    spec.loader.exec_module(module)
    return module


@pytest.fixture(scope="session")
def faults() -> ModuleType:
    return _benchmark_module("checks_faults")


@pytest.fixture(scope="session")
def moved_table(faults: ModuleType) -> ModuleType:
    return _benchmark_module("checks_moved")


@pytest.fixture(scope="session")
def benchmark_table(moved_table: ModuleType) -> ModuleType:
    return _benchmark_module("checks")
