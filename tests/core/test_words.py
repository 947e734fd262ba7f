"""The codes that arrays carry, the words of the files, and the errors a user sees."""

import inspect

import pytest

from audiokit.core import errors
from audiokit.core.problems import PROBLEMS, ProblemKind
from audiokit.core.vocabulary import EARS, FREQUENCIES_HZ, Bound, Met, Purpose, Response, Sex


def test_ears_and_frequencies() -> None:
    assert EARS == ("right", "left")
    assert sorted(set(FREQUENCIES_HZ)) == list(FREQUENCIES_HZ)
    assert {500, 1000, 2000, 3000, 4000, 6000} <= set(FREQUENCIES_HZ), "29 CFR 1910.95(h)(1)"
    assert (FREQUENCIES_HZ[0], FREQUENCIES_HZ[-1]) == (125, 16000)


def test_codes_have_the_order_that_arithmetic_uses() -> None:
    assert Met.NO < Met.UNKNOWN < Met.YES
    assert [min(a, b) for a in Met for b in Met] == [a if a < b else b for a in Met for b in Met]
    assert [response for response in Response if response <= Response.NO_RESPONSE] == [0, 1], "those with a level"
    for words in (Response, Purpose, Sex, Met, Bound):
        assert [int(word) for word in words] == list(range(len(words))), "codes index tables"


def test_the_five_states_of_a_cell_are_five() -> None:
    names = {"MEASURED", "NO_RESPONSE", "DID_NOT_TEST", "COULD_NOT_TEST", "NOT_RECORDED"}
    assert {response.name for response in Response} == names


ERRORS = [cls for _, cls in inspect.getmembers(errors, inspect.isclass) if issubclass(cls, errors.AudiokitError)]


@pytest.mark.parametrize("error", ERRORS, ids=lambda cls: cls.__name__)
def test_errors_say_what_and_how_to_mend(error: type[errors.AudiokitError]) -> None:
    raised = error("people.csv, row 3: no person", "enter one")
    assert (raised.message, raised.mend) == ("people.csv, row 3: no person", "enter one")
    assert str(raised) == "people.csv, row 3: no person\n  mend: enter one"
    assert str(error("only this")) == "only this"
    assert isinstance(raised, errors.AudiokitError)


@pytest.mark.parametrize("kind", PROBLEMS.values(), ids=lambda kind: kind.code)
def test_problems_name_the_place_and_the_mend(kind: ProblemKind) -> None:
    filled = {"file": "f.csv", "row": 7, "column": "c", "value": "v", "detail": "d"}
    text = kind.problem.format(**filled)
    assert text.startswith("f.csv, row 7") and text.endswith(".")
    assert kind.mend.format(**filled).endswith(".")
    assert ("{detail}" in kind.problem + kind.mend) == bool(kind.detail)
    assert PROBLEMS[kind.code] is kind
