"""Looks at an open bench before the first tone: runs `procedures.preflight` and returns what it amounts to."""

import threading

from wattproof.bench.protocol import Bench
from wattproof.core.errors import StoppedError, WrongUseError
from wattproof.core.rig import Rig, Wiring
from wattproof.core.run import Ending
from wattproof.procedures.preflight import Findings, PreflightPlan, Verdict, conclude, preflight
from wattproof.procedures.wiring_check import Join
from wattproof.runner.live import Runner
from wattproof.runner.screen import Ended

LOOK_S = 0.02


class Preflight:
    """One look at a bench, in the thread of whoever calls `run`; a window calls `start` and looks at the screen itself.

    Nothing above the runner's drive limit sounds.
    """

    def __init__(self, bench: Bench, plan: PreflightPlan, rig: Rig | None = None) -> None:
        wired = rig or Rig("preflight", (Wiring(),))
        self.runner = Runner(bench, wired, bench.calibration)
        self._findings = Findings(bench.identity.rate_hz)
        self._plan = plan
        self._joins = tuple(Join(wiring.output, wiring.input) for wiring in wired.wirings)

    def start(self) -> None:
        """Start to look.

        Raises:
            WrongUseError: a run is under way, or the bench has no output.
        """
        identity = self.runner.bench.identity
        if not identity.outputs:
            raise WrongUseError(
                f"{identity.name} has no output; only a device that plays and captures can be looked at"
            )
        self.runner.start(preflight(self._plan, self._joins, identity.rate_hz, self._findings))

    def verdict(self) -> Verdict:
        """Return what was found so far amounts to."""
        return conclude(self._findings)

    def run(self) -> Verdict:
        """Look to the end.

        Raises:
            WrongUseError: the look failed; the line says why.
            StoppedError: it was stopped.
        """
        self.start()
        waits = threading.Event()
        try:
            while True:
                ended = next((event for event in self.runner.screen.drain() if isinstance(event, Ended)), None)
                if ended is not None:
                    break
                waits.wait(LOOK_S)
        finally:
            self.runner.stop()
        if ended.ending is Ending.FAILED:
            raise WrongUseError(ended.why)
        if ended.ending is Ending.STOPPED:
            raise StoppedError(ended.why or "the look at the device was stopped")
        return self.verdict()
