"""What leaves the program: JSON, tables, workbook, inspection summary, figures, text."""

from importlib import import_module
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from coatgui.output.handing_over import write_figures, write_summary
    from coatgui.output.json_form import assessment_json, write_json
    from coatgui.output.pages import PagesUnavailable, require_qt
    from coatgui.output.plain_tables import write_tables
    from coatgui.output.summary import Identification, inspection_summary
    from coatgui.output.terminal import terminal_table
    from coatgui.output.whole import write_whole
    from coatgui.output.workbook import write_workbook

__all__ = [
    "Identification",
    "PagesUnavailable",
    "assessment_json",
    "inspection_summary",
    "require_qt",
    "terminal_table",
    "write_figures",
    "write_json",
    "write_summary",
    "write_tables",
    "write_whole",
    "write_workbook",
]

_PARTS = {
    "Identification": "summary",
    "PagesUnavailable": "pages",
    "assessment_json": "json_form",
    "inspection_summary": "summary",
    "require_qt": "pages",
    "terminal_table": "terminal",
    "write_figures": "handing_over",
    "write_json": "json_form",
    "write_summary": "handing_over",
    "write_tables": "plain_tables",
    "write_whole": "whole",
    "write_workbook": "workbook",
}


def __getattr__(name: str) -> Any:
    """Loaded when first asked for, so that one part can be had without all others."""
    if name not in _PARTS:
        raise AttributeError(f"module {__name__!r} has no attribute {name!r}")
    return getattr(import_module(f"{__name__}.{_PARTS[name]}"), name)
