"""Clean spectra across the catalogue and faults to put into them, at graded strength."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass

import numpy as np

from coatgui.circuits import catalogue

FREQUENCY_HZ = np.logspace(5, -2, 71)  # ten points a decade, 50.1 Hz among them
_RANGES = {
    "R_s": (1, 2.5), "Q_c": (-10, -8.5), "R_po": (5, 9), "Q_dl": (-8, -6), "R_ct": (6, 10),
    "Q_1": (-10, -9), "R_1": (4, 7), "Q_2": (-9, -7), "R_2": (6, 9), "σ": (4, 7),
}  # fmt: skip
_BARE = {"Q_dl": (-5, -4), "R_ct": (2, 5), "σ": (1, 3)}
_SECONDS = 2.0 / FREQUENCY_HZ + 0.5  # two cycles a point and half a second for the instrument
ELAPSED = np.cumsum(_SECONDS) / _SECONDS.sum()


@dataclass(frozen=True)
class Specimen:
    """A coating model with values, per specimen of 10 cm²."""

    model: str
    values: np.ndarray

    def impedance(
        self, frequency_hz: np.ndarray = FREQUENCY_HZ, growth: np.ndarray | None = None
    ) -> np.ndarray:
        """Impedance (N,); with `growth` (N,) all resistances behind the film's face, and the
        diffusion, are multiplied by it point by point, as in a panel that changes in the sweep."""
        model = catalogue()[self.model]
        if growth is None:
            return model.impedance(model.natural(self.values[None]), frequency_hz)[0]
        grows = [s != "R_s" and s[0] in "Rσ" for s in model.symbols]
        result = np.empty(frequency_hz.size, dtype=np.complex128)
        for i, factor in enumerate(growth):
            values = np.where(grows, self.values * factor, self.values)
            result[i] = model.impedance(model.natural(values[None]), frequency_hz[i : i + 1])[0, 0]
        return result


def specimens(rng: np.random.Generator, each: int) -> Iterator[Specimen]:
    """`each` specimens of every circuit of the catalogue; some stand there under two names."""
    for name, model in catalogue().items():
        if model.layers[0].role == "porous_layer":
            continue
        ranges = {**_RANGES, **(_BARE if name.startswith("bare") else {})}
        for _ in range(each):
            values = [
                rng.uniform(0.8, 0.99) if s.startswith("n_") else 10 ** rng.uniform(*ranges[s])
                for s in model.symbols
            ]
            yield Specimen(name, np.array(values))


def scattered(rng: np.random.Generator, z: np.ndarray, share: float) -> np.ndarray:
    return z * (1 + share * (rng.standard_normal(z.size) + 1j * rng.standard_normal(z.size)))


def _turned(rng: np.random.Generator, size: float, count: int = 1) -> np.ndarray:
    """Factors that stand off by `size` in any direction."""
    return np.exp(size * np.exp(2j * np.pi * rng.random(count)))


Put = Callable[[np.random.Generator, Specimen, float, float], tuple[np.ndarray, set[int]]]


def _wild(count: int) -> Put:
    def put(
        rng: np.random.Generator, specimen: Specimen, noise: float, strength: float
    ) -> tuple[np.ndarray, set[int]]:
        z = scattered(rng, specimen.impedance(), noise)
        place = int(rng.integers(0, z.size - count + 1))
        z[place : place + count] *= _turned(rng, strength, count)
        return z, set(range(place, place + count))

    return put


def _burst(
    rng: np.random.Generator, specimen: Specimen, noise: float, strength: float
) -> tuple[np.ndarray, set[int]]:
    z = scattered(rng, specimen.impedance(), noise)
    place = int(rng.integers(0, z.size - 5))
    z[place : place + 6] = scattered(rng, z[place : place + 6], strength)
    return z, set(range(place, place + 6))


def _mains(
    rng: np.random.Generator, specimen: Specimen, noise: float, strength: float
) -> tuple[np.ndarray, set[int]]:
    z = scattered(rng, specimen.impedance(), noise)
    place = int(np.abs(FREQUENCY_HZ - rng.choice([50.0, 100.0, 250.0])).argmin())
    z[place : place + 1] *= _turned(rng, strength)
    return z, {place}


_STEP_PLACES = range(6, FREQUENCY_HZ.size - 5)


def step_forms(decay: float) -> np.ndarray:
    """Steps of one in ln Z (M, N), at all places where they are put."""
    since = np.arange(FREQUENCY_HZ.size) - np.array(_STEP_PLACES)[:, None]
    return np.where(since >= 0, np.exp(-decay * np.maximum(since, 0)), 0.0)


def _step(decay: float) -> Put:
    forms = step_forms(decay)

    def put(
        rng: np.random.Generator, specimen: Specimen, noise: float, strength: float
    ) -> tuple[np.ndarray, set[int]]:
        z = scattered(rng, specimen.impedance(), noise)
        number = int(rng.integers(len(forms)))
        place = _STEP_PLACES[number]
        z *= np.exp(rng.choice([-1, 1]) * strength * forms[number])
        return z, {place - 1, place}

    return put


def _drift(
    rng: np.random.Generator, specimen: Specimen, noise: float, strength: float
) -> tuple[np.ndarray, set[int]]:
    growth = 1 + rng.choice([-1, 1]) * strength * ELAPSED
    return scattered(rng, specimen.impedance(growth=growth), noise), set()


def _inductive(
    rng: np.random.Generator, specimen: Specimen, noise: float, strength: float
) -> tuple[np.ndarray, set[int]]:
    z = specimen.impedance()
    # The leads' inductance crosses the panel's reactance at the frequency `strength` below the top.
    omega = 2 * np.pi * FREQUENCY_HZ
    cross = int(np.abs(FREQUENCY_HZ - FREQUENCY_HZ[0] * strength).argmin())
    z = z + 1j * omega * -z.imag[cross] / omega[cross]
    return scattered(rng, z, noise), set(range(cross))


def _beyond(
    rng: np.random.Generator, specimen: Specimen, noise: float, strength: float
) -> tuple[np.ndarray, set[int]]:
    """Cables turn the phase in proportion to the frequency, past -90° at the top by `strength`."""
    z = specimen.impedance()
    turn = np.angle(z[0]) + np.pi / 2 + strength
    return scattered(rng, z * np.exp(-1j * turn * FREQUENCY_HZ / FREQUENCY_HZ[0]), noise), set()


def _phase(change: Callable[[np.ndarray], np.ndarray]) -> Put:
    def put(
        rng: np.random.Generator, specimen: Specimen, noise: float, strength: float
    ) -> tuple[np.ndarray, set[int]]:
        z = scattered(rng, specimen.impedance(), noise)
        return np.abs(z) * np.exp(1j * change(np.angle(z))), set()

    return put


@dataclass(frozen=True)
class Fault:
    """`codes` are the findings that name it; `strengths` are shares (0.1 is 10 %) unless `unit`
    says otherwise; `all_points` asks that the points themselves are suggested out."""

    name: str
    put: Put
    codes: frozenset[str]
    strengths: tuple[float, ...]
    unit: str = "%"
    all_points: bool = False


def _fault(name: str, put: Put, codes: str, *strengths: float, **more: object) -> Fault:
    return Fault(name, put, frozenset(codes.split()), strengths, **more)  # type: ignore[arg-type]


SHARES = (0.02, 0.05, 0.1, 0.2)
FAULTS = (
    _fault("one wild point", _wild(1), "wild_point mains_pick_up", *SHARES, all_points=True),
    _fault(
        "two wild neighbours", _wild(2), "wild_point mains_pick_up step", *SHARES, all_points=True
    ),
    _fault("burst of scatter", _burst, "scatter", *SHARES),
    _fault("mains pick-up", _mains, "mains_pick_up", *SHARES, all_points=True),
    _fault("step that stays", _step(0.0), "step fit_leaves_pattern", *SHARES),
    _fault("step that dies away", _step(0.3), "step fit_leaves_pattern", *SHARES),
    _fault(
        "drift of the resistances", _drift, "drift fit_leaves_pattern", 0.05, 0.1, 0.2, 0.4
    ),
    _fault(
        "inductive tail", _inductive, "positive_imaginary_part",
        0.5, 0.2, 0.1, 0.05, unit="of the top frequency",
    ),
    _fault("phase past -90°", _beyond, "negative_real_part", 0.01, 0.02, 0.05, 0.1, unit="rad"),
    _fault("turned sign", _phase(lambda phase: -phase), "wrong_sign", 1.0, unit=""),
    _fault("radians as degrees", _phase(np.radians), "phase_in_radians", 1.0, unit=""),
    _fault("degrees as radians", _phase(np.degrees), "phase_in_degrees", 1.0, unit=""),
)  # fmt: skip
