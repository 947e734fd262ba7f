"""`audiokit review`: how options reach the package, and what is said at the end."""

import datetime
import sys
from pathlib import Path
from types import ModuleType, SimpleNamespace

import pytest

from audiokit.cli.main import main
from audiokit.cli.review import summary_text
from audiokit.core.errors import CohortError, OutputError
from audiokit.model.cohort import FileIntake, Settings

SUMMARY = {
    "people": 401,
    "tests": 1,
    "tests_left_out": 7,
    "events": {
        "us-osha.sts": {"confirmed": 12, "no_retest": 0, "retest_open": 3},
        "us-osha.recordable": {"confirmed": 0},
    },
    "worklist": {"notify": (12, 2), "retest": (3, 0), "record": (0, 0)},
}
INTAKE = (
    FileIntake("people.csv", "people", 402, 401, 1),
    FileIntake("north.csv", "tests", 12345, 12340, 5),
)
SETTINGS = Settings(name="Plant", as_of=datetime.date(2026, 3, 1))


@pytest.fixture
def steps(monkeypatch):
    """The three steps of a review replaced by ones that note how they were called."""
    calls: dict = {}

    def read_cohort(folder, *, progress, **options):
        calls["read"] = (folder, options)
        progress("reading")
        return SimpleNamespace(settings=SETTINGS, intake=INTAKE)

    def review(cohort, progress):
        calls["review"] = cohort
        return SimpleNamespace(summary=lambda: SUMMARY)

    def write_review(findings, out, progress):
        calls["write"] = (findings.summary(), out)

    for name, step in (
        ("audiokit.io.cohort", read_cohort),
        ("audiokit.surveillance.review", review),
        ("audiokit.reports.folder", write_review),
    ):
        module = ModuleType(name)
        setattr(module, step.__name__, step)
        monkeypatch.setitem(sys.modules, name, module)
    return calls


def options(steps) -> tuple:
    read = steps["read"][1]
    return read["rulebooks"], read["as_of"], read["age_correction"], read["baseline_revision"]


def test_options_left_out_leave_the_settings_to_the_cohort(steps, tmp_path):
    assert main(["review", "plant", "--out", str(tmp_path / "out")]) == 0
    assert steps["read"][0] == Path("plant")
    assert options(steps) == (None, None, None, None)
    assert steps["write"] == (SUMMARY, tmp_path / "out")


@pytest.mark.parametrize(
    ("given", "expected"),
    [
        (["--rulebook", "us-osha", "--as-of", "2026-03-01"], (["us-osha"], datetime.date(2026, 3, 1), None, None)),
        (["--rulebook", "a", "b", "--rulebook", "c", "--age-correction"], (["a", "b", "c"], None, True, None)),
        (["--no-age-correction", "--baseline-revision", "automatic"], (None, None, False, "automatic")),
        (["--baseline-revision", "reviewed"], (None, None, None, "reviewed")),
    ],
)
def test_options_reach_the_cohort(steps, tmp_path, given, expected):
    assert main(["review", "plant", *given, "--out", str(tmp_path / "out")]) == 0
    assert options(steps) == expected
    assert main(["review", "--out", str(tmp_path / "out"), "plant", *given]) == 0
    assert options(steps) == expected


def test_output_that_cannot_be_written_is_refused_before_reading(steps, tmp_path, capsys):
    (tmp_path / "file").write_text("mine")
    (tmp_path / "plant").mkdir()
    (tmp_path / "plant" / "staff.csv").write_text("mine")
    (tmp_path / "other").mkdir()
    (tmp_path / "other" / "cohort.toml").write_text("mine")
    plant = str(tmp_path / "plant")
    for out in ("file", "plant", "other", ".", "file/below"):
        assert main(["review", plant, "--out", str(tmp_path / out)]) == 2
        said = capsys.readouterr()
        assert said.out == "" and said.err.startswith("audiokit: ") and "mend: " in said.err
    assert steps == {}


@pytest.mark.parametrize(("step", "error"), [("read", CohortError("odd", "mend")), ("write", OutputError("full"))])
def test_a_step_that_fails_ends_the_review(steps, tmp_path, monkeypatch, capsys, step, error):
    def fail(*_arguments, **_options):
        raise error

    name = {"read": "audiokit.io.cohort", "write": "audiokit.reports.folder"}[step]
    monkeypatch.setattr(sys.modules[name], {"read": "read_cohort", "write": "write_review"}[step], fail)
    assert main(["review", "plant", "--out", str(tmp_path / "out")]) == 2
    assert capsys.readouterr() == ("", f"audiokit: {error}\n")
    assert list(tmp_path.iterdir()) == []


def test_summary():
    text = summary_text(SimpleNamespace(settings=SETTINGS, intake=INTAKE), SUMMARY, Path("out"))
    assert text.splitlines() == [
        "Plant, as of 2026-03-01",
        "rulebook us-osha; age correction off; baselines revised by decisions only",
        "",
        "  file        rows read  accepted  quarantined",
        "  people.csv        402       401            1",
        "  north.csv       12345     12340            5",
        "",
        "401 people, 1 test, 7 more left out: quality.csv says why",
        "",
        "Events",
        "  us-osha.sts: 12 confirmed, 3 retest_open",
        "",
        "Worklist",
        "  action  lines  overdue",
        "  notify     12        2",
        "  retest      3        0",
        "",
        "Written to out: start with summary.html and worklist.csv.",
        "6 rows could not be used: quarantine.csv says why, and how to mend each.",
    ]


def test_summary_of_nothing():
    cohort = SimpleNamespace(
        settings=Settings("Plant", SETTINGS.as_of, ("a", "b"), True, "automatic"),
        intake=(FileIntake("people.csv", "people", 0, 0, 0),),
    )
    nothing = {"people": 0, "tests": 0, "tests_left_out": 0, "events": {}, "worklist": {}}
    text = summary_text(cohort, nothing, Path("out"))
    assert text.splitlines()[1] == "rulebook a, b; age correction on; baselines revised by the published rules"
    assert "\n0 people, 0 tests\n" in text
    assert "Events\n  none\n" in text and "Worklist\n  nothing to do\n" in text
    assert "could not be used" not in text
