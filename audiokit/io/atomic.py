"""Files and folders that take their place whole or not at all, even when the process is killed.

Everything is made beside its place under a name of its own, put on disk, then moved there in one step. Where the
system cannot exchange two folders in one step (Windows, some network and layered file systems), the old folder is
moved aside first: killed between the two moves, a run leaves no folder at its place, but the old and the new one
whole beside it, and the next run puts the old one back before it does anything else. A mount point cannot be moved at
all and is refused.
"""

import contextlib
import errno
import filecmp
import os
import shutil
from collections.abc import Callable, Iterator
from pathlib import Path

from audiokit.io.atomic_exchange import exchange
from audiokit.io.atomic_names import leftovers, sibling
from audiokit.io.atomic_target import check_target, explained, resolved


def write_file(path: Path | str, data: bytes) -> None:
    """Write a file that is either the old one or the new one, whole; a link is followed, the file's mode kept.

    Raises OutputError: no right to write, disk full, `path` is a folder. Then nothing changed.
    """
    target = resolved(path)
    with explained(target), _fresh_file(target, data) as fresh:
        if target.exists():
            shutil.copymode(target, fresh)
        fresh.replace(target)
        _sync_after_move(target.parent)


def create_file(path: Path | str, data: bytes) -> bool:
    """Create a file whole, unless there is one: True if it was made here, False if it was there already.

    Where the file system has no hard links it is written in place, and a kill may leave it cut short.
    Raises OutputError as `write_file`.
    """
    target = resolved(path)
    with explained(target), _fresh_file(target, data) as fresh:
        try:
            os.link(fresh, target)
        except FileExistsError:
            return False
        except OSError:
            return _create_in_place(target, data)
        _sync_after_move(target.parent)
    return True


def replace_folder(target: Path | str, fill: Callable[[Path], None], own_names: frozenset[str]) -> None:
    """Fill a new folder and let it take the target's place; killed at any moment, the old or the new one is whole.

    fill      : writes the new content, files only, into the folder it is given
    own_names : the names of all files that `fill` may write; every other file in the target is the user's and is
                carried over (hard link, else copy)

    Raises OutputError: see `check_target`; disk full; what `fill` raises comes through. Then nothing changed.
    """
    place = check_target(target, own_names)
    with explained(place), _parents(place):
        _clean_up(place, own_names)
        with sibling(place, "new") as fresh, sibling(place, "old") as aside:
            try:
                fresh.mkdir()
                fill(fresh)
                _build(fresh, place, own_names)
            except BaseException:
                shutil.rmtree(fresh, ignore_errors=True)
                raise
            try:
                replaced = _take_place(fresh, place, aside)
            except OSError:
                shutil.rmtree(fresh, ignore_errors=True)
                raise
            _sync_after_move(place.parent)
            with contextlib.suppress(OSError):  # The new folder is in place: what cannot be tidied now is left over.
                if replaced:
                    _carry_over(replaced, place, own_names)
                    _remove(replaced, place, own_names)


@contextlib.contextmanager
def _parents(place: Path) -> Iterator[None]:
    """The folders above `place`; those made here are removed again on error."""
    made = [folder for folder in place.parents if not folder.exists()]
    try:
        place.parent.mkdir(parents=True, exist_ok=True)
        yield
    except BaseException:
        for folder in made:
            with contextlib.suppress(OSError):
                folder.rmdir()
        raise


def _build(fresh: Path, place: Path, own_names: frozenset[str]) -> None:
    """Check what was filled in, add the user's files, and put everything on disk."""
    strangers = sorted(entry.name for entry in fresh.iterdir() if entry.name not in own_names or not entry.is_file())
    if strangers:
        raise ValueError(f"files outside own_names were written: {', '.join(strangers)}")
    if place.exists():
        _carry_over(place, fresh, own_names)
        _copy_rights(place, fresh)
    for name in own_names:
        if (fresh / name).exists():
            _sync(fresh / name)
    _sync(fresh)


def _copy_rights(place: Path, fresh: Path) -> None:
    """Let the new folder be open to the same people as the old one, as far as this user may say so."""
    if hasattr(os, "chown"):
        owner = place.stat()
        for user, group in ((-1, owner.st_gid), (owner.st_uid, -1)):
            with contextlib.suppress(PermissionError):
                os.chown(fresh, user, group)
    shutil.copystat(place, fresh)
    os.utime(fresh)


def _take_place(fresh: Path, place: Path, aside: Path) -> Path | None:
    """Move the new folder to its place; returns where the old one is now."""
    if not place.exists():
        try:
            fresh.rename(place)
            return None
        except OSError:
            if not place.exists():
                raise
    try:
        exchange(fresh, place)
        return fresh
    except OSError:
        place.rename(aside)
    try:
        fresh.rename(place)
    except OSError:
        aside.rename(place)
        raise
    return aside


def _carry_over(source: Path, into: Path, own_names: frozenset[str]) -> None:
    """Give `into` the user's files of `source` that it lacks."""
    for entry in source.iterdir():
        twin = into / entry.name
        if entry.name in own_names or os.path.lexists(twin):
            continue
        if entry.is_symlink():
            twin.symlink_to(entry.readlink())
            continue
        try:
            os.link(entry, twin)
        except OSError:
            shutil.copy2(entry, twin)
            _sync(twin)


def _remove(folder: Path, place: Path, own_names: frozenset[str]) -> None:
    """Delete a replaced or left-over folder, unless it holds something of the user's that `place` does not hold."""
    entries = list(folder.iterdir())
    if all(entry.name in own_names or _same(entry, place / entry.name) for entry in entries):
        for entry in entries:
            entry.unlink()
        folder.rmdir()


def _same(one: Path, other: Path) -> bool:
    if one.is_symlink() or other.is_symlink():
        return one.is_symlink() and other.is_symlink() and one.readlink() == other.readlink()
    return one.is_file() and other.is_file() and (one.samefile(other) or filecmp.cmp(one, other, shallow=False))


def _clean_up(place: Path, own_names: frozenset[str]) -> None:
    """Finish what killed runs left: put an old folder back where none is, remove the rest."""
    if not os.path.lexists(place):
        for folder in leftovers(place, "old")[-1:]:
            folder.rename(place)
    for folder in (*leftovers(place, "old"), *leftovers(place, "new")):
        with contextlib.suppress(OSError):
            _remove(folder, place, own_names)


@contextlib.contextmanager
def _fresh_file(target: Path, data: bytes) -> Iterator[Path]:
    """A finished file beside the target, gone at the end if it was not moved; what killed runs left goes too."""
    for path in leftovers(target, "tmp"):
        with contextlib.suppress(OSError):
            path.unlink()
    with sibling(target, "tmp") as fresh:
        try:
            fresh.write_bytes(data)
            _sync(fresh)
            yield fresh
        finally:
            fresh.unlink(missing_ok=True)


def _create_in_place(target: Path, data: bytes) -> bool:
    try:
        target.touch(exist_ok=False)
    except FileExistsError:
        return False
    try:
        target.write_bytes(data)
        _sync(target)
    except OSError:
        target.unlink(missing_ok=True)
        raise
    return True


def _sync(path: Path) -> None:
    """Put a file, or a folder's list of names, on disk. Windows cannot do so for folders."""
    windows = os.name == "nt"
    if windows and path.is_dir():
        return
    handle = os.open(path, os.O_RDWR if windows else os.O_RDONLY)
    try:
        os.fsync(handle)
    except OSError as error:
        if error.errno not in (errno.EINVAL, errno.ENOTSUP):  # Some file systems cannot do so either.
            raise
    finally:
        os.close(handle)


def _sync_after_move(folder: Path) -> None:
    """What was moved is in its place already, so a refusal (a folder that may not be read) is no failure."""
    with contextlib.suppress(OSError):
        _sync(folder)
