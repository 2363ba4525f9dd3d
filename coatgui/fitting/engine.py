"""The fitting stage: spectra in, fits with limits and reasons out.

Work is shared out by series (panels), so that neighbours in time can help each other and the model
is chosen along the series; what is done with one share stands in `share`.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from coatgui.circuits import CoatingModel, catalogue
from coatgui.fitting.rules import rule
from coatgui.fitting.share import Share, fit_share
from coatgui.fitting.solver import BoolArray, FloatArray
from coatgui.progress import Progress, Spread, one_after_another
from coatgui.records import Fit, Spectrum

# Part of the key of cached results: raise it with every change that can change a result.
ENGINE_VERSION = "3"
# Shares of the work: few enough to be fast (the last rows to settle take as many steps in a small
# share as in a large one), enough of them for every processor and for progress.
_SMALLEST_SHARE, LARGEST_SHARE, _SHARES = 60, 1250, 4


def fit_spectra(
    spectra: Sequence[Spectrum],
    used: Sequence[BoolArray],
    *,
    area_cm2: Sequence[float | None],
    series: Sequence[str],
    exposure_h: Sequence[float],
    pinned: Sequence[str],
    open_lead: Spectrum | None = None,
    deviation: Sequence[FloatArray | None] | None = None,
    own_models: Sequence[CoatingModel] = (),
    progress: Progress | None = None,
    spread: Spread = one_after_another,
) -> list[Fit | None]:
    """Fit every spectrum with the catalogue and choose a model along each series.

    `used` are masks (N,) of points to fit; `series` says whose spectrum it is, `exposure_h` when;
    `pinned` names a model or is empty. `deviation` holds relative standard deviations (N,) of a
    spectrum's points up to a factor, None where all scatter alike; `own_models` stand beside the
    catalogue. The result is in the order given; None where fewer points are used than a coating
    model needs. Raises KeyError for an unknown pinned model, Cancelled.
    """
    progress = progress or Progress()
    known = {*catalogue(), *(model.model_id for model in own_models)}
    for name in pinned:
        if name and name not in known:
            raise KeyError(f"There is no coating model '{name}'.")
    fewest = rule("fewest_points")
    order = sorted(
        (i for i in range(len(spectra)) if int(used[i].sum()) >= fewest),
        key=lambda i: (series[i], exposure_h[i]),
    )
    # A multiple of a few shares, so that no processor is left without work at the end.
    share_count = _SHARES * -(-len(order) // (_SHARES * LARGEST_SHARE))
    share_size = max(_SMALLEST_SHARE, -(-len(order) // max(share_count, 1)))
    shares: list[list[int]] = []
    last = None
    for i in order:
        if not shares or (len(shares[-1]) >= share_size and series[i] != last):
            shares.append([])
        shares[-1].append(i)
        last = series[i]
    leads = None if open_lead is None else float(np.abs(open_lead.impedance_ohm).max())
    work = [
        Share(
            tuple(spectra[i] for i in share),
            tuple(used[i] for i in share),
            tuple(area_cm2[i] for i in share),
            tuple(series[i] for i in share),
            tuple(pinned[i] for i in share),
            leads,
            tuple(None if deviation is None else deviation[i] for i in share),
            tuple(own_models),
        )
        for share in shares
    ]
    fits: list[Fit | None] = [None] * len(spectra)
    done = len(spectra) - len(order)
    for share, result in zip(shares, spread(fit_share, work), strict=True):
        for i, fit in zip(share, result, strict=True):
            fits[i] = fit
        done += len(share)
        progress.at("Fitting circuits", done, len(spectra))
    return fits
