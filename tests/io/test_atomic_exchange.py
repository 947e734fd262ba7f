"""The one-step exchange of two folders, where the system has it."""

import errno
import sys

import pytest

from audiokit.io import atomic_exchange
from audiokit.io.atomic_exchange import exchange


@pytest.mark.skipif(sys.platform not in ("linux", "darwin"), reason="no such system call here")
def test_exchanges_two_folders(tmp_path):
    for name in ("a", "b"):
        (tmp_path / name).mkdir()
        (tmp_path / name / name).touch()
    exchange(tmp_path / "a", tmp_path / "b")
    assert (tmp_path / "a" / "b").exists() and (tmp_path / "b" / "a").exists()


@pytest.mark.skipif(sys.platform not in ("linux", "darwin"), reason="no such system call here")
def test_says_what_failed(tmp_path):
    (tmp_path / "a").mkdir()
    with pytest.raises(FileNotFoundError):
        exchange(tmp_path / "a", tmp_path / "none")
    assert (tmp_path / "a").is_dir()


@pytest.mark.parametrize("platform", ["linux", "darwin", "win32"])
def test_system_without_it(tmp_path, monkeypatch, platform):
    monkeypatch.setattr(atomic_exchange.sys, "platform", platform)
    monkeypatch.setattr(atomic_exchange.ctypes, "CDLL", lambda *_arguments, **_options: object())
    with pytest.raises(OSError) as caught:
        exchange(tmp_path / "a", tmp_path / "b")
    assert caught.value.errno == errno.ENOSYS
