"""The invented scenario: a cooperative with a sawmill, a print hall and a bottling hall.

Nobody in it exists. Every figure here is invented for the example, unless a comment names its source or standing.
"""

import datetime
from dataclasses import dataclass

DEFAULT_SEED = 20260301
DEFAULT_PEOPLE = 400
FEWEST_PEOPLE, MOST_PEOPLE = 120, 20_000
"""Fewer people have too few tests for all the faults; a sheet of many more takes minutes to write."""

FREQUENCIES_HZ = (500, 1000, 2000, 3000, 4000, 6000, 8000)
AS_OF = datetime.date(2026, 3, 1)
DELIVERED = datetime.date(2026, 3, 5)
"""The files reach a few days past AS_OF, so that some tests must be left out and counted."""
CAMPAIGN_YEARS = tuple(range(2018, 2027))

SHIFT_FREQUENCIES = slice(2, 5)
"""2000, 3000 and 4000 Hz in FREQUENCIES_HZ: what the scenario's own staff look at when they call for a retest."""

SESSION_SD_DB = 2.2
"""Scatter from test to test that all frequencies of an ear share."""
FREQUENCY_SD_DB = (2.8, 2.8, 2.8, 2.8, 2.8, 4.3, 4.3)
"""Scatter from test to test of each frequency alone. With rounding to 5 dB and SESSION_SD_DB this makes the difference
of two tests scatter by about 5.5 dB at one frequency and 4 dB in the mean of 2000, 3000, 4000 Hz (general literature:
5–7 dB and 4–5 dB; from memory, unverified)."""

SHARE_8000_OF_6000 = 0.6
"""ISO 1999 has no values at 8000 Hz: noise growth there is taken as this share of that at 6000 Hz (invented)."""


@dataclass(frozen=True)
class Job:
    """A job with its noise exposure level at the ear, normalized to an 8-hour day. [dB]"""

    title: str
    department: str
    level_db: float


@dataclass(frozen=True)
class Site:
    """A workplace that delivers its own file.

    campaign_month, campaign_day, campaign_length : the yearly tests start on this day and last so many days
    booth_limit_db : highest level its audiometers can present, at 8000 Hz and elsewhere
    reviewer : name and role of the (invented) professional who answers proposals; blank where nobody has yet
    """

    name: str
    prefix: str
    campaign_month: int
    campaign_day: int
    campaign_length: int
    booth_limit_db: tuple[int, int]
    audiometers: tuple[str, ...]
    reviewer: tuple[str, str]
    jobs: tuple[Job, ...]


SITES = (
    Site(
        "sawmill", "S", 9, 1, 40, (90, 100), ("SAW-1", "SAW-2"),
        ("R. Example", "audiologist (invented licence A-01)"),
        (
            Job("head sawyer", "sawing", 94), Job("debarker operator", "sawing", 96),
            Job("planer operator", "planing", 97),
            Job("yard driver", "yard", 86),
            Job("saw sharpener", "workshop", 90), Job("office clerk", "office", 65),
        ),
    ),
    Site(
        "print hall", "P", 5, 4, 45, (90, 100), ("PRINT-A", "PRINT-B"), ("", ""),
        (
            Job("press operator", "presses", 91), Job("folder operator", "finishing", 93),
            Job("binder", "finishing", 87), Job("paper store keeper", "store", 80), Job("typesetter", "office", 65),
        ),
    ),
    Site(
        "bottling hall", "B", 1, 19, 46, (70, 80), ("BOT-7",),
        ("T. Sample", "occupational physician (invented licence P-22)"),
        (
            Job("filler operator", "filling", 94), Job("labeller operator", "filling", 91),
            Job("palletiser", "dispatch", 88), Job("forklift driver", "dispatch", 83),
            Job("laboratory worker", "laboratory", 65),
        ),
    ),
)  # fmt: skip

EXPOSED_FROM_DB = 80.0
"""People in jobs from this level on have a `noise_since` date and sit in the programme for noise."""
