"""Reads the sentence of a shift back into its numbers, so that it can be recomputed."""

import re
from dataclasses import dataclass
from fractions import Fraction

_SHIFT = re.compile(
    r"^(?P<clause>.+?): sum at (?P<hertz>[\d+]+) Hz (?P<now>.+?) less baseline "
    r"(?P<base_id>.+) of (?P<base_on>\d{4}-\d\d-\d\d)"
    r" (?P<base>.+?)(?P<rest>; .+)$",
    re.DOTALL,
)
_SIDE = re.compile(r"^(?P<cells>.+?)(?:(?P<sign>>?=)(?P<sum>-?[\d.]+)|(?P<none>: no sum))$", re.DOTALL)
_MEAN = re.compile(r"; mean shift (?P<sum>-?[\d.]+)/(?P<count>\d+) (?P<sign>=|>=|<=) (?P<mean>-?[\d.]+) dB")
_AGES = re.compile(
    r"; age correction for (?P<now>\d+) less (?P<then>\d+) years \((?P<clause>[^;]+)\) "
    r"(?P<sum>-?\d+)/(?P<count>\d+) = (?P<mean>-?[\d.]+) dB"
)
_VERDICT = re.compile(r"(?:at least|below) (?P<limit>[\d.]+)(?:: |\? )(?P<answer>yes|no|unknown)")
_CORRECTED = re.compile(r"; corrected shift (?P<sign>=|>=|<=) (?P<mean>-?[\d.]+) dB")
_LEVEL = re.compile(
    r"; mean level (?:(?P<sum>-?[\d.]+)/(?P<count>\d+) (?P<sign>=|>=) (?P<mean>-?[\d.]+) dB|not computable), "
    r"at least (?P<limit>[\d.]+) \((?P<clause>.+?)\)\? (?P<answer>yes|no|unknown)"
)
_BOTH = re.compile(r"; both: (?P<answer>yes|no|unknown)$")

Interval = tuple[Fraction, Fraction | None]


@dataclass
class Words:
    """What one `why` of shifts.csv says; None where it says nothing of the kind.

    now, base : the thresholds at each frequency as intervals (upper end None: open), None where there is none
    now_sum, base_sum : the sums that are written, None where it says that there is none
    mean, corrected, level : sign and number of the mean shift, the corrected shift, the mean level
    ages : age now, age then, sum and mean of the correction
    """

    clause: str
    hertz: tuple[int, ...]
    now: list[Interval | None]
    base: list[Interval | None]
    now_sum: Fraction | None
    base_sum: Fraction | None
    base_id: str
    base_on: str
    mean: tuple[str, Fraction] | None
    corrected: tuple[str, Fraction] | None
    ages: tuple[int, int, int, Fraction] | None
    limit: Fraction
    answer: str
    level: tuple[str, Fraction] | None
    level_limit: Fraction | None
    level_answer: str | None
    both: str | None

    def shifts(self) -> list[Fraction]:
        """Shift at each frequency; for exact thresholds only."""
        pairs = zip(self.now, self.base, strict=True)
        assert all(a and b and a[1] is not None and b[1] is not None for a, b in zip(self.now, self.base, strict=True))
        return [now[0] - base[0] for now, base in pairs if now and base]


def read_why(text: str) -> Words:
    """The numbers of a `why`; a sentence of another form fails."""
    whole = _SHIFT.match(text)
    assert whole, text
    rest = whole["rest"]
    ages, verdict, level, both = (form.search(rest) for form in (_AGES, _VERDICT, _LEVEL, _BOTH))
    assert verdict, text
    now, now_sum = _side(whole["now"])
    base, base_sum = _side(whole["base"])
    return Words(
        clause=whole["clause"],
        hertz=tuple(map(int, whole["hertz"].split("+"))),
        now=now,
        base=base,
        now_sum=now_sum,
        base_sum=base_sum,
        base_id=whole["base_id"],
        base_on=whole["base_on"],
        mean=_signed(_MEAN.search(rest)),
        corrected=_signed(_CORRECTED.search(rest)),
        ages=(int(ages["now"]), int(ages["then"]), int(ages["sum"]), Fraction(ages["mean"])) if ages else None,
        limit=Fraction(verdict["limit"]),
        answer=verdict["answer"],
        level=_signed(level),
        level_limit=Fraction(level["limit"]) if level else None,
        level_answer=level["answer"] if level else None,
        both=both["answer"] if both else None,
    )


def _signed(found: re.Match[str] | None) -> tuple[str, Fraction] | None:
    if found is None or found["mean"] is None:
        return None
    return found["sign"], Fraction(found["mean"])


def _side(text: str) -> tuple[list[Interval | None], Fraction | None]:
    found = _SIDE.match(text)
    assert found, text
    cells = [_cell(cell) for cell in re.split(r"(?<=.)\+", found["cells"])]
    if found["none"]:
        return cells, None
    assert (found["sign"] == ">=") == any(cell is not None and cell[1] is None for cell in cells), text
    return cells, Fraction(found["sum"])


def _cell(text: str) -> Interval | None:
    if re.fullmatch(r"\d+ Hz (did not test|could not test|not recorded)", text):
        return None
    if text.startswith("NR@"):
        return Fraction(text.removeprefix("NR@")), None
    return Fraction(text), Fraction(text)
