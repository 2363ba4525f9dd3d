"""Elements against mpmath: values to many digits, derivatives by mpmath's own differentiation, and
the graded film by quadrature of its defining integral."""

from __future__ import annotations

from collections.abc import Callable

import mpmath as mp
import numpy as np
import pytest

from coatgui.circuits import elements as el

OMEGAS = np.array([1e-4, 1e-2, 1.0, 37.0, 1e4, 1e7])


def _cpe(w: mp.mpf, q: mp.mpf, n: mp.mpf) -> mp.mpc:
    return 1 / (mp.exp(q) * mp.power(mp.mpc(0, w), n))


def _diffusion(form: Callable[[mp.mpc], mp.mpc]) -> Callable[..., mp.mpc]:
    def z(w: mp.mpf, r: mp.mpf, tau: mp.mpf) -> mp.mpc:
        root = mp.sqrt(mp.mpc(0, w) * mp.exp(tau))
        return mp.exp(r) * form(root) / root

    return z


def _graded(w: mp.mpf, c: mp.mpf, tau: mp.mpf, p: mp.mpf) -> mp.mpc:
    p = mp.exp(p)
    jwt = mp.mpc(0, w) * mp.exp(tau)
    return p / (mp.mpc(0, w) * mp.exp(c)) * mp.log((1 + jwt * mp.exp(1 / p)) / (1 + jwt))


CASES: list[tuple[el.Element, Callable[..., mp.mpc], list[list[float]]]] = [
    (el.Resistor(), lambda w, r: mp.exp(r) + 0j, [[-3.0], [20.0]]),
    (el.Capacitor(), lambda w, c: 1 / (mp.mpc(0, w) * mp.exp(c)), [[-23.0], [-9.0]]),
    (el.Inductor(), lambda w, v: mp.mpc(0, w) * mp.exp(v), [[-14.0]]),
    (
        el.SemiInfiniteDiffusion(),
        lambda w, s: mp.exp(s) * mp.mpc(1, -1) / mp.sqrt(w),
        [[5.0], [16.0]],
    ),
    (el.ConstantPhase(), _cpe, [[-21.0, 0.97], [-10.0, 0.6], [-15.0, 1.0]]),
    (el.OpenDiffusion(), _diffusion(mp.tanh), [[9.0, -6.0], [9.0, 0.3], [9.0, 12.0]]),
    (el.ClosedDiffusion(), _diffusion(mp.coth), [[9.0, -6.0], [9.0, 0.3], [9.0, 12.0]]),
    (el.GradedFilm(), _graded, [[-21.0, -8.0, -2.5], [-21.0, 3.0, -1.0], [-21.0, -12.0, -4.0]]),
]
IDS = [type(case[0]).__name__ for case in CASES]


@pytest.mark.parametrize(("element", "exact", "points"), CASES, ids=IDS)
def test_value_and_derivatives(
    element: el.Element, exact: Callable[..., mp.mpc], points: list[list[float]]
) -> None:
    grid = el.Grid(OMEGAS)
    theta = np.array(points)
    value = np.broadcast_to(element.impedance(grid, theta), (len(points), OMEGAS.size))
    slopes = np.empty((len(points), len(element.kinds), OMEGAS.size), dtype=complex)
    one = np.ones(value.shape, dtype=complex)
    element.derivatives(grid, theta, element.impedance(grid, theta), one, slopes)
    with mp.workdps(40):
        for b, point in enumerate(points):
            for m, omega in enumerate(OMEGAS):
                w = mp.mpf(float(omega))
                arguments = [mp.mpf(v) for v in point]
                wanted = exact(w, *arguments)
                assert abs(value[b, m] - complex(wanted)) <= 1e-11 * abs(complex(wanted))
                for k in range(len(point)):

                    def along(
                        x: mp.mpf, k: int = k, w: mp.mpf = w, given: list[mp.mpf] = arguments
                    ) -> mp.mpc:
                        moved = [*given]
                        moved[k] = x
                        return exact(w, *moved)

                    slope = complex(mp.diff(along, arguments[k]))
                    assert abs(slopes[b, k, m] - slope) <= 1e-9 * abs(complex(wanted))


@pytest.mark.parametrize("omega", [1e-2, 1.0, 1e3])
def test_graded_film_is_the_integral_of_its_slices(omega: float) -> None:
    """∫₀^L dx / (σ₀ e^{−x/δ} + jωε): slices in series, of time constant τ = ε/σ₀ at the outside
    and τ e^{1/p} at the inside, with C = ε/L and p = δ/L."""
    c, tau, p = 2e-10, 1e-4, 0.15
    with mp.workdps(25):
        jw = mp.mpc(0, omega)
        # x from 0 (outside) to 1 in units of the thickness; slice time constant τ e^{x/p}.
        wanted = mp.quad(lambda x: (1 / c) / (1 / (tau * mp.exp(x / p)) + jw), mp.linspace(0, 1, 9))
    theta = np.log(np.array([[c, tau, p]]))
    found = el.GradedFilm().impedance(el.Grid(np.array([omega])), theta)[0, 0]
    assert found == pytest.approx(complex(wanted), rel=1e-10)


@pytest.mark.parametrize(
    "element",
    [el.OpenDiffusion(), el.ClosedDiffusion(), el.GradedFilm()],
    ids=lambda e: type(e).__name__,
)
def test_nothing_overflows(element: el.Element) -> None:
    grid = el.Grid(np.logspace(-8, 12, 41))
    extremes = np.array([[9.0, -40.0, -6.5], [9.0, 40.0, 2.0]])[:, : len(element.kinds)]
    assert np.isfinite(element.impedance(grid, extremes)).all()
