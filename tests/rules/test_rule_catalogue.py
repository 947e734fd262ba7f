"""Which rulebooks there are, which version is in force, and what the package's own one says."""

import dataclasses
import datetime
from collections.abc import Iterator

import pytest

from audiokit.core.errors import RuleFileError
from audiokit.rules.catalogue import list_rulebooks, load_rulebook
from audiokit.rules.spec import STANDINGS, Value
from tests.rules.rule_files import RULE_FILE, install

LATE = datetime.date(2030, 1, 1)


def test_unknown_rulebooks_list_the_known_ones() -> None:
    for name in ("us-oshaa", "de-dguv", "", "../us-osha", "us-osha.toml"):
        with pytest.raises(RuleFileError) as caught:
            load_rulebook(name, LATE)
        assert repr(name) in caught.value.message
        assert all(known in caught.value.mend for known in list_rulebooks())
    with pytest.raises(RuleFileError, match="did you mean us-osha"):
        load_rulebook("us-oshaa", LATE)


def test_nothing_is_in_force_before_the_first_version() -> None:
    first = load_rulebook("us-osha", LATE).from_date
    assert load_rulebook("us-osha", first).from_date == first
    with pytest.raises(RuleFileError, match=rf"no version in force on 1983-04-06(.|\n)*{first}"):
        load_rulebook("us-osha", datetime.date(1983, 4, 6))


def test_the_latest_version_that_has_begun(tmp_path, monkeypatch) -> None:
    version = RULE_FILE[RULE_FILE.index("[[version]]") :]
    later = version.replace("2000-01-01", "2010-07-01").replace("= 15,", "= 20,")
    install(monkeypatch, tmp_path, xx_invented=RULE_FILE + later, aa_other=RULE_FILE)
    assert list_rulebooks() == ("aa-other", "xx-invented")
    dates = (datetime.date(2010, 6, 30), datetime.date(2010, 7, 1), LATE)
    books = [load_rulebook("xx-invented", date) for date in dates]
    assert [book.criteria[0].shift_at_least_db.value for book in books] == [15, 20, 20]


# Figure, clause: 29 CFR 1910.95 and 1904.10, 49 CFR 227 Appendix C, each as read in the 2015 edition; the 37 days are
# a choice of this project.
OSHA = {
    "sts.frequencies_hz": ([2000, 3000, 4000], "29 CFR 1910.95(g)(10)(i)"),
    "sts.shift_at_least_db": (10, "29 CFR 1910.95(g)(10)(i)"),
    "sts.retest_window_days": (30, "29 CFR 1910.95(g)(7)(ii)"),
    "sts.notify_days": (21, "29 CFR 1910.95(g)(8)(i)"),
    "sts.age_table": ("us_29cfr1910_95_appendix_f", "29 CFR 1910.95(g)(10)(ii)"),
    "recordable.frequencies_hz": ([2000, 3000, 4000], "29 CFR 1904.10(a)"),
    "recordable.shift_at_least_db": (10, "29 CFR 1904.10(a)"),
    "recordable.level_at_least_db": (25, "29 CFR 1904.10(a)"),
    "recordable.retest_window_days": (30, "29 CFR 1904.10(b)(4)"),
    "recordable.record_days_after_retest": (7, "29 CFR 1904.10(b)(4)"),
    "recordable.record_days_without_retest": (37, "29 CFR 1904.10(b)(4)"),
    "recordable.age_table": ("us_29cfr1910_95_appendix_f", "29 CFR 1904.10(b)(3)"),
    "revision.improvement_at_least_db": (5, "49 CFR 227 App C, II"),
    "revision.persistence_months": (6, "49 CFR 227 App C, III"),
    "schedule.periodic_test_months": (12, "29 CFR 1910.95(g)(6)"),
    "schedule.baseline_test_months": (6, "29 CFR 1910.95(g)(5)(i)"),
    "quality.required_frequencies_hz": ([500, 1000, 2000, 3000, 4000, 6000], "29 CFR 1910.95(h)(1)"),
    "quality.quiet_hours_before_baseline": (14, "29 CFR 1910.95(g)(5)(iii)"),
}


def _values(record: object, where: str = "") -> Iterator[tuple[str, Value]]:
    if isinstance(record, Value):
        yield where, record
    elif isinstance(record, tuple):
        for item in record:
            yield from _values(item, where)
    elif dataclasses.is_dataclass(record):
        here = getattr(record, "id", "")
        for field in dataclasses.fields(record):
            name = f"{here.removeprefix('us-osha.')}.{field.name}" if "." in here else field.name
            below = field.name if field.name in ("revision", "schedule", "quality") else ""
            yield from _values(getattr(record, field.name), below or (f"{where}.{name}" if where else name))


def test_every_figure_has_clause_source_and_standing() -> None:
    book = load_rulebook("us-osha", LATE)
    found = list(_values(book))
    assert len(found) >= len(OSHA)
    for where, value in found:
        assert value.at.strip(), where
        assert value.source in book.sources, where
        assert value.standing in STANDINGS, where
    for source in book.sources.values():
        assert {"title", "edition", "issuer"} <= set(source)


@pytest.mark.parametrize("figure", OSHA)
def test_the_figures_of_osha(figure: str) -> None:
    book = load_rulebook("us-osha", LATE)
    part, _, name = figure.partition(".")
    record = getattr(book, part, None) or book.criterion(f"us-osha.{part}")
    value, clause = OSHA[figure]
    found = getattr(record, name)
    assert (found.value, found.at.startswith(clause)) == (value, True), found
    assert found.standing == ("our choice" if value == 37 else "read")


def test_the_mechanics_hold_no_figure_of_the_law() -> None:
    """The criterion's parts that are words: which baseline, and what opens a retest."""
    book = load_rulebook("us-osha", LATE)
    sts, recordable = book.criteria
    assert (sts.baseline.value, recordable.baseline.value) == ("revised", "moves_at_event")
    assert list(sts.retest_started_by.value) == ["us-osha.sts"]
    assert list(recordable.retest_started_by.value) == ["us-osha.sts", "us-osha.recordable"]
    assert recordable.baseline_in_force_of is not None and recordable.baseline_in_force_of.value == "us-osha.sts"
    assert book.revision.criterion == "us-osha.sts"
    assert book.from_value.standing == "from memory, unverified"
    assert "decision support" in book.caution.casefold()
