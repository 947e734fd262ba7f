"""Runs a piece of code again and again, killing it with SIGKILL one step later each time."""

import subprocess
import sys
from collections.abc import Iterator

_DRIVER = """
import os, signal, sys

{setup}

def count_down(left):
    def hook(event, _arguments):
        nonlocal left
        if event.startswith(("os.", "open", "shutil.", "ctypes.")):
            left -= 1
            if left == 0:
                os.kill(os.getpid(), signal.SIGKILL)
    return hook

for line in sys.stdin:
    child = os.fork()
    if child == 0:
        sys.addaudithook(count_down(int(line)))
        run()
        os._exit(0)
    print(os.waitstatus_to_exitcode(os.waitpid(child, 0)[1]), flush=True)
"""


def killed_before_each_step(setup: str, *arguments: object) -> Iterator[int]:
    """Kill `run`, which `setup` defines, before its first, second, third … call to the file system.

    Yields the number of the step after each kill, and once more after the first run that came to its end.
    """
    command = [sys.executable, "-c", _DRIVER.format(setup=setup), *map(str, arguments)]
    with subprocess.Popen(command, stdin=subprocess.PIPE, stdout=subprocess.PIPE, text=True) as driver:
        assert driver.stdin and driver.stdout
        for step in range(1, 1000):
            driver.stdin.write(f"{step}\n")
            driver.stdin.flush()
            code = int(driver.stdout.readline())
            yield step
            if code == 0:
                driver.stdin.close()
                return
            assert code == -9
    raise AssertionError("the run never came to its end")
