"""Where output may go, and what the system says against it in words that tell what to do."""

import contextlib
import errno
import os
import stat
from collections.abc import Iterator
from fnmatch import fnmatch
from pathlib import Path

from audiokit.core.errors import OutputError

_COHORT_FILES = ("people.*", "tests.*", "cohort.toml", "decisions.db")


def check_target(target: Path | str, own_names: frozenset[str] = frozenset()) -> Path:
    """The folder that `replace_folder` would replace, links followed; refused where it must not or cannot be written.

    Raises OutputError: the target is the root, home or current folder, a mount point, a file, looks like a cohort
    folder, holds a folder or a special file, or there is no right to write it. Changes nothing.
    """
    place = resolved(target)
    elsewhere = f"choose a folder of its own for the output, for example {place / 'review'}"
    for special, what in _special_folders(place):
        if place == special:
            raise OutputError(f"{place} is {what}; it will not be replaced", elsewhere)
    with explained(place):
        if place.exists():
            if not place.is_dir():
                raise OutputError(f"{place} is a file, not a folder", "choose a folder for the output")
            if os.path.ismount(place):
                raise OutputError(f"{place} is a mount point, which cannot be replaced in one step", elsewhere)
            _refuse_contents(place, own_names, elsewhere)
        _refuse_without_rights(place)
    return place


def resolved(path: Path | str) -> Path:
    """The path with links followed; OutputError where it cannot be."""
    try:
        place = Path(path).resolve()
        if place.is_symlink():  # links in a circle; Python 3.13 and later do not raise on them
            raise OSError("its links go round in a circle")
    except (OSError, RuntimeError, ValueError) as error:
        raise OutputError(f"{path!s} is no path that can be followed ({error})", "choose another name") from error
    return place


@contextlib.contextmanager
def explained(place: Path) -> Iterator[None]:
    """Turn the system's errors into ones that say what to do."""
    try:
        yield
    except OSError as error:
        if error.errno in (errno.ENOSPC, errno.EDQUOT):
            raise OutputError(
                f"{place}: the disk is full; nothing was changed", "free some space, or choose another folder"
            ) from error
        raise OutputError(
            f"{place} cannot be written: {error.strerror or error}; nothing was changed",
            "check the rights on the folder and on the one above it, or choose another folder",
        ) from error


def _special_folders(place: Path) -> Iterator[tuple[Path, str]]:
    yield Path(place.anchor), "the root folder"
    with contextlib.suppress(OSError):
        yield Path.cwd(), "the current folder"
    with contextlib.suppress(OSError, RuntimeError):
        yield Path.home().resolve(), "your home folder"


def _refuse_contents(place: Path, own_names: frozenset[str], elsewhere: str) -> None:
    for entry in sorted(place.iterdir()):
        name = entry.name
        if name not in own_names and any(fnmatch(name.lower(), pattern) for pattern in _COHORT_FILES):
            raise OutputError(
                f"{place} looks like a cohort folder (it holds {name}); it will not be replaced", elsewhere
            )
        kind = entry.lstat().st_mode
        if stat.S_ISDIR(kind):
            raise OutputError(f"{place} holds a folder, {name}, that is not part of the output", elsewhere)
        if not stat.S_ISREG(kind) and not stat.S_ISLNK(kind):
            raise OutputError(f"{place} holds {name}, which is neither file nor folder", elsewhere)


def _refuse_without_rights(place: Path) -> None:
    ground = place.parent
    while not ground.exists() and ground != ground.parent:
        ground = ground.parent
    if not ground.is_dir():
        raise OutputError(f"{ground} is a file, so {place} cannot be made in it", "choose another folder")
    for folder in (ground, place):
        if folder.exists() and not os.access(folder, os.W_OK | os.X_OK):
            raise OutputError(f"{folder} cannot be written: no right to", "get the right, or choose another folder")
