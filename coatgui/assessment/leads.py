"""What lies in parallel with every specimen, and taking it away where a person asks for that.

Leads, cage and the instrument's input conduct beside the specimen: Y = Y_specimen + Y_leads. They
are known from an open-lead run or, without one, from what the instrument's maker states for its
input, R and C in parallel. Their admittance can be taken away from every spectrum before anything
else is done with it. The spectra themselves stay as they were measured, so the setting can be taken
back; and where the leads carried more than half of the current, what is left stays a lower bound,
because it rests on their not having changed since (own choice).
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from coatgui.assessment.drawn import Drawn
from coatgui.quality import leads_admittance
from coatgui.records import Campaign, ComplexArray, Finding, Fit, FloatArray, Severity, Spectrum

# Where the leads carry more than this share of the current, nothing can be taken away.
_NEARLY_ALL = 0.9
# After the correction a value counts as the leads' where it would have to be ten times as large
# without it: results within a factor of ten of the limit are bounds, so the limit moves by ten.
_LIMIT_FACTOR = 10.0


@dataclass(frozen=True, slots=True)
class Leads:
    """`limit` is what resistances are held against; `parallel` what still lies in parallel with
    the specimen in the spectra that are worked on; `measured` what was found in parallel. Each may
    be None."""

    measured: Spectrum | None
    taken_away: bool = False

    @property
    def parallel(self) -> Spectrum | None:
        return None if self.taken_away else self.measured

    @property
    def limit(self) -> Spectrum | None:
        if self.measured is None or not self.taken_away:
            return self.measured
        return Spectrum(self.measured.frequency_hz, _LIMIT_FACTOR * self.measured.impedance_ohm)


def leads_of(campaign: Campaign) -> Leads:
    """The leads of a campaign: its open-lead run, else the input that its settings state."""
    settings = campaign.settings
    measured = campaign.open_lead or _stated_input(
        settings.input_resistance_ohm, settings.input_capacitance_f
    )
    return Leads(measured, settings.take_leads_away and measured is not None)


def _stated_input(resistance_ohm: float | None, capacitance_f: float | None) -> Spectrum | None:
    if resistance_ohm is None and capacitance_f is None:
        return None
    frequency_hz = np.logspace(7, -4, 45)
    conductance = 0.0 if resistance_ohm is None else 1.0 / resistance_ohm
    admittance = conductance + 2j * np.pi * frequency_hz * (capacitance_f or 0.0)
    return Spectrum(frequency_hz, np.reciprocal(admittance.astype(np.complex128)))


def take_away(drawn: Sequence[Drawn], leads: Leads) -> None:
    """Take the leads' admittance away from the spectra that are worked on, with a note on each; a
    point whose current was nearly all the leads' is left out."""
    if leads.measured is None or not leads.taken_away:
        return
    for d in drawn:
        spectrum = d.reading.spectrum
        parallel = leads_admittance(leads.measured, spectrum.frequency_hz)
        measured = 1.0 / spectrum.impedance_ohm
        share = np.abs(parallel) / np.abs(measured)
        hidden = share > _NEARLY_ALL
        rest: ComplexArray = np.where(hidden, measured, measured - parallel)
        d.reading = replace(
            d.reading, spectrum=Spectrum(spectrum.frequency_hz, np.reciprocal(rest))
        )
        why = "the leads carry nearly all of the current here, so nothing is left to correct"
        d.left_out = {int(p): why for p in np.flatnonzero(hidden & d.used)} | dict(d.left_out)
        d.used = d.used & ~hidden
        d.findings.append(
            Finding(
                "leads_taken_away",
                Severity.NOTE,
                "By the campaign's settings the admittance of the leads is taken away from this "
                f"spectrum before it is used; they carried up to {100 * min(share.max(), 1):.0f} % "
                "of the current.",
                evidence=(("largest_share", float(share.max())),),
            )
        )


def put_back(fit: Fit, frequency_hz: FloatArray, leads: Leads) -> Fit:
    """The fit with the leads in parallel again, to lie beside the spectrum that was measured."""
    if leads.measured is None or not leads.taken_away:
        return fit
    whole = 1.0 / fit.modelled_ohm + leads_admittance(leads.measured, frequency_hz)
    return replace(fit, modelled_ohm=1.0 / whole)
