"""What the person wants of a watch, checked as it is wished: nothing the bench cannot do, nothing above the limit."""

import threading
from collections.abc import Callable

import attrs

from wattproof.bench.protocol import Identity
from wattproof.core.errors import WrongUseError
from wattproof.core.signal import Tone
from wattproof.procedures.requests import Wishes
from wattproof.runner.limits import DriveLimit

NOTHING_YET = Wishes(tone_on=False, frequency_hz=997.0, level_fs=0.0)


@attrs.frozen
class Change:
    """Some of the wishes anew; what is None stays as it is."""

    tone_on: bool | None = None
    frequency_hz: float | None = None
    level_fs: float | None = None
    channel: int | None = None


class WishBook:
    """The wishes as they stand. Every method may be called from any thread."""

    def __init__(self, identity: Identity, outputs: tuple[int, ...], limit: DriveLimit) -> None:
        self._identity = identity
        self._outputs = outputs
        self._limit = limit
        self._lock = threading.Lock()
        self._wishes = NOTHING_YET

    @property
    def standing(self) -> Wishes:
        """The wishes as they stand."""
        with self._lock:
            return self._wishes

    def take_bench(self, identity: Identity) -> None:
        """Wish of a bench that was opened anew: the tone is off, and a frequency that it cannot carry is forgotten."""
        with self._lock:
            self._identity = identity
            kept = self._wishes.frequency_hz < identity.rate_hz / 2.0
            frequency_hz = self._wishes.frequency_hz if kept else NOTHING_YET.frequency_hz
            self._wishes = attrs.evolve(self._wishes, tone_on=False, frequency_hz=frequency_hz)

    def change(self, change: Change, may_sound: Callable[[], bool]) -> None:
        """Take a change whole or not at all. `may_sound` says whether a tone may be turned on now.

        Raises:
            WrongUseError: a value that the bench cannot do, a drive above the limit, or a tone that may not sound.
        """
        check_frequency(change.frequency_hz, self._identity.rate_hz)
        if change.level_fs is not None and not 0.0 <= change.level_fs <= 1.0:
            raise WrongUseError(f"drive {change.level_fs:g} of full scale: give 0 to 1")
        if change.channel is not None:
            check_socket("input", change.channel, self._identity.inputs)
        with self._lock:
            wanted = Wishes(
                self._wishes.tone_on if change.tone_on is None else change.tone_on,
                self._wishes.frequency_hz if change.frequency_hz is None else change.frequency_hz,
                self._wishes.level_fs if change.level_fs is None else change.level_fs,
                self._wishes.channel if change.channel is None else change.channel,
            )
            if wanted.tone_on or change.level_fs is not None:
                self._limit.check(Tone(wanted.frequency_hz, wanted.level_fs, self._outputs))
            if change.tone_on and not self._outputs:
                raise WrongUseError("this bench has no output to sound a tone; open a device, or the simulated bench")
            if change.tone_on and not may_sound():
                raise WrongUseError("the output is muted; start a new run to sound a tone")
            self._wishes = wanted

    def tone_off(self) -> None:
        """Want no tone."""
        with self._lock:
            self._wishes = attrs.evolve(self._wishes, tone_on=False)

    def obey_limit(self) -> None:
        """Want no tone where the wanted one is above the drive limit as it stands now."""
        with self._lock:
            tone = Tone(self._wishes.frequency_hz, self._wishes.level_fs, self._outputs)
            if not self._limit.allows(tone):
                self._wishes = attrs.evolve(self._wishes, tone_on=False)


def check_frequency(frequency_hz: float | None, rate_hz: float) -> None:
    """Accept a frequency that the rate can carry, or None.

    Raises:
        WrongUseError: zero or below, half the rate or above, or no number.
    """
    if frequency_hz is not None and not 0.0 < frequency_hz < rate_hz / 2.0:
        raise WrongUseError(f"frequency {frequency_hz:g} Hz: give more than 0 and less than {rate_hz / 2.0:g} Hz")


def check_socket(what: str, socket: int, sockets: int) -> None:
    """Accept a socket that the bench has; `what` is "input" or "output".

    Raises:
        WrongUseError: the bench has no such socket.
    """
    if not 1 <= socket <= sockets:
        raise WrongUseError(f"{what} {socket}: this bench has {what}s 1 to {sockets}")
