"""Synthetic spectra of the catalogue's models, for benchmarks and for tests of fit and choice.

All numbers are invented within what coated steel panels of some 10 cm² show (common practice, no
source). The grid is 57 points, eight a decade, from 100 kHz to 10 mHz, unless said otherwise.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from coatgui.circuits import CoatingModel, catalogue

FloatArray = NDArray[np.float64]

FREQUENCY_HZ = np.logspace(5, -2, 57)
SLOWEST_RAD_S = 2.0 * np.pi * FREQUENCY_HZ[-1]


@dataclass(frozen=True)
class Made:
    """`impedance` (B, N) with scatter, the `truth` (B, P) in natural coordinates."""

    model: CoatingModel
    frequency_hz: FloatArray
    impedance: NDArray[np.complex128]
    truth: FloatArray


def _between(random: np.random.Generator, low: float, high: float, size: int) -> FloatArray:
    return np.asarray(np.exp(random.uniform(np.log(low), np.log(high), size)))


def truth_of(model_id: str, size: int, random: np.random.Generator) -> FloatArray:
    """Physical parameters (B, P), drawn so that every part of the model shows in the spectrum:
    arcs differ by a factor of 30 or more in time, each is 5 % of the whole or more, and the slow
    one turns within the measured frequencies."""
    model = catalogue()[model_id]
    q_film = _between(random, 3e-10, 6e-9, size)
    # R Q of the film's arc, and of the interface's 30 times that or more.
    fast = _between(random, 1e-5, 0.1, size)
    film = fast / q_film
    slowest = 1.0 / SLOWEST_RAD_S
    slow = np.exp(random.uniform(np.log(30.0 * fast), np.log(0.4 * slowest), size))
    n_interface = random.uniform(0.75, 0.95, size)
    if model_id == "film_with_pores":
        film = _between(random, 1e5, 3e9, size)
    if model_id.startswith("bare_metal"):
        interface_ohm = _between(random, 2e2, 1e4, size)
        q_interface = _between(random, 5e-5, 5e-4, size)
    else:
        interface_ohm = film * _between(random, 0.1, 30.0, size)
        q_interface = slow**n_interface / interface_ohm
    if model_id == "pores_to_metal":
        q_interface = slowest**n_interface / (film * _between(random, 0.3, 30.0, size))
    values = {
        "R_s": _between(random, 20.0, 300.0, size),
        "Q_c": q_film,
        "n_c": random.uniform(0.92, 0.995, size),
        "R_po": film,
        "Q_dl": q_interface,
        "n_dl": n_interface,
        "R_ct": interface_ohm,
        "σ": interface_ohm * np.sqrt(SLOWEST_RAD_S) * _between(random, 0.3, 3.0, size),
    }
    return np.column_stack([values[symbol] for symbol in model.symbols])


def make(
    model_id: str,
    size: int,
    random: np.random.Generator,
    *,
    scatter: float = 0.005,
    frequency_hz: FloatArray = FREQUENCY_HZ,
) -> Made:
    """`size` spectra of one model; real and imaginary part scatter by `scatter`·|Z| each."""
    model = catalogue()[model_id]
    truth = model.natural(truth_of(model_id, size, random))
    clean = model.impedance(truth, frequency_hz)
    noise = random.standard_normal(clean.shape) + 1j * random.standard_normal(clean.shape)
    return Made(model, frequency_hz, clean + scatter * np.abs(clean) * noise, truth)
