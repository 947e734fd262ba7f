"""The strict parser of rule files: every fault is a RuleFileError that names the file and the place."""

import datetime
from pathlib import Path

import pytest

from audiokit.core.errors import AudiokitError, RuleFileError
from audiokit.rules.spec import STANDINGS, Value, parse_rule_file, tenths
from tests.rules.rule_files import CRITERION, RULE_FILE, SOURCE, value


@pytest.fixture
def parse(tmp_path):
    def parsed(text: str):
        path = tmp_path / "xx-invented.toml"
        path.write_text(text, encoding="utf-8")
        return parse_rule_file(path)

    return parsed


def test_a_sound_file(parse) -> None:
    (book,) = parse(RULE_FILE)
    assert (book.id, book.title, book.caution, book.note) == (
        "xx-invented",
        "An invented jurisdiction",
        "Invented.",
        "",
    )
    assert book.from_date == datetime.date(2000, 1, 1)
    (criterion,) = book.criteria
    assert criterion == book.criterion("xx-invented.shift")
    assert criterion.shift_at_least_db == Value(15, "Decree 1, section 3", "decree", "our choice")
    assert criterion.level_at_least_db is criterion.age_table is criterion.notify_days is None
    assert book.revision.persistence_months.value == 3
    with pytest.raises(KeyError):
        book.criterion("us-osha.sts")


def test_versions_are_sorted_by_date(parse) -> None:
    version = RULE_FILE[RULE_FILE.index("[[version]]") :]
    books = parse(RULE_FILE + version.replace("2000-01-01", "1990-05-01").replace("= 15,", "= 20,"))
    assert [(book.from_date.year, book.criteria[0].shift_at_least_db.value) for book in books] == [
        (1990, 20),
        (2000, 15),
    ]


SECTION = SOURCE.format(n=3)
SECOND = CRITERION.replace("xx-invented.shift", "xx-invented.other")

# What is replaced by what; what the message names.
FAULTS = {
    "no toml": ("[[version]]", "[[version", "xx-invented.toml"),
    "unknown key at the top": ('id = "xx-invented"', 'id = "xx-invented"\nidd = 1', "top level: unknown key 'idd'"),
    "unknown key of a version": ("[[version]]", "[[version]]\nuntil = 1", "version 1: unknown key 'until'"),
    "unknown key of a criterion": (
        'name = "invented shift"',
        'name = "invented shift"\nweight = 2',
        "version 1.criterion xx-invented.shift: unknown key 'weight'",
    ),
    "unknown key of the revision": (
        "[version.revision]",
        "[version.revision]\ndays = 2",
        "version 1.revision: unknown key 'days'",
    ),
    "unknown key of the schedule": (
        "[version.schedule]",
        "[version.schedule]\ndays = 2",
        "version 1.schedule: unknown key 'days'",
    ),
    "unknown key of the quality": (
        "[version.quality]",
        "[version.quality]\ndays = 2",
        "version 1.quality: unknown key 'days'",
    ),
    "unknown key of a value": (
        f"value = 15, {SECTION}",
        f"value = 15, unit = 1, {SECTION}",
        "criterion xx-invented.shift.shift_at_least_db: unknown key 'unit'",
    ),
    "missing title": ('title = "An invented jurisdiction"', "", "top level: key 'title' is missing"),
    "missing criterion key": (
        f"shift_at_least_db = {value('15', 3)}",
        "",
        "version 1.criterion xx-invented.shift: key 'shift_at_least_db' is missing",
    ),
    "missing version part": (
        RULE_FILE[RULE_FILE.index("[version.schedule]") : RULE_FILE.index("[version.quality]")],
        "",
        "version 1: key 'schedule' is missing",
    ),
    "bare figure": (
        f"shift_at_least_db = {value('15', 3)}",
        "shift_at_least_db = 15",
        "xx-invented.shift.shift_at_least_db: 15 stands without a source",
    ),
    "missing clause": (
        f"value = 15, {SECTION}",
        'value = 15, source = "decree", standing = "read"',
        "shift_at_least_db: key 'at' is missing",
    ),
    "missing source": (
        f"value = 15, {SECTION}",
        'value = 15, at = "3", standing = "read"',
        "shift_at_least_db: key 'source' is missing",
    ),
    "missing standing": (
        f"value = 15, {SECTION}",
        'value = 15, at = "3", source = "decree"',
        "shift_at_least_db: key 'standing' is missing",
    ),
    "unknown source": (
        f"value = 15, {SECTION}",
        'value = 15, at = "3", source = "hearsay", standing = "read"',
        "shift_at_least_db: unknown source 'hearsay'",
    ),
    "unknown standing": (
        f"value = 15, {SECTION}",
        'value = 15, at = "3", source = "decree", standing = "certain"',
        "shift_at_least_db: unknown standing 'certain'",
    ),
    "no date": ("value = 2000-01-01", 'value = "2000-01-01"', "version 1.from: '2000-01-01' is no date"),
    "unknown statistic": ('value = "mean"', 'value = "median"', "xx-invented.shift.statistic: unknown value 'median'"),
    "unknown baseline": ('value = "revised"', 'value = "any"', "xx-invented.shift.baseline: unknown value 'any'"),
    "undefined opener": (
        '["xx-invented.shift"]',
        '["xx-invented.none"]',
        "'xx-invented.none' is not defined before it",
    ),
    "later opener": (
        CRITERION,
        CRITERION.replace('["xx-invented.shift"]', '["xx-invented.other"]') + SECOND,
        "criterion xx-invented.shift: 'xx-invented.other' is not defined before it",
    ),
    "undefined reference": (
        f"retest_window_days = {value('90', 4)}",
        f"retest_window_days = {value('90', 4)}\nbaseline_in_force_of = {value(chr(34) + 'nowhere' + chr(34))}",
        "'nowhere' is not defined before it",
    ),
    "undefined revision": (
        'criterion = "xx-invented.shift"',
        'criterion = "xx-invented.none"',
        "version 1.revision: unknown criterion 'xx-invented.none'",
    ),
    "two versions from one date": (
        RULE_FILE[RULE_FILE.index("[[version]]") :],
        RULE_FILE[RULE_FILE.index("[[version]]") :] * 2,
        "two versions start on 2000-01-01",
    ),
}


@pytest.mark.parametrize("fault", FAULTS)
def test_every_fault_names_file_and_place(parse, fault: str) -> None:
    before, after, named = FAULTS[fault]
    assert before in RULE_FILE
    with pytest.raises(RuleFileError) as caught:
        parse(RULE_FILE.replace(before, after, 1))
    assert isinstance(caught.value, AudiokitError)
    assert "xx-invented.toml" in caught.value.message
    assert named in caught.value.message
    assert caught.value.mend and caught.value.mend in str(caught.value)


def test_mends_list_what_is_known(parse) -> None:
    with pytest.raises(RuleFileError) as caught:
        parse(RULE_FILE.replace('standing = "our choice"', 'standing = "sure"', 1))
    assert all(standing in caught.value.mend for standing in STANDINGS)
    with pytest.raises(RuleFileError) as caught:
        parse(RULE_FILE.replace('source = "decree"', 'source = "x"', 1))
    assert "decree" in caught.value.mend


def test_limits_are_whole_tenths() -> None:
    def limit(number: object) -> Value:
        return Value(number, "section 3", "decree", "read")

    assert [tenths(limit(number)) for number in (10, 25.0, 0.1, 7.5, -5)] == [100, 250, 1, 75, -50]
    assert tenths(limit(10), 3) == 300
    assert tenths(limit(0.1), 3) == 3, "not 3.0000000000000004"
    with pytest.raises(RuleFileError, match=r"10\.05 dB at section 3"):
        tenths(limit(10.05))


def test_the_package_file_holds_what_its_header_says() -> None:
    """The file's sources are used, and each value names one of them; its parser accepts it whole."""
    path = Path(__file__).parents[2] / "audiokit" / "rules" / "data" / "us-osha.toml"
    (book,) = parse_rule_file(path)
    text = path.read_text(encoding="utf-8")
    assert all(f'source = "{name}"' in text for name in book.sources)
    assert [criterion.id for criterion in book.criteria] == ["us-osha.sts", "us-osha.recordable"]
