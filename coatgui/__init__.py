"""coatgui: coated test panels judged from their impedance spectra."""

__version__ = "0.1.0"
