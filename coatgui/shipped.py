"""Where the files live that travel with the program.

In a checkout `resources/` and `sample_panels/` stand beside the package; in an installed program
they lie inside it. Nothing else in the program knows the difference.
"""

from pathlib import Path

_PACKAGE = Path(__file__).resolve().parent


def _shipped(name: str) -> Path:
    for home in (_PACKAGE, _PACKAGE.parent):
        if (home / name).is_dir():
            return home / name
    raise FileNotFoundError(
        f"The folder '{name}' is missing from this installation of coatgui: install it again."
    )


def resource(*parts: str) -> Path:
    """Path of a file below `resources/`; it need not exist."""
    return _shipped("resources").joinpath(*parts)


def sample_panels() -> Path:
    """Path of the invented sample campaign. Treat it as read-only."""
    return _shipped("sample_panels")
