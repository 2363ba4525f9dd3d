"""Fits kept by content, as JSON, so that only what changed is fitted again.

A panel's readings are fitted as a series, each helped by its neighbours; so the fits of one panel
are kept together, under a key made of everything they rest on: the spectra, the points used, area,
exposure times, pinned models, the open lead, weights, own models and the version of the engine.
Content that cannot be read back (an older layout, damage) counts as not there.
"""

from __future__ import annotations

import hashlib
import json
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import asdict
from typing import Any, Protocol

import numpy as np

from coatgui.fitting import ENGINE_VERSION
from coatgui.records import (
    BoolArray,
    Bound,
    Fit,
    FloatArray,
    Parameter,
    Quantity,
    Spectrum,
    Trial,
)

_LAYOUT = 2


class ResultCache(Protocol):
    """Where results are kept from one assessment to the next: a campaign file is one."""

    def cached_results(self, keys: Iterable[str], /) -> dict[str, bytes]: ...

    def keep_results(self, results: Mapping[str, bytes], /) -> None: ...


def series_key(
    spectra: Sequence[Spectrum],
    used: Sequence[BoolArray],
    area_cm2: float | None,
    exposure_h: Sequence[float],
    pinned: Sequence[str],
    open_lead: Spectrum | None,
    deviation: Sequence[FloatArray | None],
    own_models: Sequence[str],
) -> str:
    """Key of the fits of one panel's series; changes with anything that the fits rest on."""
    content = {
        "layout": _LAYOUT,
        "engine": ENGINE_VERSION,
        "spectra": [spectrum.content_key() for spectrum in spectra],
        "used": [np.packbits(mask).tobytes().hex() for mask in used],
        "area_cm2": area_cm2,
        "exposure_h": list(exposure_h),
        "pinned": list(pinned),
        "open_lead": None if open_lead is None else open_lead.content_key(),
        "own_models": list(own_models),
        "deviation": [None if one is None else one.tolist() for one in deviation],
    }
    digest = hashlib.sha256(json.dumps(content, sort_keys=True).encode("utf-8"))
    return f"fits-{digest.hexdigest()}"


def fits_to_bytes(fits: Sequence[Fit | None]) -> bytes:
    return json.dumps([None if fit is None else _fit_to_json(fit) for fit in fits]).encode("utf-8")


def fits_from_bytes(content: bytes, count: int) -> list[Fit | None] | None:
    """The fits kept in `content`, or None where it does not hold `count` of them."""
    try:
        rows = json.loads(content)
        if not isinstance(rows, list) or len(rows) != count:
            return None
        return [None if row is None else _fit_from_json(row) for row in rows]
    except (ValueError, KeyError, TypeError):
        return None


def _fit_to_json(fit: Fit) -> dict[str, Any]:
    return {
        "model": fit.model,
        "model_name": fit.model_name,
        "parameters": [asdict(parameter) for parameter in fit.parameters],
        "modelled_ohm": [fit.modelled_ohm.real.tolist(), fit.modelled_ohm.imag.tolist()],
        "used": fit.used.tolist(),
        "residual_rms_percent": fit.residual_rms_percent,
        "converged": fit.converged,
        "message": fit.message,
        "trials": [asdict(trial) for trial in fit.trials],
        "log_covariance": None if fit.log_covariance is None else fit.log_covariance.tolist(),
        "optimum": None if fit.optimum is None else fit.optimum.tolist(),
    }


def _fit_from_json(row: dict[str, Any]) -> Fit:
    real, imaginary = (np.asarray(part, dtype=np.float64) for part in row["modelled_ohm"])
    covariance, optimum = row["log_covariance"], row["optimum"]
    return Fit(
        model=row["model"],
        model_name=row["model_name"],
        parameters=tuple(
            Parameter(
                symbol=p["symbol"],
                meaning=p["meaning"],
                layer=p["layer"],
                quantity=Quantity(**(p["quantity"] | {"bound": Bound(p["quantity"]["bound"])})),
            )
            for p in row["parameters"]
        ),
        modelled_ohm=real + 1j * imaginary,
        used=np.asarray(row["used"], dtype=np.bool_),
        residual_rms_percent=row["residual_rms_percent"],
        converged=row["converged"],
        message=row["message"],
        trials=tuple(Trial(**trial) for trial in row["trials"]),
        log_covariance=None if covariance is None else np.asarray(covariance, dtype=np.float64),
        optimum=None if optimum is None else np.asarray(optimum, dtype=np.float64),
    )
