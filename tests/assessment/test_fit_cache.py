"""Fits go into the cache and come back equal; keys change with everything they rest on."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np
import pytest

from coatgui.assessment.cache import fits_from_bytes, fits_to_bytes, series_key
from coatgui.records import Bound, Fit, Spectrum, Trial

Made = Callable[..., tuple[Spectrum, Fit]]
CLOSED = {"R_s": 50.0, "Q_c": 1e-9, "n_c": 0.97}


def test_fits_come_back_as_they_were(made: Made) -> None:
    from dataclasses import replace

    _, fit = made(CLOSED, bounds={"R_s": Bound.AT_MOST}, covariance=np.diag([0.1, 0.2, 0.3]))
    fit = replace(fit, trials=(Trial("closed_film", 3, 0.5, -12.5, "taken"),))
    kept = fits_from_bytes(fits_to_bytes([fit, None]), 2)
    assert kept is not None
    back, nothing = kept
    assert nothing is None
    assert back is not None
    assert back.parameters == fit.parameters
    assert back.trials == fit.trials
    np.testing.assert_array_equal(back.modelled_ohm, fit.modelled_ohm)
    np.testing.assert_array_equal(back.used, fit.used)
    np.testing.assert_array_equal(back.log_covariance, fit.log_covariance)
    assert (back.model, back.converged, back.message) == (fit.model, fit.converged, fit.message)


@pytest.mark.parametrize(
    "content", [b"", b"{}", b"[1]", b'[{"model": 1}]', b"\xff\xfe", b"[null, null]"]
)
def test_what_cannot_be_read_back_counts_as_not_there(content: bytes) -> None:
    assert fits_from_bytes(content, 1) is None


def test_key_changes_with_everything_it_rests_on(made: Made) -> None:
    spectrum, fit = made(CLOSED)
    other, _ = made(CLOSED | {"R_s": 51.0})
    mask = fit.used.copy()
    mask[3] = False
    same: dict[str, Any] = {
        "spectra": [spectrum],
        "used": [fit.used],
        "area_cm2": 10.0,
        "exposure_h": [24.0],
        "pinned": [""],
        "open_lead": None,
        "deviation": [None],
        "own_models": [],
    }
    changed: dict[str, Any] = {
        "spectra": [other],
        "used": [mask],
        "area_cm2": None,
        "exposure_h": [25.0],
        "pinned": ["closed_film"],
        "open_lead": other,
        "deviation": [np.ones(fit.used.size)],
        "own_models": ["{}"],
    }
    keys = {series_key(**(same | {name: value})) for name, value in changed.items()}
    assert len(keys) == len(changed)
    assert series_key(**same) not in keys
    assert series_key(**same) == series_key(**same)
