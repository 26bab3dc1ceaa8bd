"""A question has one answer, from whichever thread, and a stop ends the waiting for it."""

import threading

import pytest

from wattproof.core.errors import StoppedError, WrongUseError
from wattproof.runner.asks import Asks


def test_an_answer_that_came_before_the_waiting_is_not_lost() -> None:
    asks = Asks()
    asks.answer(asks.open(), 4.0)
    assert asks.wait(threading.Event()) == 4.0


def test_a_second_answer_is_refused() -> None:
    asks = Asks()
    ask_id = asks.open()
    asks.answer(ask_id, "left")
    with pytest.raises(WrongUseError, match="question 1 is not open; answer the one that was asked last"):
        asks.answer(ask_id, "right")
    assert asks.wait(threading.Event()) == "left"


def test_each_question_has_a_number_of_its_own() -> None:
    asks = Asks()
    first = asks.open()
    asks.answer(first, 1.0)
    asks.wait(threading.Event())
    assert asks.open() != first


def test_a_stop_that_was_set_before_ends_the_waiting_at_once() -> None:
    asks = Asks()
    asks.open()
    stop = threading.Event()
    stop.set()
    with pytest.raises(StoppedError):
        asks.wait(stop)
