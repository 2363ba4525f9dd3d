"""What the store says when it cannot do something: always one sentence for a person."""


class CampaignFileError(Exception):
    """A campaign file cannot be used, or a change to it cannot be made. Nothing was changed."""


class CampaignTooNew(CampaignFileError):
    """The file was written by a newer version of the program."""


class OperationRefused(CampaignFileError):
    """A change was asked for that the campaign cannot take. Nothing was changed."""
