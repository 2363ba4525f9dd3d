"""Reading what the laboratory hands over: spectra and refusals, never a half-read spectrum."""

from coatgui.intake.corrections import corrections_table, read_corrections
from coatgui.intake.errors import Unclear, Unreadable
from coatgui.intake.folder import (
    SPECTRUM_ENDINGS,
    UnreadableFolder,
    propose_files,
    propose_folder,
    read_files,
    read_folder,
)
from coatgui.intake.names import NamePattern
from coatgui.intake.proposals import Correction, DryRun, Proposal, Standing, Told
from coatgui.intake.reading import first_guess, read_again, read_as_told, read_spectra
from coatgui.intake.template import read_lists, template
from coatgui.intake.watch import FolderWatch

__all__ = [
    "SPECTRUM_ENDINGS",
    "Correction",
    "DryRun",
    "FolderWatch",
    "NamePattern",
    "Proposal",
    "Standing",
    "Told",
    "Unclear",
    "Unreadable",
    "UnreadableFolder",
    "corrections_table",
    "first_guess",
    "propose_files",
    "propose_folder",
    "read_again",
    "read_as_told",
    "read_corrections",
    "read_files",
    "read_folder",
    "read_lists",
    "read_spectra",
    "template",
]
