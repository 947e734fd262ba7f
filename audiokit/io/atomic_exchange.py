"""Two folders exchange their names in one step, as Linux (renameat2) and macOS (renamex_np) offer it."""

import ctypes
import errno
import os
import sys
from pathlib import Path

_AT_FDCWD = -100
"""Linux, fcntl.h: paths are taken as they are, not relative to an open folder."""
_RENAME_EXCHANGE = 2
"""Linux, linux/fs.h: flag of renameat2."""
_RENAME_SWAP = 2
"""macOS, sys/stdio.h: flag of renamex_np (from memory, unverified)."""


def exchange(one: Path, other: Path) -> None:
    """Exchange what two paths name, at once. Raises OSError where the system or file system cannot; nothing changed."""
    first, second = os.fsencode(one), os.fsencode(other)
    if sys.platform == "linux":
        failed = _function("renameat2")(_AT_FDCWD, first, _AT_FDCWD, second, ctypes.c_uint(_RENAME_EXCHANGE))
    elif sys.platform == "darwin":
        failed = _function("renamex_np")(first, second, ctypes.c_uint(_RENAME_SWAP))
    else:
        raise OSError(errno.ENOSYS, os.strerror(errno.ENOSYS))
    if failed:
        code = ctypes.get_errno()
        raise OSError(code, os.strerror(code), str(one), None, str(other))


def _function(name: str):  # type: ignore[no-untyped-def]
    """A function of the C library; OSError where this one lacks it."""
    try:
        return getattr(ctypes.CDLL(None, use_errno=True), name)
    except AttributeError:
        raise OSError(errno.ENOSYS, os.strerror(errno.ENOSYS)) from None
