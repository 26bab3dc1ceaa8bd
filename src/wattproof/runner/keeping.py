"""Keeps what a power measurement finds in a session file, while it runs."""

from collections.abc import Callable

from wattproof.bench.protocol import Bench
from wattproof.core.run import Ending
from wattproof.procedures.again import name_of
from wattproof.procedures.requests import Kept
from wattproof.runner.held import RawCapture
from wattproof.runner.measuring import Measurement
from wattproof.runner.screen import Ended, Event, Told
from wattproof.store.session_file import RunLog, SessionFile
from wattproof.store.session_values import BenchFacts, Keeping, Stretch


class SessionKeeper:
    """Hands the records of one measurement to a session. Give `keep` to the measurement as its keeper, then `begin`."""

    def __init__(self, session: SessionFile, keeping: Keeping = Keeping.ALL) -> None:
        self._session, self._keeping = session, keeping
        self._log: RunLog | None = None
        self._ended: Ended | None = None

    @property
    def trouble(self) -> str:
        """Why nothing is kept any more; empty while all is well."""
        return self._session.trouble

    def begin(self, measurement: Measurement, bench: Bench) -> None:
        """Write down how the run begins, before anything sounds.

        Raises:
            WrongUseError: the session cannot be written.
        """
        place = measurement.place
        self._log = self._session.begin_run(
            name_of(measurement.plan),
            measurement.plan,
            place.rig,
            place.calibration,
            facts_of(bench),
            rows=measurement.rows,
            keeping=self._keeping,
        )

    def keep(self, kept: Kept, raw: RawCapture) -> None:
        """Keep a reading with its raw capture; in the run's thread, which waits for no disk."""
        if self._log is not None:
            self._log.keep(kept, raw, Stretch(raw.block.first_frame, raw.block.frames))

    def see(self, event: Event) -> None:
        """Keep what the procedure told, and how it ended."""
        match event:
            case Told(said=said) if self._log is not None:
                self._log.find(said)
            case Ended():
                self._ended = event
            case _:
                pass

    def before(self, look: Callable[[Event], None]) -> Callable[[Event], None]:
        """Return what sees each event first and then shows it to another."""

        def both(event: Event) -> None:
            self.see(event)
            look(event)

        return both

    def finish(self) -> None:
        """Write how the run ended; where the file takes no more, `trouble` says so."""
        ended = self._ended or Ended(Ending.STOPPED, "stopped by the keyboard")
        if self._log is not None:
            self._log.end(ended.ending, ended.why)


def facts_of(bench: Bench) -> BenchFacts:
    """Return what a bench says of itself, with the seed of a simulated one."""
    identity = bench.identity
    seed = getattr(bench, "seed", None)
    seeds = {"simulated bench": seed} if isinstance(seed, int) else {}
    return BenchFacts(identity.name, identity.rate_hz, identity.inputs, identity.outputs, identity.real, seeds)
