"""A procedure is driven to its end, stopped where it yields, and never left open."""

import threading
from collections.abc import Callable

import pytest

from wattproof.core.errors import BenchLostError, StoppedError, WattproofError, WrongUseError
from wattproof.core.run import Ending
from wattproof.core.signal import Tone
from wattproof.procedures.requests import Play, Procedure, Record, Request, Shown, Wanted
from wattproof.runner.drive import Answer, Drive

PLAY = Play(Tone(997.0, 0.1))
SHOWN = Shown(())


class Table:
    """Drives a procedure, answers every request with 7, and remembers. `on_request` may stop or raise."""

    def __init__(self, procedure: Procedure, on_request: Callable[["Table"], None] = lambda _: None) -> None:
        self.stop = threading.Event()
        self.requests: list[Request] = []
        self.records: list[Record] = []
        self.on_request = on_request
        self.drive = Drive(procedure, self._answer, self.records.append, self.stop)

    def _answer(self, request: Request) -> Answer:
        self.requests.append(request)
        self.on_request(self)
        return 7


def test_a_procedure_that_ends_is_done() -> None:
    def procedure() -> Procedure:
        assert (yield PLAY) == 7
        yield SHOWN

    table = Table(procedure())
    assert table.drive.run() == (Ending.DONE, "")
    assert (table.requests, table.records) == ([PLAY], [SHOWN])


def test_a_procedure_that_yields_nothing_is_done() -> None:
    def procedure() -> Procedure:
        yield from ()

    assert Table(procedure()).drive.run() == (Ending.DONE, "")


def test_a_stop_is_thrown_at_the_yield_and_is_the_ending() -> None:
    thrown: list[Exception] = []

    def procedure() -> Procedure:
        try:
            yield PLAY
        except StoppedError as error:
            thrown.append(error)
            raise

    assert Table(procedure(), lambda table: table.stop.set()).drive.run() == (Ending.STOPPED, "")
    assert len(thrown) == 1


def test_what_was_stopped_before_it_began_asks_for_nothing() -> None:
    def procedure() -> Procedure:
        yield PLAY

    table = Table(procedure())
    table.stop.set()
    assert table.drive.run() == (Ending.STOPPED, "")
    assert table.requests == []


def test_a_stopped_procedure_may_tell_what_it_has_but_ask_for_nothing_more() -> None:
    closed: list[str] = []

    def procedure() -> Procedure:
        try:
            yield PLAY
        except StoppedError:
            yield SHOWN
            yield SHOWN
        try:
            yield Wanted()
        except GeneratorExit:
            closed.append("closed")
            raise

    table = Table(procedure(), lambda table: table.stop.set())
    assert table.drive.run() == (Ending.STOPPED, "")
    assert (table.requests, table.records, closed) == ([PLAY], [SHOWN, SHOWN], ["closed"])


def test_a_procedure_that_catches_the_stop_and_ends_was_still_stopped() -> None:
    def procedure() -> Procedure:
        try:
            yield PLAY
        except StoppedError:
            return

    assert Table(procedure(), lambda table: table.stop.set()).drive.run() == (Ending.STOPPED, "")


def test_a_stopped_procedure_that_talks_without_end_is_cut_short() -> None:
    def procedure() -> Procedure:
        try:
            yield PLAY
        except StoppedError:
            while True:
                yield SHOWN

    assert Table(procedure(), lambda table: table.stop.set()).drive.run() == (Ending.STOPPED, "")


def test_a_procedure_that_cannot_be_closed_does_not_hold_the_ending_up() -> None:
    def procedure() -> Procedure:
        while True:
            try:
                yield PLAY
            except (StoppedError, GeneratorExit):
                yield SHOWN

    table = Table(procedure(), lambda table: table.stop.set())
    assert table.drive.run() == (Ending.STOPPED, "")


def _raises(error: Exception) -> Callable[[Table], None]:
    def on_request(_: Table) -> None:
        raise error

    return on_request


def test_a_refusal_is_thrown_at_the_yield_and_a_procedure_may_go_on() -> None:
    def procedure() -> Procedure:
        try:
            yield PLAY
        except WrongUseError:
            yield SHOWN

    table = Table(procedure(), _raises(WrongUseError("too loud")))
    assert table.drive.run() == (Ending.DONE, "")
    assert table.records == [SHOWN]


def test_a_refusal_that_nobody_catches_is_a_failure_and_says_why() -> None:
    def procedure() -> Procedure:
        yield PLAY

    assert Table(procedure(), _raises(WrongUseError("too loud"))).drive.run() == (Ending.FAILED, "too loud")


def test_a_lost_bench_is_a_failure_even_where_the_procedure_concludes() -> None:
    def procedure() -> Procedure:
        try:
            yield PLAY
        except BenchLostError:
            yield SHOWN
        yield PLAY

    table = Table(procedure(), _raises(BenchLostError("pulled out")))
    assert table.drive.run() == (Ending.FAILED, "pulled out")
    assert (table.requests, table.records) == ([PLAY], [SHOWN])


def test_an_error_of_the_procedure_itself_is_a_failure() -> None:
    def procedure() -> Procedure:
        yield PLAY
        raise WattproofError("no crossing was found")

    assert Table(procedure()).drive.run() == (Ending.FAILED, "no crossing was found")


def test_what_nobody_foresaw_comes_out_and_the_procedure_is_closed() -> None:
    closed: list[str] = []

    def procedure() -> Procedure:
        try:
            yield PLAY
        finally:
            closed.append("closed")

    with pytest.raises(ZeroDivisionError):
        Table(procedure(), _raises(ZeroDivisionError())).drive.run()
    assert closed == ["closed"]
