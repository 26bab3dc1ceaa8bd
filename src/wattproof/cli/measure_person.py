"""The person at the terminal: confirms load and limits, does what is asked, and says "I am here"."""

import queue
import sys
import threading

import attrs
import click

from wattproof.core.errors import WattproofError, WrongUseError
from wattproof.procedures.driving import HERE
from wattproof.procedures.guard import FIRST_POWER_UP
from wattproof.procedures.power_switching import YES
from wattproof.procedures.requests import Action, Ask
from wattproof.report.around_words import around_asked
from wattproof.report.power_words import asked
from wattproof.runner.live import Runner

DONE = "done"


@attrs.frozen
class Confirmation:
    """What the command line confirms of a real bench, and the load that the first row needs."""

    load_ohm: float | None
    limit_vrms: float | None
    wanted_ohm: float

    @property
    def complete(self) -> bool:
        """Whether load and limit were both given."""
        return self.load_ohm is not None and self.limit_vrms is not None


class Person:
    """Answers what the runner asks, at a terminal. `nobody_needed`: the simulated bench does it by itself."""

    def __init__(self, runner: Runner, confirmation: Confirmation, *, nobody_needed: bool) -> None:
        self._runner = runner
        self._confirmation = confirmation
        self._nobody_needed = nobody_needed
        self._lines: queue.SimpleQueue[str] = queue.SimpleQueue()
        self._listener: threading.Thread | None = None

    @property
    def at_terminal(self) -> bool:
        """Whether somebody can be asked."""
        return sys.stdin is not None and sys.stdin.isatty() and sys.stderr is not None and sys.stderr.isatty()

    def check_before(self) -> None:
        """Refuse a real bench that nobody confirms, before anything is asked or sounds.

        Raises:
            WrongUseError: no terminal and no confirmation, or one of another load.
        """
        if self._nobody_needed:
            return
        given, wanted = self._confirmation.load_ohm, self._confirmation.wanted_ohm
        if given is not None and abs(given / wanted - 1.0) > 0.1:
            raise WrongUseError(
                f"--confirm-load {given:g} is not the load of {wanted:g} ohm that is to be measured first"
            )
        if not self.at_terminal and not self._confirmation.complete:
            raise WrongUseError(
                "a real bench needs a person to confirm load and limit: run it in a terminal, or give "
                "--confirm-load OHM --limit-vrms V"
            )
        if self.at_terminal:
            for line in FIRST_POWER_UP:
                click.echo(f"- {line}", err=True)

    def answer(self, ask_id: int, ask: Ask) -> None:
        """Answer a question, or stop the run where nobody can.

        Raises:
            WrongUseError: nobody is there to do it.
        """
        around = around_asked(ask)
        if around is not None and ask.action is Action.CONFIRM and self.at_terminal:
            self._runner.answer(ask_id, click.prompt(around, err=True, type=str))
            return
        if around is None and self._nobody_needed:  # a recording: what was asked for was done when it was made
            self._runner.answer(ask_id, YES if ask.action is Action.CONFIRM else DONE)
            return
        if ask.action is Action.CONFIRM and around is None and self._confirmation.complete:
            self._runner.answer(ask_id, YES)
            return
        if ask.action is Action.TURN and around is None and not self.at_terminal:
            self._runner.answer(ask_id, DONE)  # whoever confirmed load and limit has set the control
            return
        if not self.at_terminal:
            self._runner.stop()
            raise WrongUseError(f"somebody has to do this: {asked(ask)}; run it in a terminal")
        if ask.action is Action.CONFIRM:
            said = click.confirm(asked(ask), err=True, default=False)
            self._runner.answer(ask_id, YES if said else "no")
            return
        click.prompt(f"{asked(ask)}. Press Enter when it is done", default="", show_default=False, err=True)
        self._runner.answer(ask_id, DONE)

    def prompt(self, ask: Ask) -> None:
        """Say what may be done while the tone sounds; from then on Enter means "I am here"."""
        if self._nobody_needed or not self.at_terminal:
            return
        more = " (press Enter)" if ask.want == HERE else ""
        click.echo(f"{asked(ask)}{more}", err=True)
        if ask.want == HERE and self._listener is None:
            self._listener = threading.Thread(target=self._listen, name="wattproof-enter", daemon=True)
            self._listener.start()

    def look(self) -> None:
        """Pass on each "I am here" that was said."""
        while not self._lines.empty():
            self._lines.get()
            try:
                self._runner.here()
            except WattproofError:
                return

    def _listen(self) -> None:
        line = sys.stdin.readline()
        self._lines.put(line)
        self._listener = None
