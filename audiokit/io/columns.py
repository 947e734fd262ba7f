"""Names of the columns of people and tests tables, as the file contract fixes them."""

import re

from audiokit.core.vocabulary import EARS, FREQUENCIES_HZ

PEOPLE_COLUMNS = (
    "person_id", "sex", "birth_date", "birth_year", "site", "department", "job", "hired_on", "left_on", "noise_since",
)  # fmt: skip
"""Columns of the people table that have a meaning here; any other is kept as it is."""

THRESHOLD_COLUMNS = {f"{ear}_{hz}": (e, hz) for e, ear in enumerate(EARS) for hz in FREQUENCIES_HZ}
"""Columns of a wide tests table that hold thresholds: place of the ear in EARS, and frequency. [Hz]"""

LONG_COLUMNS = ("ear", "frequency_hz", "threshold")
"""What a long tests table has instead."""

RECHECK_COLUMNS = tuple(f"{ear}_1000_recheck" for ear in EARS)
TEXT_DETAILS = ("audiometer_id", "transducer", "room_id", "tester", "results_on", "remarks")
OPTIONAL_TEST_COLUMNS = ("test_id", "purpose", "valid", "hours_since_noise", *TEXT_DETAILS, *RECHECK_COLUMNS)

TEST_COLUMNS = ("person_id", "tested_on", *OPTIONAL_TEST_COLUMNS, *LONG_COLUMNS, *THRESHOLD_COLUMNS)
"""Columns of a tests table that have a meaning here."""

_LIKE_THRESHOLD = re.compile(r"(right|left)_[0-9]+(\.[0-9]+)?")


def is_false_threshold_column(name: str) -> bool:
    """True for a name such as right_900: built like a threshold column, but of no audiometric frequency."""
    return bool(_LIKE_THRESHOLD.fullmatch(name)) and name not in THRESHOLD_COLUMNS
