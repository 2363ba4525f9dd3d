"""The campaign: its records built from what was found, its file, and every change to it.

`CampaignFile` is one SQLite database. A change is an operation made by a function of `operations`
and applied by `CampaignFile.apply`; it can be undone and redone, also after closing and opening
the file, and the lines by which that works are the audit trail.
"""

from coatgui.campaign import operations
from coatgui.campaign.build import UNASSIGNED, campaign_from_found
from coatgui.campaign.changes import Change, HistoryEntry, Operation, RowChange
from coatgui.campaign.check import check_file
from coatgui.campaign.errors import CampaignFileError, CampaignTooNew, OperationRefused
from coatgui.campaign.file import CampaignFile

__all__ = [
    "UNASSIGNED",
    "CampaignFile",
    "CampaignFileError",
    "CampaignTooNew",
    "Change",
    "HistoryEntry",
    "Operation",
    "OperationRefused",
    "RowChange",
    "campaign_from_found",
    "check_file",
    "operations",
]
