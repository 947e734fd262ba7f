"""`audiokit review`: from a cohort folder to a folder of findings."""

import argparse
import datetime
import re
import sys
from pathlib import Path
from typing import TYPE_CHECKING, Any

from audiokit.cli.console import ProgressLine, plural, printable
from audiokit.core.errors import OutputError

if TYPE_CHECKING:
    from audiokit.model.cohort import Cohort

_USAGE = """audiokit review COHORT --out DIR [--rulebook ID ...] [--as-of DATE]
                       [--age-correction | --no-age-correction]
                       [--baseline-revision reviewed|automatic]"""


def register(subparsers: Any) -> None:
    """Add the subcommand to the parser of `audiokit`."""
    parser = subparsers.add_parser(
        "review",
        usage=_USAGE,
        help="review a cohort: shifts, events, baselines, worklist, and every row that could not be used",
        description="Reads the cohort folder and writes the findings into a folder of their own. Options override "
        "cohort.toml. COHORT comes first, because --rulebook takes every word after it.",
    )
    parser.add_argument("cohort", metavar="COHORT", type=Path, help="folder with people and tests")
    parser.add_argument("--out", metavar="DIR", type=Path, required=True, help="folder for the findings")
    parser.add_argument(
        "--rulebook", metavar="ID", action="extend", nargs="+", help="one or more rulebooks, for example us-osha"
    )
    parser.add_argument(
        "--as-of", metavar="DATE", type=iso_date, help="review as on this date (default: cohort.toml, else today)"
    )
    parser.add_argument(
        "--age-correction",
        action=argparse.BooleanOptionalAction,
        help="apply the rulebook's own age table, or do not",
    )
    parser.add_argument(
        "--baseline-revision",
        choices=("reviewed", "automatic"),
        help="who revises baselines: reviewers' decisions, or the published rules by themselves",
    )
    parser.set_defaults(run=_run)


def iso_date(text: str) -> datetime.date:
    """An ISO date from the command line; other orders of day and month are not guessed."""
    if re.fullmatch(r"\d{4}-\d{2}-\d{2}", text, re.ASCII):
        try:
            return datetime.date.fromisoformat(text)
        except ValueError as error:
            raise argparse.ArgumentTypeError(f"{text!r} is no date: {error}") from None
    raise argparse.ArgumentTypeError(f"{text!r} is no date; write it as year-month-day, for example 2026-03-01")


def _run(arguments: argparse.Namespace) -> int:
    from audiokit.io.atomic_target import check_target, resolved

    out = check_target(arguments.out)
    if out == resolved(arguments.cohort):
        raise OutputError(f"{out} is the cohort folder itself", f"choose another, for example {out / 'review'}")

    from audiokit.io.cohort import read_cohort
    from audiokit.reports.folder import write_review
    from audiokit.surveillance.review import review

    with ProgressLine(sys.stderr) as progress:
        cohort = read_cohort(
            arguments.cohort,
            rulebooks=arguments.rulebook,
            as_of=arguments.as_of,
            age_correction=arguments.age_correction,
            baseline_revision=arguments.baseline_revision,
            progress=progress,
        )
        findings = review(cohort, progress=progress)
        write_review(findings, arguments.out, progress=progress)
    print(printable(summary_text(cohort, findings.summary(), out)))
    return 0


def summary_text(cohort: "Cohort", summary: dict[str, Any], out: Path) -> str:
    """What was read and found, in a few lines.

    summary : people, tests, tests_left_out: counts; events: criterion -> outcome -> count;
              worklist: action -> (count, overdue)
    """
    settings = cohort.settings
    revision = "by decisions only" if settings.baseline_revision == "reviewed" else "by the published rules"
    left_out = summary["tests_left_out"]
    quarantined = sum(file.quarantined for file in cohort.intake)
    lines = [
        f"{settings.name}, as of {settings.as_of}",
        f"rulebook {', '.join(settings.rulebooks)}; age correction {'on' if settings.age_correction else 'off'}; "
        f"baselines revised {revision}",
        "",
        *_table([("file", "rows read", "accepted", "quarantined"), *map(_intake_row, cohort.intake)]),
        "",
        f"{plural(summary['people'], 'person', 'people')}, {plural(summary['tests'], 'test')}"
        + (f", {left_out} more left out: quality.csv says why" if left_out else ""),
        "",
        "Events",
        *_event_lines(summary["events"]),
        "",
        "Worklist",
        *(_table([("action", "lines", "overdue"), *_work_rows(summary["worklist"])]) or ["  nothing to do"]),
        "",
        f"Written to {out}: start with summary.html and worklist.csv.",
    ]
    if quarantined:
        lines.append(f"{plural(quarantined, 'row')} could not be used: quarantine.csv says why, and how to mend each.")
    return "\n".join(lines)


def _intake_row(file: Any) -> tuple[str, str, str, str]:
    return file.file, str(file.rows_read), str(file.accepted), str(file.quarantined)


def _event_lines(events: dict[str, dict[str, int]]) -> list[str]:
    lines = [
        f"  {criterion}: " + ", ".join(f"{count} {outcome}" for outcome, count in outcomes.items() if count)
        for criterion, outcomes in events.items()
        if any(outcomes.values())
    ]
    return lines or ["  none"]


def _work_rows(worklist: dict[str, tuple[int, int]]) -> list[tuple[str, str, str]]:
    return [(action, str(count), str(overdue)) for action, (count, overdue) in worklist.items() if count]


def _table(rows: list[tuple[str, ...]]) -> list[str]:
    """Rows under their heading, numbers to the right; nothing where there is only the heading."""
    if len(rows) < 2:
        return []
    widths = [max(len(cell) for cell in column) for column in zip(*rows, strict=True)]
    return ["  " + "  ".join([row[0].ljust(widths[0]), *map(str.rjust, row[1:], widths[1:])]).rstrip() for row in rows]
