"""Every Qt import of the program: views that show an assessment and send edits."""

from coatgui.window.application import run

__all__ = ["run"]
