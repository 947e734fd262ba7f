"""The command `audiokit`: finds the subcommand, and turns every problem into a message and an exit code."""

import argparse
import os
import sys
from collections.abc import Sequence
from importlib import import_module

import audiokit
from audiokit.cli.console import printable
from audiokit.core.errors import AudiokitError

DONE = 0
FAILED = 2
BROKEN_PIPE = 141
"""128 + SIGPIPE: the reader of the output went away, as `audiokit … | head` does. (common practice, no source)"""
INTERRUPTED = 130
"""128 + SIGINT (common practice, no source)"""

_SUBCOMMANDS = ("review", "decide", "example", "open")
"""Modules of audiokit.cli; each has register(subparsers), and sets `run`, from arguments to exit code, as a default."""


def main(argv: Sequence[str] | None = None) -> int:
    """Run one command; returns its exit code: 0 done, 2 wrong arguments or input (nothing written), 130 interrupted."""
    for stream in (sys.stdout, sys.stderr):
        if hasattr(stream, "reconfigure"):  # A terminal that lacks a letter is no reason to fail.
            stream.reconfigure(errors="backslashreplace")
    try:
        words = sys.argv[1:] if argv is None else list(argv)
        arguments = _parser(words).parse_args(words)
        code = arguments.run(arguments)
        sys.stdout.flush()
        return code
    except SystemExit as stop:
        return stop.code if isinstance(stop.code, int) else FAILED if stop.code else DONE
    except AudiokitError as error:
        return _fail(str(error))
    except BrokenPipeError:
        _silence_stdout()
        return BROKEN_PIPE
    except OSError as error:
        return _fail(str(error))
    except KeyboardInterrupt:
        print("audiokit: interrupted", file=sys.stderr)
        return INTERRUPTED


def _parser(words: list[str]) -> argparse.ArgumentParser:
    """The command's parser. Only the chosen subcommand is loaded, so that none waits for what another needs."""
    parser = argparse.ArgumentParser(
        prog="audiokit",
        description="Review pure-tone audiograms of a hearing-conservation programme. Decision support, no diagnosis: "
        "licensed audiologists and physicians interpret, and local law applies.",
    )
    parser.add_argument("--version", action="version", version=f"audiokit {audiokit.__version__}")
    subparsers = parser.add_subparsers(metavar="COMMAND", required=True)
    for name in words[:1] if words[:1] and words[0] in _SUBCOMMANDS else _SUBCOMMANDS:
        import_module(f"audiokit.cli.{name}").register(subparsers)
    return parser


def _fail(message: str) -> int:
    print(f"audiokit: {printable(message)}", file=sys.stderr)
    return FAILED


def _silence_stdout() -> None:
    """Python flushes stdout once more when it ends; let that go nowhere."""
    try:
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
    except OSError:  # Not a real file, so there is nothing to flush.
        return
