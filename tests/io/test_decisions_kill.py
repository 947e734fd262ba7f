"""Several writers at once, and writers that are killed: no acknowledged decision is lost, the file stays sound."""

import os
import random
import sqlite3
import subprocess
import sys
import time
from contextlib import closing

import pytest
from kill_steps import killed_before_each_step
from ordinary_user import open_folder, run_as_ordinary_user

from audiokit.io.decisions import read_decisions, read_log, record_decision

pytestmark = pytest.mark.skipif(os.name == "nt", reason="no SIGKILL on Windows")

SIGNED = {"reviewer": "R. Example", "role": "audiologist", "reason": "ear infection"}

WRITER = """
import itertools, sys
from audiokit.io.decisions import record_decision
folder, writer, times = sys.argv[1], sys.argv[2], int(sys.argv[3])
print("ready", flush=True)
sys.stdin.readline()
for count in itertools.islice(itertools.count(), times or None):
    reason = f"{writer} {count} " + "x" * (count * 997 % 9000)
    number = record_decision(
        folder, kind="note", person_id="P1", reviewer="R. Example", role="audiologist", reason=reason
    )
    print(number, count, flush=True)
"""

LEAVE_HALF_WRITTEN = """
import os, signal, sqlite3, sys
connection = sqlite3.connect(sys.argv[1], isolation_level=None)
connection.execute("PRAGMA cache_size = 1")  # Changed pages go to the file before the end of the transaction.
connection.execute("BEGIN IMMEDIATE")
for number in range(4, 60):
    connection.execute(
        "INSERT INTO decision (decision_id, kind, takes_effect_on, recorded_at, reviewer, role, reason) "
        "VALUES (?, 'note', '2026-03-01', '2026-03-01T00:00:00Z', 'R', 'r', ?)",
        (number, "half written " * 500),
    )
os.kill(os.getpid(), signal.SIGKILL)
"""


def start_writer(folder, writer: int, times: int = 0) -> subprocess.Popen:
    command = [sys.executable, "-c", WRITER, str(folder), str(writer), str(times)]
    child = subprocess.Popen(command, stdin=subprocess.PIPE, stdout=subprocess.PIPE, text=True)
    assert child.stdout.readline() == "ready\n"
    return child


def release(child: subprocess.Popen) -> bool:
    child.stdin.write("go\n")
    child.stdin.flush()
    return True


def acknowledged(output: str, writer: int) -> dict[int, str]:
    """Number -> how its reason starts, for every line that the writer finished."""
    lines = (line.split() for line in output.split("\n")[:-1])
    return {int(number): f"{writer} {count} " for number, count in lines}


def check_all_there(folder, expected: dict[int, str]):
    log = read_log(folder)
    assert log["decision_id"].tolist() == list(range(1, len(log) + 1))
    reasons = dict(zip(log["decision_id"], log["reason"] + " ", strict=True))
    assert all(reasons[number].startswith(start) for number, start in expected.items())
    return log


def test_many_writers_at_once(tmp_path):
    """They all start on a folder without a file, so they also race to create it."""
    children = [start_writer(tmp_path, writer, times=25) for writer in range(6)]
    for child in children:
        release(child)
    expected = {}
    for writer, child in enumerate(children):
        output, _ = child.communicate(timeout=60)
        assert child.returncode == 0
        own = acknowledged(output, writer)
        assert list(own) == sorted(own) and len(own) == 25 and not expected.keys() & own.keys()
        expected.update(own)
    assert len(check_all_there(tmp_path, expected)) == len(expected) == 150
    assert [entry.name for entry in tmp_path.iterdir()] == ["decisions.db"]


def test_killed_at_random_moments(tmp_path):
    rng = random.Random(20260302)
    expected: dict[int, str] = {}
    for round_number in range(15):
        writers = (2 * round_number, 2 * round_number + 1)
        children = [start_writer(tmp_path, writer) for writer in writers]
        outputs = [release(child) and child.stdout.readline() for child in children]
        time.sleep(rng.random() * 0.06)
        for child in children:
            child.kill()
            time.sleep(rng.random() * 0.01)
        for writer, child, output in zip(writers, children, outputs, strict=True):
            output += child.stdout.read()  # communicate() may skip what was read ahead
            expected.update(acknowledged(output, writer))
            child.wait()
        log = check_all_there(tmp_path, expected)
        assert len(log) <= len(expected) + len(writers) * (round_number + 1)
    assert len(expected) >= 30
    assert record_decision(tmp_path, kind="note", person_id="P1", **SIGNED) == len(log) + 1


CREATE = """
import sys
from audiokit.io.decisions import record_decision

def run():
    record_decision(sys.argv[1], kind="note", person_id="P1", reviewer="R. Example", role="r", reason="x")
"""


def test_killed_before_each_step_of_the_first_recording(tmp_path):
    counts = []
    for _ in killed_before_each_step(CREATE, tmp_path):
        counts.append(len(read_log(tmp_path)))
        (tmp_path / "decisions.db").unlink(missing_ok=True)
    assert set(counts) == {0, 1} and counts[-1] == 1
    assert record_decision(tmp_path, kind="note", person_id="P1", **SIGNED) == 1
    assert [entry.name for entry in tmp_path.iterdir()] == ["decisions.db"]


def leave_half_written(folder):
    for _ in range(3):
        record_decision(folder, kind="note", person_id="P1", **SIGNED)
    before = read_log(folder)
    child = subprocess.run([sys.executable, "-c", LEAVE_HALF_WRITTEN, str(folder / "decisions.db")])
    assert child.returncode == -9
    assert (folder / "decisions.db-journal").stat().st_size > 0
    assert b"half written" in (folder / "decisions.db").read_bytes()
    return before


def test_reading_rolls_back_what_a_killed_writer_left(tmp_path):
    before = leave_half_written(tmp_path)
    assert read_log(tmp_path).equals(before)
    assert [entry.name for entry in tmp_path.iterdir()] == ["decisions.db"]
    with closing(sqlite3.connect(tmp_path / "decisions.db")) as connection:
        assert connection.execute("PRAGMA integrity_check").fetchall() == [("ok",)]


def test_recording_rolls_back_what_a_killed_writer_left(tmp_path):
    leave_half_written(tmp_path)
    assert record_decision(tmp_path, kind="note", person_id="P1", **SIGNED) == 4
    assert read_decisions(tmp_path)["decision_id"].tolist() == [1, 2, 3, 4]


IMPORTS = """
from audiokit.core.errors import DecisionError
from audiokit.io.decisions import record_decision
from audiokit.io.decisions_store import reading
"""
TRY_BOTH = """
signed = {"reviewer": "R. Example", "role": "audiologist", "reason": "ear infection"}
try:
    with reading(Path(sys.argv[1])) as connection:
        print("read", connection and connection.execute("SELECT count(*) FROM decision").fetchone()[0])
except DecisionError as error:
    print("read:", error)
try:
    print("recorded", record_decision(sys.argv[1], kind="note", person_id="P1", **signed))
except DecisionError as error:
    print("recorded:", error)
"""


@pytest.mark.parametrize("file_mode", [0o644, 0o666])
def test_read_only_folder_can_be_read(file_mode):
    with open_folder() as folder:
        record_decision(folder, kind="note", person_id="P1", **SIGNED)
        (folder / "decisions.db").chmod(file_mode)
        folder.chmod(0o555)
        said = run_as_ordinary_user(IMPORTS, TRY_BOTH, folder)
        folder.chmod(0o755)
        assert said.startswith("read 1\nrecorded: ") and "mend: get the right" in said
        assert "cannot be opened or written" in said and str(folder) in said
        assert [entry.name for entry in folder.iterdir()] == ["decisions.db"]
        assert len(read_log(folder)) == 1


def test_read_only_folder_without_a_file():
    with open_folder() as folder:
        folder.chmod(0o555)
        said = run_as_ordinary_user(IMPORTS, TRY_BOTH, folder)
        assert said.startswith("read None\nrecorded: ") and "Permission denied" in said and "mend: " in said
        folder.chmod(0o755)
        assert list(folder.iterdir()) == []


def test_file_that_may_not_be_read():
    with open_folder() as folder:
        record_decision(folder, kind="note", person_id="P1", **SIGNED)
        (folder / "decisions.db").chmod(0o000)
        folder.chmod(0o555)
        said = run_as_ordinary_user(IMPORTS, TRY_BOTH, folder)
        folder.chmod(0o755)
        assert said.count("cannot be opened or written") == 2


def test_read_only_folder_with_a_half_written_entry_is_not_guessed_at():
    with open_folder() as folder:
        leave_half_written(folder)
        folder.chmod(0o555)
        said = run_as_ordinary_user(IMPORTS, TRY_BOTH, folder)
        folder.chmod(0o755)
        assert said.count("interrupted recording must be rolled back first") == 2
        assert read_decisions(folder)["decision_id"].tolist() == [1, 2, 3]
