"""Folders that may not be written, seen as an ordinary user."""

import os
import stat

import pytest
from ordinary_user import open_folder, run_as_ordinary_user

pytestmark = pytest.mark.skipif(os.name == "nt", reason="Windows has no such modes")

IMPORTS = """
from audiokit.core.errors import OutputError
from audiokit.io.atomic import create_file, replace_folder, write_file
"""
REPLACE = """
try:
    fill = lambda folder: (folder / "events.csv").write_text("new")
    replace_folder(Path(sys.argv[1]), fill, frozenset({"events.csv"}))
except OutputError as error:
    print(error)
"""
WRITE = """
for write in (write_file, create_file):
    try:
        write(Path(sys.argv[1]), b"new")
    except OutputError as error:
        print(error)
"""


def test_closed_parent():
    with open_folder() as folder:
        said = run_as_ordinary_user(IMPORTS, REPLACE, folder / "out")
        assert "no right to" in said and "mend: get the right" in said and str(folder) in said
        assert list(folder.iterdir()) == []


def test_writable_target_in_closed_parent():
    """It could be written file by file only, so it is refused."""
    with open_folder() as folder:
        (folder / "out").mkdir()
        (folder / "out").chmod(0o777)
        assert "no right to" in run_as_ordinary_user(IMPORTS, REPLACE, folder / "out")
        assert list((folder / "out").iterdir()) == []


def test_closed_target_in_open_parent():
    with open_folder() as folder:
        (folder / "out").mkdir()
        (folder / "out" / "events.csv").write_text("old")
        folder.chmod(0o777)
        assert "no right to" in run_as_ordinary_user(IMPORTS, REPLACE, folder / "out")
        assert (folder / "out" / "events.csv").read_text() == "old"
        assert [entry.name for entry in folder.iterdir()] == ["out"]


def test_files_in_closed_folder():
    with open_folder() as folder:
        said = run_as_ordinary_user(IMPORTS, WRITE, folder / "a.csv")
        assert said.count("Permission denied") == 2 and said.count("mend: check the rights") == 2
        assert list(folder.iterdir()) == []


def test_folder_that_may_be_written_but_not_listed():
    with open_folder() as folder:
        folder.chmod(0o733)
        assert run_as_ordinary_user(IMPORTS, WRITE, folder / "a.csv") == ""
        assert (folder / "a.csv").read_bytes() == b"new"


@pytest.mark.skipif(os.name == "nt" or not hasattr(os, "geteuid") or os.geteuid() != 0, reason="needs two users")
def test_owner_and_group_are_kept_by_the_administrator(tmp_path):
    from audiokit.io.atomic import replace_folder

    (tmp_path / "out").mkdir()
    os.chown(tmp_path / "out", 65534, 65533)
    (tmp_path / "out").chmod(0o2770)
    replace_folder(tmp_path / "out", lambda folder: None, frozenset())
    kept = (tmp_path / "out").stat()
    assert (kept.st_uid, kept.st_gid, stat.S_IMODE(kept.st_mode)) == (65534, 65533, 0o2770)
