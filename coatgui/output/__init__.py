"""What leaves the program: JSON, workbook, text."""

from coatgui.output.json_form import assessment_json, write_json
from coatgui.output.terminal import terminal_table
from coatgui.output.whole import write_whole
from coatgui.output.workbook import write_workbook

__all__ = ["assessment_json", "terminal_table", "write_json", "write_whole", "write_workbook"]
