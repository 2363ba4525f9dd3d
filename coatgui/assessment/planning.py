"""What to measure next: early readings for the dry film, and the next inspection.

Early readings: while the share taken up is below 0.6 it follows M = (2/L)√(Dt/π), so a share M is
reached at t = π M² L²/(4D). Four readings at shares of 0.15 to 0.6 fix the line to the dry film.

Next inspection: a rejected last reading is to be repeated; an onset that only the last reading
shows is to be confirmed; a panel on its way to a limit is to be seen half-way before it gets there,
at the pace of its last three readings. Where nothing presses, the step of the inspections so far
goes on.
"""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np

from coatgui.assessment.courses import inspections
from coatgui.assessment.rules import rule, table
from coatgui.assessment.words import hours, listed, power_of_ten
from coatgui.records import (
    Bound,
    Criterion,
    NextInspection,
    PanelAssessment,
    ReadingAssessment,
)

_SHARES = (0.15, 0.3, 0.45, 0.6)
_CM_PER_UM, _SECONDS_PER_HOUR = 1e-4, 3600.0


def early_times_h(thickness_um: float, diffusion_cm2_s: float) -> tuple[float, ...]:
    """Exposure times in h at which a film has taken up 0.15, 0.3, 0.45 and 0.6 of its water."""
    pace = (thickness_um * _CM_PER_UM) ** 2 / diffusion_cm2_s / _SECONDS_PER_HOUR
    return tuple(math.pi * share**2 / 4 * pace for share in _SHARES)


def early_advice(panel: PanelAssessment, sisters: Sequence[PanelAssessment]) -> tuple[str, ...]:
    """When the next panels of this kind should be read early on; nothing where the dry film is
    known. D is that of the sister panels where they have one, else the usual range."""
    dry = panel.dry_capacitance
    if panel.thickness_um is None or (dry is not None and dry.bound is Bound.TWO_SIDED):
        return ()
    known = [
        p.diffusion_coefficient.value
        for p in sisters
        if p.diffusion_coefficient is not None and p.diffusion_coefficient.value
    ]
    data = table("water")["diffusion"]
    if known:
        middle = float(np.exp(np.mean(np.log(known))))
        how = f"sister panels have D = {power_of_ten(middle, 1)} cm²/s"
    else:
        middle = math.sqrt(float(data["low"]) * float(data["high"]))
        usual = " to ".join(power_of_ten(float(data[end])) for end in ("low", "high"))
        how = f"D is taken as {power_of_ten(middle, 1)} cm²/s, usual are {usual}"
    times = early_times_h(panel.thickness_um, middle)
    text = (
        f"To have the dry film, read the next panel like {panel.panel} ({panel.thickness_um:g} µm) "
        f"at about {listed([_short(t) for t in times])} h, or measure it dry; {how}."
    )
    if not known:
        fast = early_times_h(panel.thickness_um, float(data["high"]))
        text += f" If water is as fast as it gets, the last of them is due at {_short(fast[-1])} h."
    return (text,)


def _short(time_h: float) -> str:
    return f"{time_h:.1g}" if time_h < 1 else f"{time_h:.2g}"


def next_inspection(
    panels: Sequence[PanelAssessment],
    readings: Sequence[ReadingAssessment],
    criteria: Sequence[Criterion],
) -> NextInspection | None:
    """When to measure next and which panels; None where there are no readings."""
    groups = inspections([r.exposure_h for r in readings])
    if not groups:
        return None
    now = groups[-1][-1]
    step = now - groups[-2][-1] if len(groups) > 1 else max(now, 1.0)
    by_panel: dict[str, list[ReadingAssessment]] = {}
    for reading in readings:
        by_panel.setdefault(reading.panel_id, []).append(reading)
    repeat, confirm = [], []
    nearing: list[tuple[float, str]] = []
    for panel in panels:
        own = by_panel.get(panel.panel_id, [])
        if not own:
            continue
        if not own[-1].counts:
            repeat.append(panel.panel)
            continue
        if any(not event.confirmed for event in panel.events):
            confirm.append(panel.panel)
        broken = {c.criterion for c in panel.limit_crossings if c.by_h is not None}
        times = [_half_way(own, c) for c in criteria if c not in broken and panel.area_cm2]
        times = [t for t in times if t is not None and t < now + step]
        if times:
            nearing.append((min(t for t in times if t is not None), panel.panel))
    return _planned(now, step, repeat, confirm, nearing)


def _half_way(own: Sequence[ReadingAssessment], criterion: Criterion) -> float | None:
    """Half-way in time to the limit at the pace of the last three readings; None where the panel is
    not on its way there."""
    points: list[tuple[float, float]] = []
    for reading in own:
        modulus = reading.modulus_at(criterion.frequency_hz) if reading.counts else None
        if modulus is not None and modulus.quantity is not None and modulus.quantity.value:
            if modulus.quantity.bound is not Bound.TWO_SIDED:
                points.clear()
                continue
            points.append((reading.exposure_h, math.log10(modulus.quantity.value)))
    if len(points) < 3 or points[-1][0] == points[-3][0]:
        return None
    t, y = np.array(points[-3:]).T
    pace = (y[-1] - y[0]) / (t[-1] - t[0])
    above = y[-1] - math.log10(criterion.ohm_cm2)
    if pace >= 0 or above <= 0:
        return None
    return float(t[-1] + above / -pace / 2)


def _planned(
    now: float,
    step: float,
    repeat: list[str],
    confirm: list[str],
    nearing: list[tuple[float, str]],
) -> NextInspection:
    said = []
    due = now + step
    if repeat:
        said.append(f"repeat the last reading of {listed(repeat)} now, it was rejected")
        due = now
    if nearing:
        soonest = max(min(nearing)[0], now + rule("planning.least_step_h"))
        names = listed([name for _, name in nearing])
        said.append(f"read {names} by {hours(float(f'{soonest:.3g}'))}, on the way to a limit")
        due = min(due, soonest)
    if confirm:
        soonest = now + step / 2
        said.append(
            f"read {listed(confirm)} by {hours(float(f'{soonest:.3g}'))} to confirm what only "
            "the last reading shows"
        )
        due = min(due, soonest)
    named = list(dict.fromkeys([*repeat, *(name for _, name in nearing), *confirm]))
    rest = f"all panels by {hours(float(f'{now + step:.3g}'))}, if the step so far is kept"
    said.append(rest if not said else f"then {rest}")
    text = "; ".join(said)
    return NextInspection(due, tuple(named), text[:1].upper() + text[1:] + ".")
