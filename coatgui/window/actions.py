"""Every action of the window in one table: add a row, and it has a menu, a shortcut and a tip."""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True)
class Entry:
    """`method` is the main window's or of one of its helpers, called with `about` where there is
    any; `needs` is what must be there: "", campaign, work (something under way), undo or redo."""

    menu: str
    name: str
    shortcut: str
    tip: str
    method: str
    needs: str = ""
    about: str = ""


ACTIONS = (
    Entry("Campaign", "Open folder of spectra…", "Ctrl+D", "Start a campaign from a folder",
          "open_folder"),
    Entry("Campaign", "Open campaign…", "Ctrl+O", "Open a campaign file", "open_campaign"),
    Entry("Campaign", "Open the sample campaign", "", "An invented campaign to try things on",
          "open_sample"),
    Entry("Campaign", "Save as…", "Ctrl+Shift+S", "Keep the campaign as a file; edits are kept as "
          "they are made", "save_as", "campaign"),
    Entry("Campaign", "Bring in files…", "Ctrl+I", "Add spectra to this campaign", "bring_in",
          "campaign"),
    Entry("Campaign", "Watch a folder…", "", "New spectra in it are told, never taken unasked",
          "watch_folder", "campaign"),
    Entry("Campaign", "Stop watching the folder", "", "New files are no longer told",
          "stop_watching", "campaign"),
    Entry("Campaign", "Write workbook…", "Ctrl+E", "Write the assessment as a workbook",
          "write_workbook", "campaign"),
    Entry("Campaign", "Write inspection summary…", "Ctrl+Shift+E", "Write the summary as PDF or "
          "HTML", "write_summary", "campaign"),
    Entry("Campaign", "Write data (JSON)…", "", "Write the assessment as data for scripts",
          "write_data", "campaign"),
    Entry("Campaign", "Save the plot…", "Ctrl+Shift+P", "As SVG or PNG, on white", "save_picture",
          "campaign"),
    Entry("Campaign", "Keep copies in a folder…", "", "Copies are made as the work goes on, and "
          "kept by their age", "choose_copies_folder"),
    Entry("Campaign", "Keep copies beside the campaign", "", "In a folder named after it",
          "copies_beside"),
    Entry("Campaign", "Judge the readings again", "F5", "Check and fit what has changed",
          "judge_again", "campaign"),
    Entry("Campaign", "Stop the work under way", "Esc", "Nothing is left half-written",
          "halt_work", "work"),
    Entry("Campaign", "Close campaign", "Ctrl+W", "Go back to the welcome page", "close_campaign",
          "campaign"),
    Entry("Campaign", "Quit", "Ctrl+Q", "Close the program", "close"),
    Entry("Edit", "Undo", "Ctrl+Z", "Take back the last edit", "undo", "undo"),
    Entry("Edit", "Redo", "Ctrl+Shift+Z", "Do it again", "redo", "redo"),
    Entry("Edit", "Copy the plot as a picture", "Ctrl+Shift+C", "On white, in print quality",
          "copy_picture", "campaign"),
    Entry("Edit", "Copy the data as a table", "Ctrl+Shift+T", "What the plot shows, for a "
          "spreadsheet", "copy_table", "campaign"),
    Entry("Edit", "Paste a table of a spectrum", "Ctrl+V", "From the clipboard; it is shown before "
          "it is taken", "paste_table"),
    Entry("Edit", "Rename", "F2", "Another name for the row picked in the tree", "rename",
          "campaign"),
    Entry("Edit", "Remove from the campaign", "", "Take out the row picked in the tree", "remove",
          "campaign"),
    Entry("Edit", "New formulation", "", "To move panels to, by dragging them in the tree",
          "add_formulation", "campaign"),
    Entry("Go", "Map", "Ctrl+1", "Where does the campaign stand?", "go_to", "campaign", "Map"),
    Entry("Go", "Reading", "Ctrl+2", "What does this spectrum say?", "go_to", "campaign",
          "Reading"),
    Entry("Go", "Course", "Ctrl+3", "How is it going?", "go_to", "campaign", "Course"),
    Entry("Go", "Water", "Ctrl+4", "How much water does the film take up, and how fast?",
          "go_to", "campaign", "Water"),
    Entry("Go", "Comparison", "Ctrl+5", "Which is better, and are we sure?", "go_to", "campaign",
          "Comparison"),
    Entry("Go", "Doubts", "Ctrl+6", "What needs a person's eye?", "go_to", "campaign", "Doubts"),
    Entry("Go", "Summary", "Ctrl+7", "What do we hand over?", "go_to", "campaign", "Summary"),
    Entry("Go", "Settings", "Ctrl+8", "By what is this campaign judged?", "go_to", "campaign",
          "Settings"),
    Entry("Go", "Next inspection", "Ctrl+Right", "This panel, one inspection later", "later",
          "campaign"),
    Entry("Go", "Previous inspection", "Ctrl+Left", "This panel, one inspection earlier", "earlier",
          "campaign"),
    Entry("View", "Where does this number come from?", "Ctrl+H", "From the file to the number",
          "show_origin", "campaign"),
    Entry("View", "Ratings and photographs", "Ctrl+R", "What was seen on this panel", "show_seen",
          "campaign"),
    Entry("View", "History", "Ctrl+Shift+H", "What was done, by whom and when", "show_history",
          "campaign"),
    Entry("View", "Light or dark", "Ctrl+L", "Change between light and dark colours", "turn_tone"),
    Entry("Help", "Method notes", "F1", "What each number, circuit, check and test means, and the "
          "terms of the trade", "show_notes"),
    Entry("Help", "Cautions", "Shift+F1", "What the results do not say", "show_cautions"),
)  # fmt: skip
