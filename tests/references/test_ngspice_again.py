"""The kept tables of the circuit simulator are what the simulator gives now, where it is there."""

from __future__ import annotations

import shutil
import subprocess
from pathlib import Path

import numpy as np
import pytest

NETLISTS = sorted((Path(__file__).resolve().parent / "ngspice").glob("*.cir"))


@pytest.mark.skipif(shutil.which("ngspice") is None, reason="ngspice is not installed")
@pytest.mark.parametrize("netlist", NETLISTS, ids=lambda path: path.stem)
def test_the_simulator_gives_the_kept_table_again(netlist: Path, tmp_path: Path) -> None:
    shutil.copy(netlist, tmp_path)
    # Its status is 1 where a netlist prints nothing, although the table is written.
    subprocess.run(
        ["ngspice", "-b", netlist.name], cwd=tmp_path, check=False, capture_output=True, timeout=120
    )
    name = f"{netlist.stem}_ac.txt"
    kept, made = (np.loadtxt(folder / name, skiprows=1) for folder in (netlist.parent, tmp_path))
    np.testing.assert_allclose(made, kept, rtol=1e-9)
