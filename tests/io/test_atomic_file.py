"""One file takes its place whole or not at all."""

import errno
import os
import stat
from pathlib import Path

import pytest
from kill_steps import killed_before_each_step

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


WRITE = """
from pathlib import Path
from audiokit.io.atomic import write_file

def run():
    write_file(Path(sys.argv[1]), b"new" * 100_000)
"""


@pytest.mark.skipif(os.name == "nt", reason="no SIGKILL on Windows")
def test_killed_before_each_step(tmp_path):
    target = tmp_path / "a.csv"
    target.write_bytes(b"old" * 100_000)
    contents = []
    for _ in killed_before_each_step(WRITE, target):
        assert target.read_bytes() in (b"old" * 100_000, b"new" * 100_000)
        contents.append(target.read_bytes()[:3])
        target.write_bytes(b"old" * 100_000)
    assert contents == sorted(contents, reverse=True) and contents.count(b"old") > 4 and contents[-1] == b"new"
    write_file(target, b"last")
    assert names(tmp_path) == ["a.csv"]
