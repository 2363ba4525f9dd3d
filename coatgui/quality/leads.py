"""What the leads alone conduct, from a run with no specimen connected."""

from __future__ import annotations

import numpy as np

from coatgui.records import ComplexArray, FloatArray, Spectrum


def leads_admittance(open_lead: Spectrum, frequency_hz: FloatArray) -> ComplexArray:
    """Admittance of the leads (S) at frequencies (N,): conductance and capacitance of the open-lead
    run, interpolated against the logarithm of frequency, and held at its ends beyond it."""
    omega = 2.0 * np.pi * open_lead.frequency_hz[::-1]
    admittance = 1.0 / open_lead.impedance_ohm[::-1]
    wanted = 2.0 * np.pi * np.asarray(frequency_hz, dtype=np.float64)
    conductance = np.interp(np.log(wanted), np.log(omega), admittance.real)
    capacitance = np.interp(np.log(wanted), np.log(omega), admittance.imag / omega)
    return np.asarray(conductance + 1j * wanted * capacitance, dtype=np.complex128)
