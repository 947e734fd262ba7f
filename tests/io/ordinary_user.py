"""Runs code without the rights of the administrator, for whom no folder is read-only."""

import os
import subprocess
import sys
import tempfile
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

_DROP_RIGHTS = """
import os, sys, urllib.parse  # later Pythons import it late, when the rights are gone
from pathlib import Path
if os.geteuid() == 0:
    os.setgroups([])
    os.setgid(65534)
    os.setuid(65534)
assert os.geteuid() != 0
"""


@contextmanager
def open_folder() -> Iterator[Path]:
    """A folder that every user may enter, which pytest's own are not."""
    with tempfile.TemporaryDirectory() as name:
        Path(name).chmod(0o755)
        yield Path(name)


def run_as_ordinary_user(imports: str, code: str, *arguments: object) -> str:
    """Output of the code; the imports are done before the rights are dropped, as a home folder may be closed."""
    command = [sys.executable, "-c", f"{imports}\n{_DROP_RIGHTS}\n{code}", *map(str, arguments)]
    done = subprocess.run(command, capture_output=True, text=True, env={**os.environ, "HOME": "/nonexistent"})
    assert done.returncode == 0, done.stderr
    return done.stdout
