"""The campaign: its records built from what was found, its file, and every change to it.

`CampaignFile` is one SQLite database. A change is an operation made by a function of `operations`
and applied by `CampaignFile.apply`; it can be undone and redone, also after closing and opening
the file, and the lines by which that works are the audit trail.
"""

from coatgui.campaign import operations
from coatgui.campaign.build import UNASSIGNED, campaign_from_found
from coatgui.campaign.changes import Change, HistoryEntry, Operation, RowChange
from coatgui.campaign.check import check_file
from coatgui.campaign.errors import (
    CampaignDamaged,
    CampaignFileError,
    CampaignTooNew,
    FileGone,
    OperationRefused,
    StorageFailed,
)
from coatgui.campaign.file import CampaignFile
from coatgui.campaign.lock import Holder
from coatgui.campaign.recovery import Recovered, recover

__all__ = [
    "UNASSIGNED",
    "CampaignDamaged",
    "CampaignFile",
    "CampaignFileError",
    "CampaignTooNew",
    "Change",
    "FileGone",
    "HistoryEntry",
    "Holder",
    "Operation",
    "OperationRefused",
    "Recovered",
    "RowChange",
    "StorageFailed",
    "campaign_from_found",
    "check_file",
    "operations",
    "recover",
]
