"""The words of the field as they are used in every room, with the codes that arrays carry."""

from enum import IntEnum

EARS = ("right", "left")
"""Order of ears in every array and file: right first."""

FREQUENCIES_HZ = (
    125, 250, 500, 750, 1000, 1500, 2000, 3000, 4000, 6000, 8000, 9000, 10000, 11200, 12500, 14000, 16000,
)  # fmt: skip
"""Audiometric test frequencies accepted in files. [Hz]"""

LOWEST_DB_HL = -20
HIGHEST_DB_HL = 120
"""Measured values outside these limits are taken for errors of entry. [dB HL] (common practice, no source)"""


class Response(IntEnum):
    """What a threshold cell says. Only the first two carry a level."""

    MEASURED = 0
    NO_RESPONSE = 1
    DID_NOT_TEST = 2
    COULD_NOT_TEST = 3
    NOT_RECORDED = 4


class Purpose(IntEnum):
    """Why a test was made, as the file says; BLANK where it does not."""

    BLANK = 0
    BASELINE = 1
    ANNUAL = 2
    RETEST = 3
    EXIT = 4
    OTHER = 5


class Sex(IntEnum):
    """As recorded in the people table; age tables exist for women and men only."""

    UNKNOWN = 0
    FEMALE = 1
    MALE = 2


class Met(IntEnum):
    """Three-valued answer to "is the criterion met?"; the values sort no < unknown < yes."""

    NO = 0
    UNKNOWN = 1
    YES = 2


class Bound(IntEnum):
    """How a value stands to the true one when a no response makes it an interval."""

    EXACT = 0
    AT_LEAST = 1
    AT_MOST = 2
    NONE = 3
