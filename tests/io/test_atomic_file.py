"""One file takes its place whole or not at all."""

import errno
import os
import stat
import subprocess
import sys
from pathlib import Path

import pytest

from audiokit.core.errors import OutputError
from audiokit.io import atomic
from audiokit.io.atomic import create_file, write_file


def names(folder: Path) -> list[str]:
    return sorted(entry.name for entry in folder.iterdir())


def test_writes_and_replaces(tmp_path):
    write_file(tmp_path / "a.csv", b"one")
    write_file(tmp_path / "a.csv", b"two")
    assert (tmp_path / "a.csv").read_bytes() == b"two"
    assert names(tmp_path) == ["a.csv"]


@pytest.mark.skipif(os.name == "nt", reason="Windows has no such modes")
def test_new_file_follows_umask_and_old_mode_is_kept(tmp_path):
    before = os.umask(0o027)
    try:
        write_file(tmp_path / "new", b"")
    finally:
        os.umask(before)
    assert stat.S_IMODE((tmp_path / "new").stat().st_mode) == 0o640
    (tmp_path / "new").chmod(0o600)
    write_file(tmp_path / "new", b"x")
    assert stat.S_IMODE((tmp_path / "new").stat().st_mode) == 0o600


def test_link_is_followed(tmp_path):
    (tmp_path / "real").write_bytes(b"old")
    (tmp_path / "link").symlink_to("real")
    write_file(tmp_path / "link", b"new")
    assert (tmp_path / "link").is_symlink()
    assert (tmp_path / "real").read_bytes() == b"new"


def test_folder_in_the_way(tmp_path):
    (tmp_path / "a").mkdir()
    with pytest.raises(OutputError, match="cannot be written"):
        write_file(tmp_path / "a", b"x")
    assert names(tmp_path) == ["a"]


def test_missing_folder(tmp_path):
    with pytest.raises(OutputError, match="No such file"):
        write_file(tmp_path / "none" / "a", b"x")


def test_link_to_itself(tmp_path):
    (tmp_path / "loop").symlink_to("loop")
    with pytest.raises(OutputError):
        write_file(tmp_path / "loop", b"x")
    assert names(tmp_path) == ["loop"]


@pytest.mark.parametrize("write", [write_file, create_file])
def test_disk_full(tmp_path, monkeypatch, write):
    def full(_handle):
        raise OSError(errno.ENOSPC, "No space left on device")

    (tmp_path / "kept").write_bytes(b"old")
    monkeypatch.setattr(atomic.os, "fsync", full)
    with pytest.raises(OutputError, match="disk is full") as caught:
        write(tmp_path / ("kept" if write is write_file else "other"), b"new")
    assert "free some space" in caught.value.mend
    assert names(tmp_path) == ["kept"]
    assert (tmp_path / "kept").read_bytes() == b"old"


def test_create_never_replaces(tmp_path):
    assert create_file(tmp_path / "a", b"first")
    assert not create_file(tmp_path / "a", b"second")
    assert (tmp_path / "a").read_bytes() == b"first"
    assert names(tmp_path) == ["a"]


def test_create_without_hard_links(tmp_path, monkeypatch):
    def refuse(*_paths):
        raise OSError(errno.EPERM, "Operation not permitted")

    monkeypatch.setattr(atomic.os, "link", refuse)
    assert create_file(tmp_path / "a", b"first")
    assert not create_file(tmp_path / "a", b"second")
    assert (tmp_path / "a").read_bytes() == b"first"
    assert names(tmp_path) == ["a"]


KILLED_BEFORE_EVENT = """
import os, signal, sys
from pathlib import Path
from audiokit.io.atomic import write_file
left = int(sys.argv[2])
def hook(event, _arguments):
    global left
    if event.startswith(("os.", "open")):
        left -= 1
        if left == 0:
            os.kill(os.getpid(), signal.SIGKILL)
target = Path(sys.argv[1])
sys.addaudithook(hook)
write_file(target, b"new" * 100_000)
left = -1
"""


@pytest.mark.skipif(os.name == "nt", reason="no SIGKILL on Windows")
def test_killed_before_each_step(tmp_path):
    target = tmp_path / "a.csv"
    contents = set()
    for step in range(1, 100):
        target.write_bytes(b"old" * 100_000)
        code = subprocess.run([sys.executable, "-c", KILLED_BEFORE_EVENT, str(target), str(step)]).returncode
        content = target.read_bytes()
        assert content in (b"old" * 100_000, b"new" * 100_000)
        contents.add(content)
        if code == 0:
            break
        assert code == -9
    assert code == 0 and step > 4 and len(contents) == 2
    write_file(target, b"last")
    assert names(tmp_path) == ["a.csv"]
