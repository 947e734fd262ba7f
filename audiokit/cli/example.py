"""`audiokit example`: write an invented cohort into a new or empty folder."""

import argparse
from pathlib import Path
from typing import Any

from audiokit.cli.console import printable
from audiokit.example.scenario import DEFAULT_PEOPLE, DEFAULT_SEED, FEWEST_PEOPLE, MOST_PEOPLE


def register(subparsers: Any) -> None:
    """Add the subcommand to the parser of `audiokit`."""
    parser = subparsers.add_parser(
        "example",
        help="write an invented cohort to try things on",
        description="Write an invented cohort, with the faults that real files have, into a new or empty folder. "
        "The same seed and number of people give the same files. Nobody in it exists.",
    )
    parser.add_argument(
        "folder", metavar="FOLDER", nargs="?", type=Path, default=Path("example_cohort"), help="default: %(default)s"
    )
    parser.add_argument("--seed", metavar="N", type=int, default=DEFAULT_SEED, help="default: %(default)s")
    parser.add_argument(
        "--people",
        metavar="N",
        type=int,
        default=DEFAULT_PEOPLE,
        help=f"{FEWEST_PEOPLE} to {MOST_PEOPLE}; default: %(default)s",
    )
    parser.set_defaults(run=_run)


def _run(arguments: argparse.Namespace) -> int:
    from audiokit.example.maker import make_example

    example = make_example(arguments.folder, seed=arguments.seed, people=arguments.people)
    rows = ", ".join(f"{count} rows in {file}" for file, count in example.rows.items())
    print(printable(f"{example.folder}: {example.people} invented people; {rows}"))
    print(printable(f'next: audiokit review "{example.folder}" --out review'))
    return 0
