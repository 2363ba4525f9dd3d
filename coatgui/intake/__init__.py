"""Reading what the laboratory hands over: spectra and refusals, never a half-read spectrum."""

from coatgui.intake.errors import Unclear, Unreadable
from coatgui.intake.folder import (
    SPECTRUM_ENDINGS,
    UnreadableFolder,
    read_files,
    read_folder,
)
from coatgui.intake.reading import read_again, read_spectra

__all__ = [
    "SPECTRUM_ENDINGS",
    "Unclear",
    "Unreadable",
    "UnreadableFolder",
    "read_again",
    "read_files",
    "read_folder",
    "read_spectra",
]
