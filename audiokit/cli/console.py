"""What the subcommands share when they talk to a person at a terminal."""

import shutil
import time
from types import TracebackType
from typing import TextIO

_SECONDS_BETWEEN_LINES = 0.1


def printable(text: object) -> str:
    """Text from files or arguments with control characters made visible, so that none can steer the terminal."""
    return "".join(
        character if character.isprintable() or character == "\n" else f"\\x{ord(character):02x}"
        for character in str(text)
    )


def plural(count: int, one: str, many: str = "") -> str:
    """A count with its noun: 1 test, 2 tests."""
    return f"{count} {one if count == 1 else many or one + 's'}"


class ProgressLine:
    """Shows how far long work is, on one line that is written over; silent where the stream is no terminal.

    Call it as progress(text, done, total); done and total are None where they are not known.
    """

    def __init__(self, stream: TextIO) -> None:
        self._stream = stream
        self._shown = stream.isatty()
        self._width = 0
        self._next = 0.0
        self._text = ""

    def __call__(self, text: str, done: int | None = None, total: int | None = None) -> None:
        now = time.monotonic()
        if not self._shown or (text == self._text and now < self._next):
            return
        self._text = text
        self._next = now + _SECONDS_BETWEEN_LINES
        share = f" {done * 100 // total} %" if done is not None and total else f" {done}" if done is not None else ""
        self._write(printable(text).replace("\n", " ") + share)

    def __enter__(self) -> "ProgressLine":
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        if self._width:
            self._write("")
            self._stream.write("\r")
            self._stream.flush()

    def _write(self, line: str) -> None:
        line = line[: shutil.get_terminal_size().columns - 1]
        self._stream.write("\r" + line.ljust(self._width))
        self._stream.flush()
        self._width = len(line)
