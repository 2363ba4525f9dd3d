"""What leaves the program: JSON, tables, workbook, inspection summary, figures, text."""

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
