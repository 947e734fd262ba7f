"""kill -9 at any moment leaves the old folder whole or the new one whole, and the user's files in it."""

import os
import random
import subprocess
import sys
import time
from pathlib import Path

import pytest

from audiokit.io.atomic import replace_folder

pytestmark = pytest.mark.skipif(os.name == "nt", reason="no SIGKILL on Windows")

OWN = frozenset(f"{number}.csv" for number in range(6))

CHILD = """
import errno, os, signal, sys
from pathlib import Path
from audiokit.io import atomic

target, way, kill_at = Path(sys.argv[1]), sys.argv[2], int(sys.argv[3])
if way == "two moves":
    def refuse(*_paths):
        raise OSError(errno.EINVAL, "Invalid argument")
    atomic.exchange = refuse

count = 0
def hook(event, _arguments):
    global count
    if event.startswith(("os.", "open", "shutil.", "ctypes.")):
        count += 1
        if count == kill_at:
            os.kill(os.getpid(), signal.SIGKILL)

def fill(folder):
    for number in range(6):
        (folder / f"{number}.csv").write_text(content)

own = frozenset(f"{number}.csv" for number in range(6))
if kill_at:
    content = "new" * 20_000
    sys.addaudithook(hook)
    atomic.replace_folder(target, fill, own)
    kill_at = -1
else:
    generation = 0
    while True:
        content = f"{os.getpid()} {generation}" * 2_000
        atomic.replace_folder(target, fill, own)
        print(generation, flush=True)
        generation += 1
"""


def put_old(target: Path) -> None:
    replace_folder(target, lambda folder: [(folder / name).write_text("old") for name in OWN], OWN)


def whole(folder: Path) -> str:
    """The one content that all own files share; the user's file must be there."""
    assert (folder / "notes").read_text() == "mine"
    assert {entry.name for entry in folder.iterdir()} == OWN | {"notes"}
    contents = {(folder / name).read_text() for name in OWN}
    assert len(contents) == 1
    return contents.pop()


def check_after_kill(target: Path, way: str) -> str:
    if way == "two moves" and not target.exists():
        (aside,) = target.parent.glob(".out.*.old")
        return whole(aside)
    return whole(target)


@pytest.mark.parametrize("way", ["exchange", "two moves"])
def test_killed_before_each_step(tmp_path, way):
    target = tmp_path / "out"
    put_old(target)
    (target / "notes").write_text("mine")
    seen = []
    for step in range(1, 300, 2 if way == "exchange" else 1):
        code = subprocess.run([sys.executable, "-c", CHILD, str(target), way, str(step)]).returncode
        seen.append(check_after_kill(target, way)[:3])
        if code == 0:
            break
        assert code == -9
        put_old(target)
        assert whole(target) == "old"
        assert [entry.name for entry in tmp_path.iterdir()] == ["out"]
    assert code == 0
    assert seen.count("old") > 10 and seen.count("new") > 1
    assert seen == sorted(seen, reverse=True)  # Never back to the old one once the new one is there.


@pytest.mark.parametrize("way", ["exchange", "two moves"])
def test_killed_at_random_moments(tmp_path, way):
    target = tmp_path / "out"
    put_old(target)
    (target / "notes").write_text("mine")
    rng = random.Random(20260301)
    acknowledged = 0
    for _ in range(12):
        child = subprocess.Popen(
            [sys.executable, "-c", CHILD, str(target), way, "0"], stdout=subprocess.PIPE, text=True
        )
        child.stdout.readline()
        time.sleep(rng.random() * 0.1)
        child.kill()
        rest, _ = child.communicate()
        last = int(rest.split("\n")[-2]) if rest.count("\n") else 0
        acknowledged += last + 1
        content = check_after_kill(target, way)
        process, generation = content[: len(content) // 2_000].split()
        assert int(process) == child.pid
        assert last <= int(generation) <= last + 1
    put_old(target)
    assert whole(target) == "old"
    assert [entry.name for entry in tmp_path.iterdir()] == ["out"]
    assert acknowledged >= 12
