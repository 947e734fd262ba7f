"""The database is append-only, and one that is not sound is refused, never read in part."""

import os
import sqlite3
import time
from contextlib import closing

import pytest
from ordinary_user import open_folder, run_as_ordinary_user

from audiokit.core.errors import DecisionError
from audiokit.io import atomic, decisions_store
from audiokit.io.decisions import read_decisions, read_log, record_decision

FIELDS = {
    "kind": "invalidate_test",
    "person_id": "P1",
    "test_id": "T1",
    "reviewer": "R. Example",
    "role": "audiologist",
    "reason": "ear infection",
}


@pytest.fixture
def folder(tmp_path):
    for _ in range(3):
        record_decision(tmp_path, **FIELDS)
    return tmp_path


def change(folder, *statements):
    with closing(sqlite3.connect(folder / "decisions.db", isolation_level=None)) as connection:
        for statement in statements:
            connection.execute(statement)


def check_refused(folder, said):
    """Both reading and recording refuse the file, say so with the mend, and leave it as it is."""
    before = (folder / "decisions.db").read_bytes()
    for call in (read_decisions, read_log, lambda folder: record_decision(folder, **FIELDS)):
        with pytest.raises(DecisionError, match=said) as caught:
            call(folder)
        assert str(folder / "decisions.db") in caught.value.message
        assert caught.value.mend
    assert (folder / "decisions.db").read_bytes() == before


@pytest.mark.parametrize(
    "statement",
    [
        "UPDATE decision SET reason = 'other' WHERE decision_id = 1",
        "UPDATE decision SET reason = 'other'",
        "UPDATE OR REPLACE decision SET decision_id = 2 WHERE decision_id = 1",
        "DELETE FROM decision WHERE decision_id = 3",
        "DELETE FROM decision",
        "INSERT OR REPLACE INTO decision SELECT * FROM decision WHERE decision_id = 2",
        "REPLACE INTO decision SELECT * FROM decision WHERE decision_id = 3",
        "INSERT INTO decision SELECT decision_id + 5, kind, person_id, ear, test_id, criterion, takes_effect_on, "
        "recorded_at, reviewer, role, reason, undoes FROM decision WHERE decision_id = 1",
    ],
)
def test_entries_cannot_be_changed_or_deleted(folder, statement):
    before = read_log(folder)
    with pytest.raises(sqlite3.IntegrityError, match="append-only"):
        change(folder, statement)
    assert read_log(folder).equals(before)


def test_header_says_whose_file_it_is(folder):
    with closing(sqlite3.connect(folder / "decisions.db")) as connection:
        assert connection.execute("PRAGMA user_version").fetchone() == (1,)
        assert connection.execute("PRAGMA journal_mode").fetchone() == ("delete",)
        assert connection.execute("PRAGMA application_id").fetchone() != (0,)


def test_newer_version(folder):
    change(folder, "PRAGMA user_version = 2")
    check_refused(folder, "a newer format \\(2\\); this audiokit reads 1")


def test_older_version(folder):
    change(folder, "PRAGMA user_version = 0")
    check_refused(folder, "an unknown older format \\(0\\)")


def test_database_of_another_program(tmp_path):
    change(tmp_path, "CREATE TABLE decision (decision_id INTEGER PRIMARY KEY)")
    check_refused(tmp_path, "not one that audiokit wrote")


@pytest.mark.parametrize("content", [b"", b"person_id,kind\nP1,note\n", b"PK\x03\x04" + bytes(5000), bytes(4096)])
def test_file_that_is_no_database(tmp_path, content):
    (tmp_path / "decisions.db").write_bytes(content)
    check_refused(tmp_path, "is damaged|is empty|not one that audiokit wrote")


def test_folder_in_place_of_the_file(tmp_path):
    (tmp_path / "decisions.db").mkdir()
    for call in (read_decisions, lambda folder: record_decision(folder, **FIELDS)):
        with pytest.raises(DecisionError, match="cannot be opened"):
            call(tmp_path)


def test_link_to_nothing(tmp_path):
    (tmp_path / "decisions.db").symlink_to(tmp_path / "gone.db")
    with pytest.raises(DecisionError, match="link"):
        read_decisions(tmp_path)


@pytest.mark.parametrize("cut", [50, 512, 4096, 8192, -4096, -1])
def test_file_cut_short(folder, cut):
    record_decision(folder, **{**FIELDS, "reason": "long " * 4000})
    path = folder / "decisions.db"
    path.write_bytes(path.read_bytes()[:cut])
    check_refused(folder, "is damaged")


def test_pages_overwritten(folder):
    for _ in range(100):
        record_decision(folder, **{**FIELDS, "reason": "long " * 40})
    path = folder / "decisions.db"
    content = bytearray(path.read_bytes())
    content[4096:8192] = b"\xff" * 4096
    path.write_bytes(content)
    check_refused(folder, "is damaged")


def test_text_that_is_no_text(folder):
    path = folder / "decisions.db"
    path.write_bytes(path.read_bytes().replace(b"ear infection", b"ear \xff\xfe\xffection"))
    with pytest.raises(DecisionError, match="decode"):
        read_log(folder)


def test_removed_guard_or_entry_is_noticed(folder):
    trigger = decisions_store._SCHEMA[-1]
    change(folder, "DROP TRIGGER decision_no_delete")
    check_refused(folder, "were altered")
    change(folder, "DELETE FROM decision WHERE decision_id = 2", trigger)
    check_refused(folder, "some were taken out")


def test_waits_for_another_writer_then_says_so(folder, monkeypatch):
    monkeypatch.setattr(decisions_store, "BUSY_SECONDS", 0.3)
    with closing(sqlite3.connect(folder / "decisions.db", isolation_level=None)) as other:
        other.execute("BEGIN IMMEDIATE")
        start = time.monotonic()
        with pytest.raises(DecisionError, match=r"locked by another program for 0\.3 seconds"):
            record_decision(folder, **FIELDS)
        assert time.monotonic() - start >= 0.25
        assert len(read_decisions(folder)) == 3  # Reading does not wait for a writer who has not come to the end.
    assert record_decision(folder, **FIELDS) == 4


def test_disk_full(tmp_path, monkeypatch):
    def full(_handle):
        raise OSError(28, "No space left on device")

    monkeypatch.setattr(atomic.os, "fsync", full)
    with pytest.raises(DecisionError, match="disk is full"):
        record_decision(tmp_path, **FIELDS)
    assert list(tmp_path.iterdir()) == []


def test_no_room_for_another_page(folder, monkeypatch):
    real = sqlite3.connect

    def limited(*arguments, **options):
        connection = real(*arguments, **options)
        connection.execute("PRAGMA max_page_count = 1")
        return connection

    monkeypatch.setattr(decisions_store.sqlite3, "connect", limited)
    with pytest.raises(DecisionError, match="disk is full"):
        record_decision(folder, **{**FIELDS, "reason": "long " * 5000})
    monkeypatch.undo()
    assert len(read_log(folder)) == 3


def test_entry_is_not_recorded_when_the_commit_fails(folder, monkeypatch):
    real = sqlite3.connect

    class Failing(sqlite3.Connection):
        def execute(self, statement, *arguments):
            if statement == "COMMIT":
                raise sqlite3.OperationalError("disk I/O error")
            return super().execute(statement, *arguments)

    monkeypatch.setattr(decisions_store.sqlite3, "connect", lambda *a, **options: real(*a, **options, factory=Failing))
    with pytest.raises(DecisionError, match="disk I/O error"):
        record_decision(folder, **FIELDS)
    monkeypatch.undo()
    assert len(read_log(folder)) == 3


@pytest.mark.skipif(os.name == "nt", reason="Windows has no such modes")
@pytest.mark.parametrize("mode", [0o000, 0o444])
def test_a_closed_folder_is_said_with_the_mend(mode):
    imports = """
from audiokit.core.errors import DecisionError
from audiokit.io.decisions import read_log, record_decision
"""
    code = f"""
for call in (read_log, lambda folder: record_decision(folder, **{FIELDS!r})):
    try:
        call(Path(sys.argv[1]))
    except DecisionError as error:
        print(error)
"""
    with open_folder() as folder:
        (folder / "plant").mkdir()
        (folder / "plant").chmod(mode)
        said = run_as_ordinary_user(imports, code, folder / "plant")
    assert said.count("plant cannot be read (Permission denied)\n  mend: get the right") == 2
