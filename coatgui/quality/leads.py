"""What the leads and the instrument's input conduct, and whether a reading comes near it."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from coatgui.quality.words import hertz
from coatgui.records import BoolArray, ComplexArray, Finding, FloatArray, Severity, Spectrum


def leads_admittance(open_lead: Spectrum, frequency_hz: FloatArray) -> ComplexArray:
    """Admittance of the leads (S) at frequencies (N,): conductance and capacitance of the open-lead
    run, interpolated against the logarithm of frequency. Beyond the run the values at its ends are
    returned, which are not measured there: see `leads_measured`."""
    omega = 2.0 * np.pi * open_lead.frequency_hz[::-1]
    admittance = 1.0 / open_lead.impedance_ohm[::-1]
    wanted = 2.0 * np.pi * np.asarray(frequency_hz, dtype=np.float64)
    conductance = np.interp(np.log(wanted), np.log(omega), admittance.real)
    capacitance = np.interp(np.log(wanted), np.log(omega), admittance.imag / omega)
    return np.asarray(conductance + 1j * wanted * capacitance, dtype=np.complex128)


def leads_measured(open_lead: Spectrum, frequency_hz: FloatArray) -> BoolArray:
    """Which of the frequencies (N,) lie within the open-lead run, to 5 %."""
    run = open_lead.frequency_hz
    return np.asarray((frequency_hz < 1.05 * run[0]) & (frequency_hz > run[-1] / 1.05))


@dataclass(frozen=True, slots=True)
class Limit:
    """What is known of the measuring limit: an open-lead run, or what the instrument's maker states
    for its input; None where nothing is."""

    open_lead: Spectrum | None = None
    input_resistance_ohm: float | None = None
    input_capacitance_f: float | None = None

    def findings(self, spectrum: Spectrum, limits: dict[str, float]) -> Iterator[Finding]:
        """Whether leads or input carry much of the current of this spectrum."""
        frequency, modulus = spectrum.frequency_hz, np.abs(spectrum.impedance_ohm)
        if self.open_lead is not None:
            inside = leads_measured(self.open_lead, frequency)
            share = modulus * np.abs(leads_admittance(self.open_lead, frequency))
            yield from self._near(frequency, np.where(inside, share, 0.0), "the leads", limits)
            yield from self._beyond(frequency, inside)
        elif self.input_resistance_ohm or self.input_capacitance_f:
            conductance = 1 / self.input_resistance_ohm if self.input_resistance_ohm else 0.0
            omega = 2 * np.pi * frequency
            admittance = np.hypot(conductance, omega * (self.input_capacitance_f or 0.0))
            yield from self._near(frequency, modulus * admittance, "the instrument's input", limits)
        elif modulus.max() > limits["plausible_modulus_ohm"]:
            yield Finding(
                "no_open_lead",
                Severity.NOTE,
                f"|Z| reaches {modulus.max():.1e} Ω and there is no open-lead run: the leads may "
                "set this, so take it as a lower bound.",
                evidence=(("largest_modulus_ohm", float(modulus.max())),),
            )

    def _near(
        self, frequency: FloatArray, share: FloatArray, what: str, limits: dict[str, float]
    ) -> Iterator[Finding]:
        near = np.nonzero(share > 1.0 / limits["leads_factor"])[0]
        if not near.size:
            return
        largest = float(share.max())
        mostly = largest > limits["leads_doubt_share"]
        slow, fast = (hertz(float(frequency[p])) for p in (near[-1], near[0]))
        text = (
            f"Between {slow} and {fast} (at {near.size} frequencies) {what} would carry more than "
            f"1/{limits['leads_factor']:g} of the current, up to {100 * min(largest, 1):.0f} %: "
        )
        yield Finding(
            "measuring_limit",
            Severity.DOUBT if mostly else Severity.NOTE,
            text
            + (
                "there |Z| is theirs rather than the panel's, and a resistance is only a lower "
                "bound. Measure a larger area, or with better screened leads."
                if mostly
                else "there they count, and a resistance is a lower bound."
            ),
            tuple(near.tolist()),
            (("largest_share", largest),),
        )

    def _beyond(self, frequency: FloatArray, inside: BoolArray) -> Iterator[Finding]:
        beyond = np.nonzero(~inside)[0]
        if beyond.size and self.open_lead is not None:
            run = self.open_lead.frequency_hz
            yield Finding(
                "open_lead_range",
                Severity.NOTE,
                f"The open-lead run goes from {hertz(float(run[-1]))} to {hertz(float(run[0]))}; "
                f"{beyond.size} frequencies of this reading lie beyond it, where the measuring "
                "limit is not known. Measure the open leads over the whole sweep.",
                tuple(beyond.tolist()),
            )
