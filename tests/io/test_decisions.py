"""What reviewers decide is recorded once and for all; an undo is a new entry."""

import datetime

import pandas as pd
import pytest

from audiokit.core.errors import DecisionError
from audiokit.io.decisions import COLUMNS, KINDS, LOG_COLUMNS, read_decisions, read_log, record_decision

SIGNED = {"reviewer": "R. Example", "role": "audiologist, licence X-1", "reason": "ear infection at the test"}
INVALIDATE = {"kind": "invalidate_test", "person_id": "P1", "test_id": "T1"}


def record(folder, **fields) -> int:
    return record_decision(folder, **{**SIGNED, **fields})


def test_no_file_gives_empty_frames(tmp_path):
    assert tuple(read_decisions(tmp_path).columns) == COLUMNS
    assert tuple(read_log(tmp_path).columns) == LOG_COLUMNS
    assert len(read_decisions(tmp_path)) == len(read_log(tmp_path)) == 0
    assert list(tmp_path.iterdir()) == []
    filled = record(tmp_path, **INVALIDATE) and read_log(tmp_path)
    (tmp_path / "decisions.db").unlink()
    assert (read_log(tmp_path).dtypes == filled.dtypes).all()


def test_each_kind_is_read_back(tmp_path):
    moment = datetime.datetime(2026, 3, 1, 23, 30, 5, 999, tzinfo=datetime.timezone(datetime.timedelta(hours=-5)))
    ear = {"person_id": "P1", "ear": "left", "test_id": "T9"}
    assert record(tmp_path, recorded_at=moment, **INVALIDATE) == 1
    assert record(tmp_path, kind="revise_baseline", takes_effect_on="2025-12-31", recorded_at=moment, **ear) == 2
    assert record(tmp_path, kind="not_work_related", recorded_at=moment, **ear) == 3
    assert record(tmp_path, kind="note", person_id=" P2 ", takes_effect_on=datetime.date(2026, 1, 2)) == 4
    frame = read_decisions(tmp_path)
    assert tuple(frame.columns) == COLUMNS
    assert frame["decision_id"].dtype == "int64"
    assert frame.drop(columns=["recorded_at", "reviewer", "role", "reason"]).to_numpy().tolist() == [
        [1, "invalidate_test", "P1", None, "T1", None, "2026-03-01"],
        [2, "revise_baseline", "P1", "left", "T9", None, "2025-12-31"],
        [3, "not_work_related", "P1", "left", "T9", "us-osha.recordable", "2026-03-01"],
        [4, "note", "P2", None, None, None, "2026-01-02"],
    ]
    assert frame["recorded_at"][0] == "2026-03-02T04:30:05Z"
    assert dict(frame.loc[0, ["reviewer", "role", "reason"]]) == SIGNED


def test_time_and_date_of_recording_are_the_default(tmp_path):
    before = datetime.datetime.now().astimezone().replace(microsecond=0)
    record(tmp_path, **INVALIDATE)
    after = datetime.datetime.now().astimezone()
    entry = read_decisions(tmp_path).loc[0]
    assert before <= datetime.datetime.fromisoformat(entry["recorded_at"]) <= after
    assert entry["takes_effect_on"] in {before.date().isoformat(), after.date().isoformat()}


def test_text_is_kept_as_it_is(tmp_path):
    reason = "Größe = 'x'; DROP TABLE decision; -- 雑音\nsecond line, \u202eturned\u202c"
    record(tmp_path, **{**INVALIDATE, "person_id": "=1+1", "reason": f"  {reason}\n"})
    assert read_decisions(tmp_path).loc[0, ["person_id", "reason"]].tolist() == ["=1+1", reason]


def test_undo_and_undo_of_undo(tmp_path):
    for _ in range(3):
        record(tmp_path, **INVALIDATE)
    assert record(tmp_path, kind="undo", undoes=2) == 4
    assert read_decisions(tmp_path)["decision_id"].tolist() == [1, 3]
    assert record(tmp_path, kind="undo", undoes=4) == 5
    assert read_decisions(tmp_path)["decision_id"].tolist() == [1, 2, 3]
    assert record(tmp_path, kind="undo", undoes=5) == 6
    assert read_decisions(tmp_path)["decision_id"].tolist() == [1, 3]
    assert record(tmp_path, kind="undo", undoes=6) == 7
    assert record(tmp_path, kind="undo", undoes=2) == 8
    log = read_log(tmp_path)
    assert log["decision_id"].tolist() == list(range(1, 9))
    assert log["undoes"].tolist() == [pd.NA, pd.NA, pd.NA, 2, 4, 5, 6, 2]
    assert log["in_force"].tolist() == [True, False, True, False, True, False, True, True]


def test_undo_of_what_is_undone_or_not_there(tmp_path):
    with pytest.raises(DecisionError, match="no decision in"):
        record(tmp_path, kind="undo", undoes=1)
    assert list(tmp_path.iterdir()) == []
    record(tmp_path, **INVALIDATE)
    record(tmp_path, kind="undo", undoes=pd.Series([1])[0])
    with pytest.raises(DecisionError, match="1 is already undone by 2") as caught:
        record(tmp_path, kind="undo", undoes=1)
    assert "undo number 2" in caught.value.mend
    for number in (0, 3, -1, 2**70):
        with pytest.raises(DecisionError, match="no decision number") as caught:
            record(tmp_path, kind="undo", undoes=number)
        assert "1 to 2" in caught.value.mend
    assert len(read_log(tmp_path)) == 2


@pytest.mark.parametrize(
    ("fields", "said"),
    [
        ({"kind": "forget"}, "not a kind"),
        ({"kind": "invalidate_test", "person_id": "P1"}, "test_id is missing"),
        ({"kind": "invalidate_test", "test_id": "T1"}, "person_id is missing"),
        ({"kind": "revise_baseline", "person_id": "P1", "test_id": "T1"}, "ear is missing"),
        ({"kind": "not_work_related", "person_id": "P1", "ear": "left"}, "test_id is missing"),
        ({"kind": "note"}, "person_id is missing"),
        ({**INVALIDATE, "ear": "left"}, "takes no ear"),
        ({**INVALIDATE, "criterion": "us-osha.sts"}, "takes no criterion"),
        ({**INVALIDATE, "undoes": 1}, "undoes is 1"),
        ({**INVALIDATE, "person_id": " "}, "person_id is blank"),
        ({**INVALIDATE, "person_id": 7}, "person_id is 7, not text"),
        ({**INVALIDATE, "person_id": "P\0"}, "not text"),
        ({**INVALIDATE, "person_id": "P\ud800"}, "not text"),
        ({**INVALIDATE, "reviewer": ""}, "reviewer is blank"),
        ({**INVALIDATE, "role": "\t\n"}, "role is blank"),
        ({**INVALIDATE, "reason": " "}, "reason is blank"),
        ({**INVALIDATE, "reason": None}, "reason is None"),
        ({**INVALIDATE, "takes_effect_on": "1.3.2026"}, "takes_effect_on is '1.3.2026'"),
        ({**INVALIDATE, "takes_effect_on": "20260301"}, "takes_effect_on"),
        ({**INVALIDATE, "takes_effect_on": "2026-02-30"}, "takes_effect_on"),
        ({**INVALIDATE, "takes_effect_on": 20260301}, "takes_effect_on"),
        ({**INVALIDATE, "recorded_at": datetime.datetime(2026, 3, 1)}, "no time zone"),
        ({**INVALIDATE, "recorded_at": "2026-03-01"}, "no time zone"),
        ({"kind": "note", "person_id": "P1", "ear": "both"}, "ear is 'both'"),
        ({"kind": "undo"}, "undoes is None"),
        ({"kind": "undo", "undoes": "first"}, "not the number"),
        ({"kind": "undo", "undoes": 1, "person_id": "P1"}, "takes no person_id"),
    ],
)
def test_incomplete_or_wrong_entries_are_refused(tmp_path, fields, said):
    with pytest.raises(DecisionError, match=said) as caught:
        record(tmp_path, **fields)
    assert caught.value.mend
    assert list(tmp_path.iterdir()) == []


def test_kinds_of_the_contract():
    assert {"invalidate_test", "revise_baseline", "not_work_related", "note", "undo"} <= set(KINDS)


def test_folder_that_is_not_there(tmp_path):
    for call in (read_decisions, read_log, lambda folder: record(folder, **INVALIDATE)):
        with pytest.raises(DecisionError, match="not a folder"):
            call(tmp_path / "none")


def test_folder_with_signs_that_mean_something_in_addresses(tmp_path):
    folder = tmp_path / "a?b#c %20 é"
    folder.mkdir()
    record(folder, **INVALIDATE)
    assert len(read_decisions(folder)) == 1
    assert [entry.name for entry in folder.iterdir()] == ["decisions.db"]
