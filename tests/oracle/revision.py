"""The two published rules that name a test as the new baseline of an ear, on that ear's effective tests."""

from tests.oracle.dates import add_months
from tests.oracle.intervals import later_is_better_elsewhere
from tests.oracle.judging import MEAN_FREQUENCIES, Judge
from tests.oracle.records import STS, HearingTest

IMPROVEMENT = 5  # 49 CFR 227 App C, II (Rule 1); practice under 29 CFR 1910.95(g)(9), which has no number
PERSISTENCE_MONTHS = 6  # 49 CFR 227 App C, III.A (Rule 2); practice under 29 CFR 1910.95(g)(9)


def improved(judge: Judge, ear: str, sequence: list[HearingTest]) -> HearingTest | None:
    """Rule 1: better by 5 dB or more on two consecutive tests: the one with the lower mean, tie: the earlier."""
    if len(sequence) < 2:
        return None
    earlier, later = sequence[-2:]
    for test in (earlier, later):
        if not judge.is_exact(test, ear) or judge.shown_shift(test, ear) > -IMPROVEMENT:
            return None
    return later if judge.exact_level(later, ear) < judge.exact_level(earlier, ear) else earlier


def persistent(judge: Judge, ear: str, sequence: list[HearingTest]) -> HearingTest | None:
    """Rule 2: sts met on a run of consecutive tests that spans at least six calendar months."""
    run: list[HearingTest] = []
    for test in reversed(sequence):
        if not judge.is_exact(test, ear) or judge.met(STS, test, ear) != "yes":
            break
        run.insert(0, test)
    if len(run) < 2:
        return None
    first, latest = run[0], run[-1]
    if latest.tested_on < add_months(first.tested_on, PERSISTENCE_MONTHS):
        return None
    first_level, latest_level = judge.exact_level(first, ear), judge.exact_level(latest, ear)
    if first_level != latest_level:
        return first if first_level < latest_level else latest
    elsewhere = sorted({frequency for _, frequency in first.cells} - set(MEAN_FREQUENCIES))
    pairs = [(judge.threshold(first, ear, hz), judge.threshold(latest, ear, hz)) for hz in elsewhere]
    return latest if later_is_better_elsewhere(pairs) else first
