"""The wiring check: each mistake that a person makes gets a sentence that says what is wrong and what to do."""

import pytest

from wattproof.core.errors import WrongUseError
from wattproof.procedures.wiring_check import Join, check_joins, check_pad, check_path

JOINS = (Join(1, 1), Join(2, 2))
LEVEL = 0.01


def test_a_loop_as_asked_passes() -> None:
    check_joins(JOINS, {1: [0.01, 1e-7], 2: [1e-7, 0.009]}, LEVEL)
    check_path(JOINS[0], inverted=False, echo=0.002)
    check_pad(JOINS[0], 0.1)


@pytest.mark.parametrize(
    ("heard", "words"),
    [
        ({1: [1e-7, 0.01], 2: [0.01, 1e-7]}, "channels are swapped; swap two plugs"),
        ({1: [1e-7, 1e-7], 2: [1e-7, 0.01]}, "no signal from output 1 at any input: a cable is missing"),
        ({1: [1e-7, 1e-7, 0.01], 2: [1e-7, 0.01, 1e-7]}, "output 1 comes back at input 3: the wrong input"),
        ({1: [0.01, 0.005], 2: [1e-7, 0.01]}, r"input 2 too \(-6 dB\): monitoring is on"),
    ],
)
def test_a_mistake_is_named(heard: dict[int, list[float]], words: str) -> None:
    with pytest.raises(WrongUseError, match=words):
        check_joins(JOINS, heard, LEVEL)


def test_a_turned_sign_and_a_second_arrival_are_named() -> None:
    with pytest.raises(WrongUseError, match="turns the polarity"):
        check_path(JOINS[0], inverted=True, echo=0.0)
    with pytest.raises(WrongUseError, match="monitoring is on"):
        check_path(JOINS[0], inverted=False, echo=0.1)


@pytest.mark.parametrize(
    ("pad", "words"), [(0.99, "0.1 dB by the pad: it is not in the way"), (0.0, "cable is missing")]
)
def test_a_pad_that_is_not_there_is_named(pad: float, words: str) -> None:
    with pytest.raises(WrongUseError, match=words):
        check_pad(JOINS[1], pad)
