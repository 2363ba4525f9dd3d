"""The facts of the selection, in sentences with limits."""

from __future__ import annotations

from coatgui.records import Assessment, Bound, ReadingAssessment
from coatgui.window.numbers import said


def facts(reading: ReadingAssessment | None, assessment: Assessment | None) -> str:
    """What a colleague would say about the picked reading and its panel."""
    if reading is None or assessment is None:
        return ""
    lines = [f"{reading.panel}, {reading.formulation}", f"after {reading.exposure_h:g} h", ""]
    if not reading.counts:
        lines.append("This reading is kept out of every conclusion.")
    for modulus in reading.modulus:
        if modulus.quantity is None:
            lines.append(f"|Z| at {modulus.frequency_hz:g} Hz was not reached.")
        else:
            lines.append(
                f"|Z|·A at {modulus.frequency_hz:g} Hz: {said(modulus.quantity)}, "
                f"{modulus.status.value.replace('_', ' ')}."
            )
    if reading.coating_capacitance is not None:
        lines.append(
            f"Film capacitance {said(reading.coating_capacitance)}, by "
            f"{reading.coating_capacitance.method}."
        )
    if reading.water_uptake is not None:
        lines.append(
            f"Apparent water uptake {said(reading.water_uptake.quantity)}, "
            f"{reading.water_uptake.quantity.method}."
        )
    if reading.pore_resistance is not None:
        text = f"Pore resistance {said(reading.pore_resistance)}."
        if reading.pore_resistance.bound is Bound.AT_LEAST:
            text += f" {reading.pore_resistance.method[:1].upper()}"
            text += f"{reading.pore_resistance.method[1:]}."
        lines.append(text)
    panel = next((p for p in assessment.panels if p.panel_id == reading.panel_id), None)
    if panel is not None:
        said_of_it = [event.text for event in panel.events]
        said_of_it += [crossing.text for crossing in panel.limit_crossings]
        lines += ["", f"Panel {panel.panel} so far:", *said_of_it]
    lines += ["", *assessment.cautions[:1]]
    return "\n".join(lines)
