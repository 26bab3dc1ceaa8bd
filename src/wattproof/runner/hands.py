"""Does on a bench that offers its own controls what a person is asked for: the simulated hand."""

from typing import Protocol, runtime_checkable

from wattproof.bench.protocol import Bench
from wattproof.procedures.power_switching import FULL, UP, YES
from wattproof.procedures.requests import Action, Ask

FAR_DOWN_DB = -45.0  # of the knob: far below the onset of every simulated amplifier
FULL_DB = 0.0
HERE_AND_DONE = "done"


@runtime_checkable
class Gliding(Protocol):
    """A bench whose knob can be turned steadily."""

    def glide(self, name: str, target: float, per_second: float) -> None:
        """Turn a control towards a target at a rate."""
        ...


class BenchHand:
    """Answers each ask that the bench's own controls can fulfil; it turns the knob at a stated speed."""

    def __init__(self, bench: Bench, knob_db_per_s: float = 6.0) -> None:
        self._bench = bench
        self._speed = knob_db_per_s

    def __call__(self, ask: Ask) -> float | str | None:
        """Do what is asked and return the answer, or None where no control of the bench does it."""
        match ask:
            case Ask(action=Action.CONFIRM):
                return YES
            case Ask(action=Action.SWITCH_CHANNEL, want=want):
                return want  # both channels of a simulated amplifier are wired
            case Ask(action=Action.SWITCH_LOAD, want=float(want)):
                self._bench.turn("load", want)
                return want
            case Ask(action=Action.TURN, want=str(want)):
                return self._turned(want)
            case _:
                return None

    def _turned(self, want: str) -> str | None:
        match want:
            case "full" | "down":
                self._bench.turn("knob", FULL_DB if want == FULL else FAR_DOWN_DB)
            case "up" | "back":
                self._glide(FULL_DB if want == UP else FAR_DOWN_DB)
            case "leave":
                knob = next(control for control in self._bench.controls if control.name == "knob")
                self._bench.turn("knob", knob.value)
            case _:
                return None
        return HERE_AND_DONE

    def _glide(self, target_db: float) -> None:
        if isinstance(self._bench, Gliding):
            self._bench.glide("knob", target_db, self._speed)
        else:
            self._bench.turn("knob", target_db)
