"""What a threshold cell says: distinct texts to levels and responses, in exact tenths of a dB HL."""

import re
from collections.abc import Mapping
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from audiokit.core.vocabulary import HIGHEST_DB_HL, LOWEST_DB_HL, Response
from audiokit.io.texts import number_text

_NUMBER = r"-?[0-9]+(?:\.[0-9]+)?"
_MEASURED = re.compile(_NUMBER)
_NO_RESPONSE_AT = re.compile(rf"NR\s*@\s*({_NUMBER})|>\s*({_NUMBER})|({_NUMBER})\s*\+", re.IGNORECASE)
_WORDS = {"DNT": Response.DID_NOT_TEST, "CNT": Response.COULD_NOT_TEST, "": Response.NOT_RECORDED}

DEFAULT_LIMITS_TENTHS = {250: 900, 8000: 900}
OTHER_LIMIT_TENTHS = 1000
"""Level of a bare NR where the site sets none: 90 dB HL at 250 and 8000 Hz, else 100 (the file contract)."""


@dataclass(frozen=True)
class CellRules:
    """How one file writes its thresholds.

    codes         : the site's own codes, exact stripped text -> response
    limits        : frequency -> level of a bare "no response", in tenths of a dB HL
    decimal_comma : True where 7,5 means seven and a half
    by_number     : True where numbers come as numbers, so that the code "999.0" is the number 999
    """

    codes: Mapping[str, Response] = field(default_factory=dict)
    limits: Mapping[int, int] = field(default_factory=dict)
    decimal_comma: bool = False
    by_number: bool = False

    def limit(self, frequency_hz: int) -> int:
        """Level of a bare "no response". [tenths of a dB HL]"""
        return self.limits.get(frequency_hz, DEFAULT_LIMITS_TENTHS.get(frequency_hz, OTHER_LIMIT_TENTHS))

    def response(self, text: str) -> Response | None:
        """What the site's own codes say about a text; None where they say nothing."""
        if text in self.codes:
            return self.codes[text]
        if self.by_number:
            return {plain_number(code): response for code, response in self.codes.items()}.get(plain_number(text))
        return None


@dataclass(frozen=True)
class ParsedCells:
    """Per distinct text: level in tenths of a dB HL (0 where there is none), response, fault code ("" where none).

    at_limit : True where the level is the limit set for the frequency, which `levels` fills in
    """

    level: NDArray[np.int16]
    response: NDArray[np.int8]
    fault: NDArray[np.object_]
    at_limit: NDArray[np.bool_]

    def levels(self, limit: int) -> NDArray[np.int16]:
        """Levels with the limit of one frequency put in. [tenths of a dB HL]"""
        return np.where(self.at_limit, np.int16(limit), self.level)


def plain_number(text: str) -> str:
    """Shortest text of a number, the text itself where it is none."""
    return number_text(float(text)) if _MEASURED.fullmatch(text) else text


def _tenths(number: str) -> tuple[int, str]:
    """A plain decimal text in tenths of a dB HL, and what is wrong with it."""
    whole, _, decimals = number.partition(".")
    if decimals[1:].strip("0"):
        return 0, "finer_than_tenth"
    if len(whole) > 9:
        return 0, "out_of_range"
    value = int(whole.lstrip("-")) * 10 + int(decimals[:1] or 0)
    value = -value if whole.startswith("-") else value
    if not LOWEST_DB_HL * 10 <= value <= HIGHEST_DB_HL * 10:
        return 0, "out_of_range"
    return value, ""


def _parse(text: str, rules: CellRules) -> tuple[int, Response, str, bool]:
    """Level, response, fault, and whether the level is the frequency's limit."""
    own = rules.response(text)
    if own is not None:
        return 0, own, "", own is Response.NO_RESPONSE
    plain = text.replace("\u2212", "-")
    if rules.decimal_comma:
        plain = plain.replace(",", ".")
    upper = plain.upper()
    if upper in _WORDS:
        return 0, _WORDS[upper], "", False
    if upper == "NR":
        return 0, Response.NO_RESPONSE, "", True
    if _MEASURED.fullmatch(plain):
        level, fault = _tenths(plain)
        return level, Response.MEASURED, fault, False
    at = _NO_RESPONSE_AT.fullmatch(plain)
    if at:
        level, fault = _tenths(next(group for group in at.groups() if group))
        return level, Response.NO_RESPONSE, fault, False
    return 0, Response.NOT_RECORDED, "unreadable_threshold", False


def parse_cells(texts: list[str], rules: CellRules) -> ParsedCells:
    """Levels and responses of distinct, stripped texts.

    A fault is one of finer_than_tenth, out_of_range, unreadable_threshold.
    """
    found = [_parse(text, rules) for text in texts]
    level, response, fault, at_limit = zip(*found, strict=True) if found else ((), (), (), ())
    return ParsedCells(
        np.array(level, np.int16), np.array(response, np.int8), np.array(fault, object), np.array(at_limit, np.bool_)
    )
