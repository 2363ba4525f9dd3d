"""What the panel list says of a film, through the whole assessment of one panel."""

from __future__ import annotations

import math
from collections.abc import Callable

import numpy as np
import pytest

from coatgui.assessment.assess import conclude
from coatgui.assessment.fick import fickian_uptake
from coatgui.assessment.readings import start_reading
from coatgui.progress import Progress
from coatgui.records import (
    Bound,
    Campaign,
    Check,
    Fit,
    Formulation,
    Panel,
    PanelAssessment,
    Reading,
    Source,
    Spectrum,
)

Made = Callable[..., tuple[Spectrum, Fit]]
HOURS = (1.0, 2.0, 4.0, 8.0, 24.0, 72.0, 168.0, 336.0)


def _assessed(made: Made, notes: tuple[tuple[str, str], ...], first: int = 0) -> PanelAssessment:
    """A film of 80 µm, 3 vol-% at saturation, read without scatter."""
    panel = Panel("p", "P1", "f", 10.0, 80.0, temperature_c=25.0, notes=notes)
    readings, drawn = [], []
    for hours in HOURS[first:]:
        share = float(fickian_uptake(1e-9 * hours * 3600 / 80e-4**2))
        q = 5.534e-10 * math.exp(0.03 * share * math.log(78.3033))
        spectrum, fit = made({"R_s": 50.0, "Q_c": q, "n_c": 1.0, "R_po": 1e8}, percent=0.1)
        reading = Reading(f"{hours}", "p", hours, spectrum, Source("x", "0"))
        one = start_reading(reading, panel, Check(), 25.0)
        one.fit = fit
        readings.append(reading)
        drawn.append(one)
    campaign = Campaign(
        "c", "C", formulations=(Formulation("f", "F"),), panels=(panel,), readings=tuple(readings)
    )
    return conclude(campaign, drawn, Progress()).panels[0]


def test_mass_follows_from_the_density(made: Made) -> None:
    found = _assessed(made, (("film_density_g_cm3", "1.5"),))
    assert found.saturation_uptake is not None
    assert found.saturation_uptake.quantity.value == pytest.approx(3.0, abs=0.05)
    assert found.saturation_mass_percent is not None
    assert found.saturation_mass_percent.value == pytest.approx(2.0, abs=0.04)
    assert found.saturation_mass_percent.unit == "g/100 g dry film"
    assert _assessed(made, ()).saturation_mass_percent is None


def test_swelling_in_thickness_adds_water(made: Made) -> None:
    found = _assessed(made, (("wet_thickness_um", "81.6"),))
    assert found.saturation_uptake is not None
    expected = 3.0 + 100 * math.log(1.02) / math.log(78.3033)
    assert found.saturation_uptake.quantity.value == pytest.approx(expected, abs=0.05)
    assert "swollen in thickness by 2.0 percent" in found.saturation_uptake.quantity.method


def test_uncertain_thickness_widens_the_diffusion_coefficient(made: Made) -> None:
    def width(notes: tuple[tuple[str, str], ...]) -> float:
        diffusion = _assessed(made, notes).diffusion_coefficient
        assert diffusion is not None
        assert diffusion.low is not None
        assert diffusion.high is not None
        assert diffusion.low < 1e-9 < diffusion.high
        return math.log(diffusion.high / diffusion.low) / 2

    assert width((("thickness_sd_um", "4"),)) == pytest.approx(
        math.hypot(width(()), 1.96 * 2 * 0.05), rel=0.05
    )


def test_measured_dry_value_saves_a_series_that_began_late(made: Made) -> None:
    late = _assessed(made, (), first=4)
    assert late.dry_capacitance is not None
    assert late.dry_capacitance.bound is Bound.AT_MOST
    assert len(late.advice) == 1
    dry = 5.534e-11
    known = _assessed(made, (("dry_capacitance_f_per_cm2", f"{dry}"),), first=4)
    assert known.dry_capacitance is not None
    assert known.dry_capacitance.bound is Bound.TWO_SIDED
    assert known.dry_capacitance.value == pytest.approx(dry, rel=0.01)
    assert known.advice == ()


def test_laws_stand_beside_every_reading(made: Made) -> None:
    found = _assessed(made, ())
    assert found.dry_permittivity is not None
    assert found.dry_permittivity.value == pytest.approx(5.0, rel=0.01)
    assert found.saturation_uptake is not None
    laws = dict(found.saturation_uptake.by_law)
    assert laws["Brasher–Kingsbury"] == pytest.approx(3.0, abs=0.05)
    assert np.isfinite([v for v in laws.values() if v is not None]).all()
    assert found.saturation_uptake.law_low == laws["linear (layers in parallel)"]
