"""kill -9 at any moment leaves the old folder whole or the new one whole, and the user's files in it."""

import os
import random
import subprocess
import sys
import time
from pathlib import Path

import pytest
from kill_steps import killed_before_each_step

from audiokit.io.atomic import replace_folder

pytestmark = pytest.mark.skipif(os.name == "nt", reason="no SIGKILL on Windows")

OWN = frozenset(f"{number}.csv" for number in range(3))

SETUP = """
import errno, sys
from pathlib import Path
from audiokit.io import atomic

target, way = Path(sys.argv[1]), sys.argv[2]
own = frozenset(f"{number}.csv" for number in range(3))
if way == "two moves":
    def refuse(*_paths):
        raise OSError(errno.EINVAL, "Invalid argument")
    atomic.exchange = refuse

def run(content="new"):
    def fill(folder):
        for name in own:
            (folder / name).write_text(content * 2_000)
    atomic.replace_folder(target, fill, own)
"""
WITHOUT_END = """
import os
generation = 0
while True:
    run(f"{os.getpid()} {generation},")
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
    for _ in killed_before_each_step(SETUP, target, way):
        seen.append(check_after_kill(target, way)[:3])
        put_old(target)
        assert whole(target) == "old"
        assert [entry.name for entry in tmp_path.iterdir()] == ["out"]
    assert seen.count("old") > 10 and seen.count("new") > 1
    assert seen == sorted(seen, reverse=True)  # Never back to the old one once the new one is there.


@pytest.mark.parametrize("way", ["exchange", "two moves"])
def test_killed_at_random_moments(tmp_path, way):
    target = tmp_path / "out"
    put_old(target)
    (target / "notes").write_text("mine")
    rng = random.Random(20260301)
    for _ in range(12):
        command = [sys.executable, "-c", SETUP + WITHOUT_END, str(target), way]
        with subprocess.Popen(command, stdout=subprocess.PIPE, text=True) as child:
            first = child.stdout.readline()
            time.sleep(rng.random() * 0.1)
            child.kill()
            last = int((first + child.stdout.read()).split("\n")[-2])
        process, generation = check_after_kill(target, way).split(",")[0].split()
        assert int(process) == child.pid
        assert last <= int(generation) <= last + 1
    put_old(target)
    assert whole(target) == "old"
    assert [entry.name for entry in tmp_path.iterdir()] == ["out"]
