"""Cells that hold one of a few words, or a plain number: distinct texts to codes."""

import re
from collections.abc import Mapping

import numpy as np
from numpy.typing import NDArray

from audiokit.core.vocabulary import FREQUENCIES_HZ, Purpose, Sex

UNKNOWN_WORD = -1

SEX_WORDS = {
    "f": Sex.FEMALE, "female": Sex.FEMALE, "woman": Sex.FEMALE,
    "m": Sex.MALE, "male": Sex.MALE, "man": Sex.MALE,
    "": Sex.UNKNOWN, "u": Sex.UNKNOWN, "unknown": Sex.UNKNOWN, "not stated": Sex.UNKNOWN,
}  # fmt: skip
PURPOSE_WORDS = {"": Purpose.BLANK} | {p.name.lower(): p for p in Purpose if p is not Purpose.BLANK}
VALID_WORDS = {"": 1, "yes": 1, "y": 1, "true": 1, "1": 1, "no": 0, "n": 0, "false": 0, "0": 0}
EAR_WORDS = {"right": 0, "r": 0, "left": 1, "l": 1}

_OUR_WORDS: dict[str, Mapping[str, int]] = {
    "sex": SEX_WORDS,
    "purpose": PURPOSE_WORDS | {"blank": Purpose.BLANK},
    "valid": VALID_WORDS,
    "ear": EAR_WORDS,
}
_NUMBER = re.compile(r"[0-9]+(?:\.[0-9]+)?")


def parse_words(texts: list[str], words: Mapping[str, int], own: Mapping[str, str], column: str) -> NDArray[np.int8]:
    """Codes of distinct, stripped texts; UNKNOWN_WORD where a text is none of the words.

    words : accepted words in lower case -> code
    own   : the site's words in lower case -> our word; they win
    """
    ours = _OUR_WORDS[column]

    def code(text: str) -> int:
        word = text.casefold()
        return int(ours[own[word]]) if word in own else int(words.get(word, UNKNOWN_WORD))

    return np.array([code(text) for text in texts], np.int8)


def parse_number(text: str, decimal_comma: bool) -> float:
    """A plain number of at least 0; NaN where the text is none."""
    plain = text.replace(",", ".") if decimal_comma else text
    return float(plain) if _NUMBER.fullmatch(plain) else float("nan")


def parse_numbers(texts: list[str], decimal_comma: bool) -> NDArray[np.float64]:
    """Plain numbers of at least 0 from distinct, stripped texts; NaN where a text is none."""
    return np.array([parse_number(text, decimal_comma) for text in texts], np.float64)


def parse_frequencies(texts: list[str], decimal_comma: bool) -> NDArray[np.int32]:
    """Audiometric frequencies of distinct, stripped texts; 0 where a text is none. [Hz]"""
    numbers = [parse_number(text, decimal_comma) for text in texts]
    return np.array([int(n) if n in FREQUENCIES_HZ else 0 for n in numbers], np.int32)
