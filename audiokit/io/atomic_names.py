"""Names beside a file or folder for what is still being made, and which of them a killed process left behind."""

import contextlib
import os
import platform
import re
import secrets
import sys
import time
import zlib
from collections.abc import Iterator
from pathlib import Path

_FOREIGN_AGE_S = 24 * 3600
"""After this time an unfinished output of another computer is taken for left over. [s] (our choice, no source)"""

_in_use: set[str] = set()
"""Names that this process is working on; its number alone would not tell them from those of an earlier process."""


def _host() -> str:
    return f"{zlib.crc32(platform.node().encode()):08x}"


def _prefix(path: Path) -> str:
    return f".{path.name[:20]}.audiokit-"


@contextlib.contextmanager
def sibling(path: Path, role: str) -> Iterator[Path]:
    """A free name in the same folder that says which process uses it: role is tmp, new or old."""
    name = f"{_prefix(path)}{_host()}-{os.getpid()}-{secrets.token_hex(4)}.{role}"
    _in_use.add(name)
    try:
        yield path.with_name(name)
    finally:
        _in_use.discard(name)


def leftovers(path: Path, role: str) -> list[Path]:
    """What ended processes left beside `path` in this role, oldest first."""
    pattern = re.compile(rf"{re.escape(_prefix(path))}([0-9a-f]{{8}})-(\d{{1,9}})-[0-9a-f]{{8}}\.{role}", re.ASCII)
    found = []
    try:
        entries = list(path.parent.iterdir())
    except PermissionError:  # A folder may be writable, yet not to be listed.
        return []
    for entry in entries:
        match = pattern.fullmatch(entry.name)
        if match and entry.name not in _in_use:
            with contextlib.suppress(FileNotFoundError):
                changed = entry.lstat().st_mtime
                if _is_ended(match[1], int(match[2]), changed):
                    found.append((changed, entry))
    return [entry for _, entry in sorted(found)]


def _is_ended(host: str, process: int, changed: float) -> bool:
    if host != _host() or sys.platform == "win32":  # There is no harmless way to ask for a process there.
        return time.time() - changed > _FOREIGN_AGE_S
    if process == os.getpid():
        return True
    try:
        os.kill(process, 0)
    except ProcessLookupError:
        return True
    except (PermissionError, OverflowError):
        return False
    return False
