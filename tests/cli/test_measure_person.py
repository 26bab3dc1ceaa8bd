"""The person beside a real bench: load and limit are confirmed before anything sounds, or nothing does."""

import pytest

from tests.runner.fake_bench import FakeBench
from wattproof.cli.measure_person import DONE, Confirmation, Person
from wattproof.core.errors import WrongUseError
from wattproof.core.rig import Rig
from wattproof.procedures.power_switching import YES
from wattproof.procedures.requests import Action, Ask, Procedure
from wattproof.runner.live import Runner
from wattproof.runner.screen import Asked, Ended


class Answered:
    """A runner whose procedure asks once, and what it was answered."""

    def __init__(self, ask: Ask) -> None:
        self.bench = FakeBench(real=True)
        self.runner = Runner(self.bench, Rig(), self.bench.calibration)
        self.answers: list[object] = []
        self._ask = ask

    def _procedure(self) -> Procedure:
        self.answers.append((yield self._ask))

    def through(self, person: Person) -> None:
        self.runner.start(self._procedure())
        ended = False
        while not ended:
            for event in self.runner.screen.drain():
                if isinstance(event, Asked):
                    person.answer(event.ask_id, event.ask)
                ended = ended or isinstance(event, Ended)


def test_without_terminal_and_confirmation_a_real_bench_is_refused() -> None:
    table = Answered(Ask(Action.CONFIRM, "8"))
    for confirmation in (Confirmation(None, None, 8.0), Confirmation(8.0, None, 8.0), Confirmation(None, 20.0, 8.0)):
        with pytest.raises(WrongUseError, match="--confirm-load OHM --limit-vrms V"):
            Person(table.runner, confirmation, nobody_needed=False).check_before()
    assert table.bench.heard == []


def test_another_load_than_the_one_that_is_confirmed_is_refused() -> None:
    table = Answered(Ask(Action.CONFIRM, "8"))
    with pytest.raises(WrongUseError, match="not the load of 8 ohm"):
        Person(table.runner, Confirmation(4.0, 20.0, 8.0), nobody_needed=False).check_before()


def test_the_simulated_bench_needs_nobody() -> None:
    table = Answered(Ask(Action.CONFIRM, "8"))
    Person(table.runner, Confirmation(None, None, 8.0), nobody_needed=True).check_before()


@pytest.mark.parametrize(("ask", "answer"), [(Ask(Action.CONFIRM, "8"), YES), (Ask(Action.TURN, "full"), DONE)])
def test_a_confirmed_run_goes_on_without_a_terminal(ask: Ask, answer: str) -> None:
    table = Answered(ask)
    person = Person(table.runner, Confirmation(8.0, 20.0, 8.0), nobody_needed=False)
    person.check_before()
    table.through(person)
    assert table.answers == [answer]


def test_a_switch_that_nobody_can_do_stops_the_run() -> None:
    table = Answered(Ask(Action.SWITCH_LOAD, 4.0))
    person = Person(table.runner, Confirmation(8.0, 20.0, 8.0), nobody_needed=False)
    with pytest.raises(WrongUseError, match="somebody has to do this"):
        table.through(person)
    table.runner.close()
    assert table.answers == []
