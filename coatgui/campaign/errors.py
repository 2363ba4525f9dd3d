"""What the store says when it cannot do something: always one sentence for a person."""


class CampaignFileError(Exception):
    """A campaign file cannot be used, or a change to it cannot be made. Nothing was changed."""


class CampaignTooNew(CampaignFileError):
    """The file was written by a newer version of the program."""


class CampaignDamaged(CampaignFileError):
    """The file is not as the program left it; `recover` saves what can be read."""


class OperationRefused(CampaignFileError):
    """A change was asked for that the campaign cannot take. Nothing was changed."""


class StorageFailed(CampaignFileError):
    """The disk or network folder fails or is full: offer to save elsewhere."""


class FileGone(StorageFailed):
    """The file is no longer in its place: offer to save elsewhere."""
