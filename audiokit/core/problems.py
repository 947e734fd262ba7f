"""Catalogue of the problems for which a row of a file is put in quarantine.

Templates may name {file}, {row}, {column}, {value} and {detail}; `detail` is what the check itself adds (see each
entry's `detail`). Every fragment is filled for many rows at once by `audiokit.io.quarantine`.
"""

from dataclasses import dataclass

from audiokit.core.vocabulary import HIGHEST_DB_HL, LOWEST_DB_HL

_PLACE = "{file}, row {row}"
_CELL = "{file}, row {row}, column {column}"


@dataclass(frozen=True)
class ProblemKind:
    """One kind of problem.

    code    : stable word, as it stands in quarantine.csv
    problem : sentence template saying what was found and what is allowed
    mend    : sentence template saying what to do
    detail  : what fills {detail}, blank where the templates do not use it
    """

    code: str
    problem: str
    mend: str
    detail: str = ""


_KINDS = (
    ProblemKind(
        "blank_row",
        f"{_PLACE}: no cell of this row holds anything.",
        "Delete the empty row.",
    ),
    ProblemKind(
        "ragged_row",
        f"{_PLACE}: {{detail}}.",
        "Give the row one cell per heading; put quotation marks around a text that contains the delimiter.",
        "how many cells the row has and how many the headings have",
    ),
    ProblemKind(
        "duplicate_row",
        f"{_PLACE}: equal in every field to {{detail}}.",
        "Delete the repeated row; only the first one counts.",
        "file and row of the first one",
    ),
    ProblemKind(
        "conflicting_key",
        f"{_CELL}: {{detail}}. None of these rows is used.",
        "Correct or delete the wrong rows, so that one remains.",
        "which key is shared with which other row",
    ),
    ProblemKind(
        "missing_person_id",
        f"{_CELL}: no person is named.",
        "Enter the person's identifier.",
    ),
    ProblemKind(
        "formula_like_id",
        f"{_CELL}: the identifier {{value}} begins as a spreadsheet formula does (=, @, +, -, tab).",
        "Use an identifier that begins with a letter or a digit.",
    ),
    ProblemKind(
        "unknown_person",
        f"{_CELL}: {{value}} {{detail}}.",
        "Add or correct the person's row in the people table, or correct the identifier here.",
        "why the person is not known",
    ),
    ProblemKind(
        "unknown_sex",
        f"{_CELL}: {{value}} is not a sex; female, male, unknown, f, m, u or blank are.",
        "Correct the cell, or name the site's own words under [codes.sex] in cohort.toml.",
    ),
    ProblemKind(
        "conflicting_birth",
        f"{_CELL}: year of birth {{value}} and birth date {{detail}} disagree.",
        "Correct the one that is wrong, or leave it blank.",
        "the birth date",
    ),
    ProblemKind(
        "unreadable_year",
        f"{_CELL}: {{value}} is not a year; four digits from 1850 to 2200, or blank, are.",
        "Enter the year with four digits, or leave the cell blank.",
    ),
    ProblemKind(
        "missing_date",
        f"{_CELL}: the date of the test is blank.",
        "Enter the date of the test as year-month-day, for example 2024-03-31.",
    ),
    ProblemKind(
        "unreadable_date",
        f"{_CELL}: {{value}} is not a date as expected here: {{detail}}.",
        'Write the date as year-month-day, or, where the whole file uses another order, set date_order = "dmy" '
        '(or "mdy", "ymd") for this file in cohort.toml.',
        "the forms that are accepted",
    ),
    ProblemKind(
        "impossible_date",
        f"{_CELL}: {{value}} does not exist in the calendar, or lies outside the years {{detail}}.",
        "Correct the date.",
        "first and last year accepted",
    ),
    ProblemKind(
        "zone_offset",
        f"{_CELL}: {{value}} carries a time zone; only local time is understood.",
        "Write the local time of the test without Z or an offset.",
    ),
    ProblemKind(
        "before_birth",
        f"{_CELL}: the test of {{value}} lies before the person's birth ({{detail}}).",
        "Correct the date of the test, or the birth in the people table.",
        "birth date or year of birth",
    ),
    ProblemKind(
        "unknown_purpose",
        f"{_CELL}: {{value}} is not a purpose; baseline, annual, retest, exit, other or blank are.",
        "Correct the cell, or name the site's own words under [codes.purpose] in cohort.toml.",
    ),
    ProblemKind(
        "unknown_valid",
        f"{_CELL}: {{value}} says neither yes nor no; blank means yes.",
        "Enter yes or no, or name the site's own words under [codes.valid] in cohort.toml.",
    ),
    ProblemKind(
        "unreadable_number",
        f"{_CELL}: {{value}} is not a number of at least 0.",
        "Enter a plain number, or leave the cell blank.",
    ),
    ProblemKind(
        "unreadable_threshold",
        f"{_CELL}: {{value}} is not a threshold; a number of dB HL, NR, NR@90, >90, 90+, DNT, CNT or blank are.",
        "Correct the cell, or name the site's own codes under [cells] in cohort.toml.",
    ),
    ProblemKind(
        "out_of_range",
        f"{_CELL}: {{value}} lies outside {LOWEST_DB_HL} to {HIGHEST_DB_HL} dB HL.",
        "Correct the cell; if it is a code of the site, name it under [cells] in cohort.toml.",
    ),
    ProblemKind(
        "finer_than_tenth",
        f"{_CELL}: {{value}} is finer than a tenth of a dB.",
        "Enter the threshold with at most one decimal.",
    ),
    ProblemKind(
        "unknown_ear",
        f"{_CELL}: {{value}} is not an ear; right or left are.",
        "Correct the cell, or name the site's own words under [codes.ear] in cohort.toml.",
    ),
    ProblemKind(
        "unknown_frequency",
        f"{_CELL}: {{value}} is not an audiometric frequency; {{detail}} Hz are.",
        "Enter the frequency in Hz.",
        "the accepted frequencies",
    ),
    ProblemKind(
        "inconsistent_test",
        f"{_PLACE}: {{detail}} is not the same in all rows of this test. None of them is used.",
        "Write the same value in every row of the test.",
        "name of the column",
    ),
)

PROBLEMS = {kind.code: kind for kind in _KINDS}
"""Every kind of problem by its code."""
