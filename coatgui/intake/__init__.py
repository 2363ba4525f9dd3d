"""Reading what the laboratory hands over: spectra and refusals, never a half-read spectrum."""

from coatgui.intake.decode import Unreadable
from coatgui.intake.folder import (
    SPECTRUM_ENDINGS,
    UnreadableFolder,
    read_files,
    read_folder,
    read_spectra,
)

__all__ = [
    "SPECTRUM_ENDINGS",
    "Unreadable",
    "UnreadableFolder",
    "read_files",
    "read_folder",
    "read_spectra",
]
