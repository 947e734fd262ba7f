"""A folder takes its place whole or not at all, and nothing of the user's is lost."""

import errno
import os
import stat
from pathlib import Path

import pytest

from audiokit.core.errors import OutputError, RuleFileError
from audiokit.io import atomic, atomic_names
from audiokit.io.atomic import replace_folder
from audiokit.io.atomic_target import check_target

OWN = frozenset({"events.csv", "shifts.csv", "summary.html"})


def filler(content: str, names=("events.csv", "shifts.csv")):
    def fill(folder: Path) -> None:
        for name in names:
            (folder / name).write_text(content)

    return fill


def tree(folder: Path) -> dict[str, str]:
    return {entry.name: entry.read_text() for entry in folder.iterdir()}


@pytest.fixture(params=["exchange", "two moves"])
def way(request, monkeypatch):
    """Both ways to take a place: in one step, and where the system has no such step."""
    if request.param == "two moves":
        monkeypatch.setattr(atomic, "exchange", refuse)
    return request.param


def refuse(*_arguments):
    raise OSError(errno.EINVAL, "Invalid argument")


def test_new_target_and_its_parents(tmp_path):
    replace_folder(tmp_path / "a" / "b" / "out", filler("1"), OWN)
    assert tree(tmp_path / "a" / "b" / "out") == {"events.csv": "1", "shifts.csv": "1"}
    assert [entry.name for entry in (tmp_path / "a" / "b").iterdir()] == ["out"]


def test_replaces_all_own_files_and_keeps_the_users(tmp_path, way):
    target = tmp_path / "out"
    replace_folder(target, filler("1", names=OWN), OWN)
    (target / "my notes.txt").write_text("mine")
    (target / "shortcut").symlink_to("my notes.txt")
    replace_folder(target, filler("2"), OWN)
    assert tree(target) == {"events.csv": "2", "shifts.csv": "2", "my notes.txt": "mine", "shortcut": "mine"}
    assert (target / "shortcut").is_symlink()
    assert [entry.name for entry in tmp_path.iterdir()] == ["out"]


def test_users_files_are_copied_where_links_fail(tmp_path, monkeypatch, way):
    target = tmp_path / "out"
    replace_folder(target, filler("1"), OWN)
    (target / "notes").write_text("mine")
    monkeypatch.setattr(atomic.os, "link", refuse)
    replace_folder(target, filler("2"), OWN)
    assert tree(target) == {"events.csv": "2", "shifts.csv": "2", "notes": "mine"}
    assert [entry.name for entry in tmp_path.iterdir()] == ["out"]


def test_file_that_came_while_filling_is_kept(tmp_path, monkeypatch, way):
    """Between the copying of the user's files and the exchange a new one may appear."""
    target = tmp_path / "out"
    replace_folder(target, filler("1"), OWN)
    take = atomic._take_place

    def late(fresh, place, aside):
        (target / "late.txt").write_text("late")
        return take(fresh, place, aside)

    monkeypatch.setattr(atomic, "_take_place", late)
    replace_folder(target, filler("2"), OWN)
    assert tree(target) == {"events.csv": "2", "shifts.csv": "2", "late.txt": "late"}
    assert [entry.name for entry in tmp_path.iterdir()] == ["out"]


def test_link_as_target_stays_a_link(tmp_path, way):
    (tmp_path / "real").mkdir()
    (tmp_path / "link").symlink_to("real")
    replace_folder(tmp_path / "link", filler("1"), OWN)
    assert (tmp_path / "link").is_symlink()
    assert tree(tmp_path / "real") == {"events.csv": "1", "shifts.csv": "1"}
    assert sorted(entry.name for entry in tmp_path.iterdir()) == ["link", "real"]


@pytest.mark.skipif(os.name == "nt", reason="Windows has no such modes")
def test_mode_of_the_folder_is_kept(tmp_path, way):
    target = tmp_path / "out"
    replace_folder(target, filler("1"), OWN)
    target.chmod(0o700)
    replace_folder(target, filler("2"), OWN)
    assert stat.S_IMODE(target.stat().st_mode) == 0o700


@pytest.mark.parametrize("name", ["People.csv", "people.parquet", "tests.xlsx", "cohort.toml", "decisions.db"])
def test_cohort_folder_is_refused(tmp_path, name):
    (tmp_path / "out").mkdir()
    (tmp_path / "out" / name).write_text("precious")
    with pytest.raises(OutputError, match="looks like a cohort folder") as caught:
        replace_folder(tmp_path / "out", filler("1"), OWN)
    assert "review" in caught.value.mend
    assert tree(tmp_path / "out") == {name: "precious"}


def test_folder_inside_is_refused(tmp_path):
    (tmp_path / "out" / "inner").mkdir(parents=True)
    with pytest.raises(OutputError, match="holds a folder, inner"):
        replace_folder(tmp_path / "out", filler("1"), OWN)
    assert [entry.name for entry in (tmp_path / "out").iterdir()] == ["inner"]


@pytest.mark.skipif(not hasattr(os, "mkfifo"), reason="no named pipes here")
def test_special_file_is_refused(tmp_path):
    (tmp_path / "out").mkdir()
    os.mkfifo(tmp_path / "out" / "pipe")
    with pytest.raises(OutputError, match="neither file nor folder"):
        check_target(tmp_path / "out")


def test_current_home_and_root_are_refused(tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    with pytest.raises(OutputError, match="current folder"):
        check_target(".")
    (tmp_path / "home").mkdir()
    monkeypatch.setattr(Path, "home", lambda: tmp_path / "home")
    with pytest.raises(OutputError, match="home folder"):
        check_target("home")
    with pytest.raises(OutputError, match="root folder"):
        check_target(tmp_path.anchor)


def test_mount_point_is_refused(tmp_path, monkeypatch):
    monkeypatch.setattr(os.path, "ismount", lambda path: path == tmp_path)
    with pytest.raises(OutputError, match="mount point"):
        check_target(tmp_path)


def test_file_as_target_or_above_it_is_refused(tmp_path):
    (tmp_path / "file").write_text("mine")
    with pytest.raises(OutputError, match="is a file, not a folder"):
        check_target(tmp_path / "file")
    with pytest.raises(OutputError):
        check_target(tmp_path / "file" / "out")
    assert tree(tmp_path) == {"file": "mine"}


@pytest.mark.parametrize("existing", [False, True])
def test_disk_full_changes_nothing(tmp_path, way, existing):
    target = tmp_path / "deep" / "out"
    if existing:
        replace_folder(target, filler("1"), OWN)
        (target / "notes").write_text("mine")

    def fill(folder: Path) -> None:
        (folder / "events.csv").write_text("part")
        raise OSError(errno.ENOSPC, "No space left on device")

    with pytest.raises(OutputError, match="disk is full"):
        replace_folder(target, fill, OWN)
    if existing:
        assert tree(target) == {"events.csv": "1", "shifts.csv": "1", "notes": "mine"}
        assert [entry.name for entry in target.parent.iterdir()] == ["out"]
    else:
        assert list(tmp_path.iterdir()) == []


def test_disk_full_at_sync_changes_nothing(tmp_path, monkeypatch):
    replace_folder(tmp_path / "out", filler("1"), OWN)

    def full(_handle):
        raise OSError(errno.ENOSPC, "No space left on device")

    monkeypatch.setattr(atomic.os, "fsync", full)
    with pytest.raises(OutputError, match="disk is full"):
        replace_folder(tmp_path / "out", filler("2"), OWN)
    assert tree(tmp_path / "out") == {"events.csv": "1", "shifts.csv": "1"}
    assert [entry.name for entry in tmp_path.iterdir()] == ["out"]


def test_second_move_that_fails_is_taken_back(tmp_path, monkeypatch):
    target = tmp_path / "out"
    replace_folder(target, filler("1"), OWN)
    monkeypatch.setattr(atomic, "exchange", refuse)
    rename = Path.rename

    def fail_on_new(self, to):
        if self.name.endswith(".new"):
            refuse()
        return rename(self, to)

    monkeypatch.setattr(Path, "rename", fail_on_new)
    with pytest.raises(OutputError, match="Invalid argument"):
        replace_folder(target, filler("2"), OWN)
    assert tree(target) == {"events.csv": "1", "shifts.csv": "1"}
    assert [entry.name for entry in tmp_path.iterdir()] == ["out"]


@pytest.mark.parametrize("error", [RuleFileError("bad"), KeyboardInterrupt(), ZeroDivisionError()])
def test_errors_of_the_filler_come_through(tmp_path, error):
    def fill(folder: Path) -> None:
        (folder / "part").write_text("part")
        raise error

    with pytest.raises(type(error)):
        replace_folder(tmp_path / "a" / "out", fill, OWN)
    assert list(tmp_path.iterdir()) == []


def test_filler_may_write_only_its_own_names(tmp_path):
    with pytest.raises(ValueError, match=r"stranger\.csv"):
        replace_folder(tmp_path / "out", filler("1", names=("stranger.csv",)), OWN)
    with pytest.raises(ValueError, match=r"events\.csv"):
        replace_folder(tmp_path / "out", lambda folder: (folder / "events.csv").mkdir(), OWN)
    assert list(tmp_path.iterdir()) == []


def left_over(target: Path, process: int, role: str = "new", host: str | None = None) -> Path:
    name = f".{target.name}.audiokit-{host or atomic_names._host()}-{process}-0123abcd.{role}"
    folder = target.with_name(name)
    folder.mkdir()
    (folder / "events.csv").write_text("left")
    return folder


@pytest.fixture
def ended(monkeypatch):
    """A process number that is surely of no process."""

    def kill(process, _signal):
        if process == 77777:
            raise ProcessLookupError

    monkeypatch.setattr(atomic_names.os, "kill", kill)
    return 77777


@pytest.mark.skipif(os.name == "nt", reason="on Windows by age only")
def test_left_over_folders_of_ended_processes_are_removed(tmp_path, ended):
    target = tmp_path / "out"
    gone = left_over(target, ended)
    reused_number = left_over(target, os.getpid())
    running = left_over(target, 88888)
    elsewhere = left_over(target, ended, host="00000000")
    replace_folder(target, filler("1"), OWN)
    assert not gone.exists() and not reused_number.exists()
    assert running.exists() and elsewhere.exists()
    os.utime(elsewhere, (0, 0))
    replace_folder(target, filler("2"), OWN)
    assert not elsewhere.exists()


@pytest.mark.skipif(os.name == "nt", reason="on Windows by age only")
def test_left_over_folder_with_a_file_of_the_users_stays(tmp_path, ended):
    target = tmp_path / "out"
    replace_folder(target, filler("1"), OWN)
    (target / "notes").write_text("later")
    folder = left_over(target, ended)
    (folder / "notes").write_text("earlier")
    replace_folder(target, filler("2"), OWN)
    assert (folder / "notes").read_text() == "earlier"
    (folder / "notes").write_text("later")
    replace_folder(target, filler("3"), OWN)
    assert not folder.exists()


@pytest.mark.skipif(os.name == "nt", reason="on Windows by age only")
def test_old_folder_moved_aside_is_put_back_first(tmp_path, ended):
    target = tmp_path / "out"
    (left_over(target, ended, role="old") / "notes").write_text("mine")
    replace_folder(target, filler("2"), OWN)
    assert tree(target) == {"events.csv": "2", "shifts.csv": "2", "notes": "mine"}
    assert [entry.name for entry in tmp_path.iterdir()] == ["out"]
