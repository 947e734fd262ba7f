"""Exit codes and messages of the command as a whole."""

import io
import os
import re
import subprocess
import sys
from pathlib import Path

import pytest

import audiokit
from audiokit.cli import main as cli_main
from audiokit.cli.console import ProgressLine, plural, printable
from audiokit.cli.main import main
from audiokit.core.errors import CohortError


def run(*arguments: str, **options) -> subprocess.CompletedProcess:
    return subprocess.run(
        [sys.executable, "-m", "audiokit", *arguments], capture_output=True, text=True, timeout=60, **options
    )


def test_version(capsys):
    assert main(["--version"]) == 0
    assert capsys.readouterr().out == f"audiokit {audiokit.__version__}\n"


@pytest.mark.parametrize(
    "arguments",
    [
        [],
        ["nonsense"],
        ["review"],
        ["review", "folder"],
        ["review", "folder", "--out"],
        ["review", "folder", "--out", "out", "--as-of", "1.3.2026"],
        ["review", "folder", "--out", "out", "--as-of", "20260301"],
        ["review", "folder", "--out", "out", "--as-of", "2026-02-30"],
        ["review", "folder", "--out", "out", "--baseline-revision", "sometimes"],
        ["review", "folder", "--out", "out", "--rulebook"],
        ["review", "--out", "out", "--rulebook", "us-osha", "folder"],
        ["decide", "folder"],
        ["decide", "folder", "forget"],
        ["decide", "folder", "undo", "first"],
        ["decide", "folder", "note", "--person", "P1", "--reviewer", "R", "--role", "r"],
        [
            "decide",
            "folder",
            "note",
            "--person",
            "P1",
            "--reviewer",
            "R",
            "--role",
            "r",
            "--reason",
            "x",
            "--ear",
            "both",
        ],
    ],
)
def test_wrong_arguments(tmp_path, monkeypatch, capsys, arguments):
    monkeypatch.chdir(tmp_path)
    assert main(arguments) == 2
    said = capsys.readouterr()
    assert said.out == "" and said.err.startswith("usage: audiokit") and "error: " in said.err
    assert list(tmp_path.iterdir()) == []


def test_help(capsys):
    assert main(["--help"]) == 0
    assert {"review", "decide", "example"} <= set(re.findall(r"^    (\w+)", capsys.readouterr().out, re.MULTILINE))
    for command in (["review"], ["decide"], ["decide", "x", "revise_baseline"]):
        assert main([*command, "--help"]) == 0
        assert capsys.readouterr().out.startswith("usage: audiokit " + command[0])


@pytest.fixture
def failing(monkeypatch):
    """Lets `audiokit decide X list` raise what the test wants."""

    def set_error(error: BaseException) -> None:
        def fail(_folder):
            raise error

        monkeypatch.setattr("audiokit.io.decisions.read_log", fail)

    return set_error


@pytest.mark.parametrize(
    ("error", "code", "said"),
    [
        (CohortError("tests.csv, row 7: odd", "mend it"), 2, "audiokit: tests.csv, row 7: odd\n  mend: mend it\n"),
        (CohortError("odd \x1b[31mred"), 2, "audiokit: odd \\x1b[31mred\n"),
        (PermissionError(13, "Permission denied", "a.csv"), 2, "audiokit: [Errno 13] Permission denied: 'a.csv'\n"),
        (KeyboardInterrupt(), 130, "audiokit: interrupted\n"),
    ],
)
def test_errors_become_messages(failing, capsys, error, code, said):
    failing(error)
    assert main(["decide", "x", "list"]) == code
    assert capsys.readouterr() == ("", said)


def test_a_fault_of_the_program_is_not_hidden(failing):
    failing(ZeroDivisionError())
    with pytest.raises(ZeroDivisionError):
        main(["decide", "x", "list"])


@pytest.mark.skipif(os.name == "nt", reason="no /dev/full on Windows")
def test_reader_of_the_output_goes_away(tmp_path):
    reading, writing = os.pipe()
    os.close(reading)
    try:
        done = subprocess.run(
            [sys.executable, "-m", "audiokit", "decide", str(tmp_path), "list"],
            stdout=writing,
            stderr=subprocess.PIPE,
            text=True,
        )
    finally:
        os.close(writing)
    assert (done.returncode, done.stderr) == (cli_main.BROKEN_PIPE, "")


def test_terminal_without_the_letters(tmp_path):
    done = run("decide", str(tmp_path / "Ümläut"), "list", env={**os.environ, "PYTHONIOENCODING": "ascii"})
    assert done.returncode == 2 and "\\xdcml\\xe4ut is not a folder" in done.stderr


@pytest.mark.parametrize("command", ["review", "decide"])
def test_nothing_heavy_is_imported_before_the_subcommand_runs(command):
    code = (
        f"import sys; from audiokit.cli.main import main; main(['{command}', '--help']); print('pandas' in sys.modules)"
    )
    done = subprocess.run([sys.executable, "-X", "importtime", "-c", code], capture_output=True, text=True)
    imported = {line.rsplit("|", 1)[1].strip() for line in done.stderr.splitlines()}
    assert "audiokit.cli.main" in imported and done.stdout.endswith("False\n")
    assert not {"numpy", "pandas", "pyarrow", "plotly", "sqlite3"} & imported


def test_installed_command_is_the_same():
    project = Path(audiokit.__file__).parents[1] / "pyproject.toml"
    assert 'audiokit = "audiokit.cli.main:main"' in project.read_text()


def test_printable_keeps_lines_and_shows_controls():
    assert printable("a\nß\t\x07\u202e") == "a\nß\\x09\\x07\\x202e"
    assert [plural(count, "row") for count in (0, 1, 2)] == ["0 rows", "1 row", "2 rows"]


class Terminal(io.StringIO):
    def isatty(self) -> bool:
        return True


def test_progress_is_shown_on_one_line_of_a_terminal():
    stream = Terminal()
    with ProgressLine(stream) as progress:
        progress("reading north.csv", 1, 4)
        progress("reading north.csv", 2, 4)  # Too soon after the last to be worth showing.
        progress("judging", 7)
        progress("writing", None, None)
        progress("\x1b[2J" + "long " * 200)
    lines = stream.getvalue().split("\r")
    assert [line.rstrip() for line in lines[:4]] == ["", "reading north.csv 25 %", "judging 7", "writing"]
    assert "\x1b" not in stream.getvalue() and len(lines[4]) < 200
    assert lines[5].strip() == "" and lines[6] == ""


def test_progress_is_silent_elsewhere():
    stream = io.StringIO()
    with ProgressLine(stream) as progress:
        progress("reading", 1, 2)
    assert stream.getvalue() == ""
