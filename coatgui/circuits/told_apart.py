"""Can the parameters of a model be told apart at all, with perfect data?

Mathematics. Where a direction in the space of parameters changes no spectrum, the Jacobian
∂ln Z/∂θ over a wide sweep has a zero singular value, at every θ. It is computed at random θ within
the search, its columns scaled to unit length; a direction that stays without effect at all of them
is a tie of the circuit itself, not of one data set. Two equal arcs that may be exchanged are no
such tie: exchange changes names, not values.
"""

from __future__ import annotations

import numpy as np

from coatgui.circuits.elements import Grid
from coatgui.circuits.layers import CoatingModel

_TRIALS = 24
_NO_EFFECT = 1e-7
_SHARE = 0.05


def tied_by_the_circuit(model: CoatingModel) -> tuple[str, ...]:
    """Symbols of free parameters that no spectrum can tell apart; empty where all can be."""
    random = np.random.default_rng(0)
    low, high = model.bounds
    middle, width = 0.5 * (low + high), high - low
    theta = middle + width * random.uniform(-0.12, 0.12, (_TRIALS, low.size))
    # Far beyond any instrument: the question is what the circuit could show.
    grid = Grid.of_hertz(np.logspace(12, -12, 145))
    evaluation = model.evaluate(theta, grid)
    slopes = evaluation.derivatives(np.reciprocal(evaluation.impedance))
    stacked = np.concatenate([slopes.real, slopes.imag], axis=2)
    length = np.linalg.norm(stacked, axis=2, keepdims=True)
    unit = stacked / np.where(length > 0, length, 1.0)
    gram = unit @ unit.transpose(0, 2, 1)
    values, vectors = np.linalg.eigh(gram)
    least = np.sqrt(np.maximum(values[:, 0], 0.0))
    if not (least < _NO_EFFECT).all():
        return ()
    share = np.abs(vectors[:, :, 0]).min(axis=0)
    return tuple(s for s, part in zip(model.symbols, share, strict=True) if part > _SHARE)
