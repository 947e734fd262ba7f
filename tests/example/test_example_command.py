"""`audiokit example` at the command line."""

import argparse

import pytest

from audiokit.cli import example
from audiokit.core.errors import OutputError


def _parse(*words):
    parser = argparse.ArgumentParser()
    example.register(parser.add_subparsers())
    return parser.parse_args(["example", *words])


def test_it_writes_the_folder_and_says_what_to_do_next(tmp_path, capsys):
    arguments = _parse(str(tmp_path / "cohort"), "--seed", "3", "--people", "120")
    assert arguments.run(arguments) == 0
    assert (tmp_path / "cohort" / "people.csv").exists()
    out = capsys.readouterr().out
    assert "120 invented people" in out
    assert "audiokit review" in out


def test_it_has_defaults():
    arguments = _parse()
    assert (str(arguments.folder), arguments.people) == ("example_cohort", 400)


def test_a_folder_that_is_not_empty_is_refused(tmp_path):
    (tmp_path / "x").write_text("")
    arguments = _parse(str(tmp_path))
    with pytest.raises(OutputError, match="is not empty"):
        arguments.run(arguments)


def test_a_seed_that_is_no_number_is_refused(capsys):
    with pytest.raises(SystemExit) as stop:
        _parse("--seed", "x")
    assert stop.value.code == 2
    assert "invalid int value: 'x'" in capsys.readouterr().err
