"""The simulated bench: the protocol's promises, threads and pace around the chain that makes the samples.

Samples are made in chunks of fixed size on a grid of absolute frames, and an action takes effect at the first grid line
that is not made yet. So a sample depends on the seed and on what was done at which frame, never on how blocks are cut.
"""

import math
import time
from collections import deque
from collections.abc import Callable
from datetime import UTC, datetime
from functools import partial
from threading import Event, Lock
from typing import Literal

import attrs
import numpy as np

from wattproof.bench.protocol import Control, Identity
from wattproof.bench.rails import integer_rails, rail_runs
from wattproof.bench.simulated.chain import CHANNELS, Chain
from wattproof.bench.simulated.characters import CHARACTERS, LOADS_OHM, Character, character_named
from wattproof.bench.simulated.dropouts import Delivery, DropOut
from wattproof.bench.simulated.extras import BY_NAME, SUPPLY_EFFICIENCY, SUPPLY_IDLE_W
from wattproof.bench.simulated.history import History
from wattproof.bench.simulated.interface import BITS, Interface
from wattproof.bench.simulated.knob import LOWEST_DB
from wattproof.bench.simulated.oversampling import DELAY_FRAMES
from wattproof.bench.simulated.table import Mistake, Table, connection_named
from wattproof.core.calibration import Calibration
from wattproof.core.errors import BenchLostError, StoppedError, WrongUseError
from wattproof.core.rig import Attenuator, Limits, Load, Rig, Wiring
from wattproof.core.signal import Capture, Sweep, Tone

HISTORY_S = 6.0
BATCH_S = 0.1
PRE_ROLL_S = 0.5  # what is made before the frames asked for, after a stretch in which nobody asked
LONGEST_WAIT_S = 0.25  # so that a closed bench is noticed while waiting
RATES_HZ = (32_000.0, 192_000.0)
START_KNOB_DB = -20.0


@attrs.frozen
class _Glide:
    """A knob on its way: from where, to where, how fast, since which captured frame."""

    start_db: float
    target_db: float
    per_second: float
    first_frame: int

    def position_db(self, frame: int, rate_hz: float) -> float:
        way = self.per_second * max(frame - self.first_frame, 0) / rate_hz
        span = self.target_db - self.start_db
        return self.target_db if way >= abs(span) else self.start_db + math.copysign(way, span)


class SimulatedBench:
    """An interface around an amplifier with a knob, a supply and a load switch; see `characters` for the amplifiers.

    `pace` is "real" (frames become available as time goes by) or "free" (as fast as they can be made). `dropouts` and
    `lost_at_frame` inject faults: frames that go missing, and a device that vanishes. `clock` tells the time in s.
    """

    def __init__(  # noqa: PLR0913 - a bench has this many parts
        self,
        character: str | Character = CHARACTERS[0],
        *,
        rate_hz: float = 96_000.0,
        seed: int = 1,
        pace: Literal["real", "free"] = "free",
        interface: Interface | None = None,
        mains_hz: float = 50.0,
        dropouts: tuple[DropOut, ...] = (),
        lost_at_frame: int | None = None,
        mistake: Mistake | None = None,
        clock: Callable[[], float] = time.monotonic,
    ) -> None:
        low_hz, high_hz = RATES_HZ
        if not low_hz <= rate_hz <= high_hz:
            raise WrongUseError(f"the rate is {rate_hz:g} Hz; the simulated bench runs at {low_hz:g} to {high_hz:g} Hz")
        self._character = character_named(character)
        self._interface = interface or Interface()
        self.seed = seed
        self._rate_hz, self._real, self._clock, self._lost_at = rate_hz, pace == "real", clock, lost_at_frame
        self._chain = Chain(self._character, self._interface, rate_hz, seed, mains_hz)
        chunks = math.ceil(HISTORY_S * rate_hz / self._chain.frames)
        self._history = History(chunks * self._chain.frames, CHANNELS)
        self._delivery = Delivery(dropouts, self._history)
        self._making = Lock()  # held while a chunk is made: one thread at a time
        self._lock = Lock()  # held briefly: guards everything below and the history
        self._to_do: deque[tuple[int, Callable[[], None]]] = deque()
        self._begun = 0  # chunks that are made or being made
        self._asked = 0  # the frame after the last that was captured
        self._muted = False
        self._opened_s: float | None = None
        self._closed = False
        self._mistake = mistake or Mistake()
        self._sounding: Tone | None = None
        self._load_ohm, self._supply_v = 8.0, self._character.supply_v
        self._extras = dict(self._chain.extras.settings)
        self._glide = _Glide(START_KNOB_DB, START_KNOB_DB, 0.0, 0)
        self._chain.knob.place(START_KNOB_DB)
        self._date = datetime.now(UTC).date().isoformat()

    @property
    def phase_from_zero(self) -> bool:
        """Whether the phase of a tone counts from the absolute frame 0, wherever it began: here it does."""
        return True

    @property
    def identity(self) -> Identity:
        """What this bench is: `simulated:` and the amplifier's name; nothing real is behind it."""
        return Identity(f"simulated:{self._character.name}", self._rate_hz, CHANNELS, CHANNELS, real=False)

    @property
    def calibration(self) -> Calibration:
        """The scales and floors that the simulator declares of its interface."""
        return self._interface.calibration(self._rate_hz, self._date)

    @property
    def rig(self) -> Rig:
        """What is wired on the simulated table as the switches stand now: both channels, load and divider."""
        with self._lock:
            load = Load(nominal_ohm=self._load_ohm, rated_w=100.0, tolerance=0.0)
        attenuator = Attenuator(ratio=self._interface.attenuator_ratio, rated_vrms=100.0)
        wirings = tuple(
            Wiring(name, socket, socket, load, attenuator, self._character.bridge_tied)
            for socket, name in ((1, "left"), (2, "right"))
        )
        return Rig(self.identity.name, wirings, Limits(drive_vrms=self._interface.output_full_scale_vrms / 2.0))

    def open(self) -> None:
        """Start capturing, in silence.

        Raises:
            WrongUseError: it was opened before.
        """
        with self._lock:
            if self._opened_s is not None:
                raise WrongUseError("the simulated bench was opened before; make a new one")
            self._opened_s = self._clock()

    def close(self) -> None:
        """Fall silent and let go; whoever waits for frames is told within LONGEST_WAIT_S."""
        self.mute()
        with self._lock:
            self._closed = True

    def play(self, tone: Tone) -> int:
        """Sound a tone and return the captured frame from which it stands: latency, ramp and filters are over.

        The input's coupling goes on settling for some tenths of a second, as a slowly dying offset.

        Raises:
            WrongUseError: an output that there is not, or a frequency above half the rate.
            BenchLostError: the bench is closed or lost.
        """
        if any(output > CHANNELS for output in tone.outputs):
            raise WrongUseError(f"the tone is meant for outputs {tone.outputs}; the simulated bench has {CHANNELS}")
        if tone.frequency_hz >= self._rate_hz / 2.0:
            raise WrongUseError(f"{tone.frequency_hz:g} Hz is not below half the rate of {self._rate_hz:g} Hz")
        with self._lock:
            self._require_alive(self._next_frame())
            first_frame = self._grid_frame()
            if not self._muted:
                self._to_do.append((first_frame, partial(self._chain.source.sound, tone)))
                self._sounding = tone
            if isinstance(tone, Sweep):
                return self._delivery.delivered(first_frame)
            ramp_frames = self._chain.source.ramp_frames
            stands = first_frame + ramp_frames + self._interface.latency_frames + 2 * DELAY_FRAMES
            return self._delivery.delivered(stands)

    def mute(self) -> None:
        """Ramp down from the next chunk on, from any thread, and stay silent until `release`."""
        with self._lock:
            self._muted = True
            self._to_do.append((self._grid_frame(), partial(self._chain.source.sound, None)))

    def release(self) -> None:
        """Lift the mute latch; nothing sounds until the next `play`."""
        with self._lock:
            self._muted = False

    @property
    def next_frame(self) -> int:
        """The absolute frame that will be captured next: by the clock, or after the last one that was asked for."""
        with self._lock:
            return self._next_frame()

    def capture(self, first_frame: int, frames: int, stop: Event) -> Capture:
        """Wait for frames and return them, with the gaps that touch them and the runs at full scale inside them.

        Raises:
            StoppedError: `stop` was set.
            BenchLostError: not open, closed, lost, or the frames are older than the history.
        """
        samples = np.empty((frames, CHANNELS))
        done = 0
        with self._making:
            self._pass_over_idle(first_frame)
        while done < frames:
            if stop.is_set():
                raise StoppedError("the capture was stopped")
            with self._lock:
                self._require_alive(first_frame + frames)
                there = self._read(first_frame + done, samples[done:])
            done += there
            if not there:
                self._make(first_frame + done, first_frame + frames, stop)
        with self._lock:
            self._asked = max(self._asked, first_frame + frames)
        low, high = integer_rails(BITS)
        overloads = rail_runs(samples, low, high, first_frame=first_frame, at_least=1)
        return Capture(samples, self._rate_hz, first_frame, self._delivery.gaps(first_frame, frames), overloads)

    @property
    def controls(self) -> tuple[Control, ...]:
        """Knob, load switch and supply, as they stand."""
        with self._lock:
            knob_db = self._glide.position_db(self._next_frame(), self._rate_hz)
            load_ohm, supply_v = self._load_ohm, self._supply_v
        low_v, high_v = self._character.supply_range_v
        return (
            Control("knob", "Knob", "dB", LOWEST_DB, 0.0, knob_db, "volume control of the amplifier, below full gain"),
            Control("load", "Load", "Ω", LOADS_OHM[0], LOADS_OHM[-1], load_ohm, "1e6 Ω: nothing connected", LOADS_OHM),
            Control("supply", "Supply", "V", low_v, high_v, supply_v, "voltage that feeds the amplifier"),
        )

    @property
    def extras(self) -> tuple[Control, ...]:
        """What else can be turned, as it stands: tone controls, filters and faults that a window does without."""
        with self._lock:
            return tuple(attrs.evolve(each, value=self._extras[each.name]) for each in BY_NAME.values())

    def turn(self, name: str, value: float) -> None:
        """Set knob, load, supply or one of the extras from the next chunk on; the amplifier follows within some ms.

        Raises:
            WrongUseError: no such control, or a value outside its range.
        """
        self._require_allowed(name, value)
        with self._lock:
            if name == "knob":
                self._glide = _Glide(value, value, 0.0, 0)
                action = partial(self._chain.knob.turn, value)
            elif name in BY_NAME:
                self._extras[name] = value
                knob_db = self._glide.position_db(self._next_frame(), self._rate_hz)
                action = partial(self._chain.extras.set, name, value, 10.0 ** (knob_db / 20.0))
            elif name == "load":
                self._load_ohm = value
                action = partial(setattr, self._chain, "load_ohm", value)
            else:
                self._supply_v = value
                action = partial(setattr, self._chain, "supply_v", value)
            self._to_do.append((self._grid_frame(), action))

    def connect(self, name: str) -> None:
        """Plug the table as one of `core.connection.Connection` says, from the next chunk on.

        Raises:
            WrongUseError: there is no such connection.
        """
        table = Table(connection_named(name), self._mistake)
        with self._lock:
            self._to_do.append((self._grid_frame(), partial(setattr, self._chain, "table", table)))

    def meter_vrms(self, output: int) -> float:
        """Return what an ideal voltmeter shows at an output jack: the tone that sounds there, V rms."""
        with self._lock:
            tone = self._sounding
            if tone is None or self._muted or output not in tone.outputs:
                return 0.0
            return tone.level_fs * self._interface.output_full_scale_vrms

    def supply_meters(self) -> tuple[float, float]:
        """Return what a voltmeter and an ammeter at the amplifier's supply show, V and A."""
        with self._making:
            delivered = list(self._chain.delivered_w)
        supply_w = SUPPLY_IDLE_W + sum(delivered) / len(delivered) / SUPPLY_EFFICIENCY
        with self._lock:
            return self._supply_v, supply_w / self._supply_v

    def glide(self, name: str, target: float, per_second: float) -> None:
        """Turn the knob steadily, as a hand does: towards target (dB) by per_second (dB/s).

        Raises:
            WrongUseError: another control than the knob, or a value outside its range.
        """
        self._require_allowed(name, target)
        if name != "knob" or not (math.isfinite(per_second) and per_second > 0.0):
            raise WrongUseError(f"only the knob glides, by more than 0 dB/s; asked: {name} by {per_second:g}")
        with self._lock:
            first_frame = self._grid_frame()
            here = self._glide.position_db(self._next_frame(), self._rate_hz)
            self._glide = _Glide(here, target, per_second, self._delivery.delivered(first_frame))
            self._to_do.append((first_frame, partial(self._chain.knob.turn, target, per_second)))

    def _require_allowed(self, name: str, value: float) -> None:
        control = next((each for each in (*self.controls, *self.extras) if each.name == name), None)
        if control is None:
            names = ", ".join(each.name for each in self.controls)
            raise WrongUseError(f"the simulated bench has no control {name!a}; it has {names}")
        if control.choices and value not in control.choices:
            choices = ", ".join(f"{choice:g}" for choice in control.choices)
            raise WrongUseError(f"{name} is {value:g} {control.unit}; it can be {choices}")
        if not control.minimum <= value <= control.maximum:
            span = f"{control.minimum:g} to {control.maximum:g} {control.unit}"
            raise WrongUseError(f"{name} is {value:g} {control.unit}; it must lie from {span}")

    def _require_alive(self, end_frame: int) -> None:
        if self._opened_s is None:
            raise BenchLostError("the simulated bench is not open; open it first")
        if self._closed:
            raise BenchLostError("the simulated bench is closed; open a new one")
        if self._lost_at is not None and end_frame > self._lost_at:
            raise BenchLostError(f"the simulated device vanished at frame {self._lost_at} (injected)")

    def _converted_frames(self) -> int:
        """How many frames the input converter has made by the clock (real pace)."""
        return 0 if self._opened_s is None else int((self._clock() - self._opened_s) * self._rate_hz)

    def _next_frame(self) -> int:
        if self._real:
            return self._delivery.delivered(self._converted_frames())
        return self._asked

    def _grid_frame(self) -> int:
        """Return the converted frame of the first chunk that an action can still change."""
        due = math.ceil(self._converted_frames() / self._chain.frames) if self._real else 0
        return max(self._begun, due) * self._chain.frames

    def _read(self, first_frame: int, into: np.ndarray[tuple[int, ...], np.dtype[np.float64]]) -> int:
        """Copy what is there from first_frame on, and return how many frames that were."""
        if first_frame < self._history.oldest:
            raise BenchLostError(
                f"frame {first_frame} is no longer kept; the history begins at frame {self._history.oldest}"
            )
        count = max(min(into.shape[0], self._history.end - first_frame), 0)
        if count:
            into[:count] = self._history.read(first_frame, count)
        return count

    def _make(self, wanted_frame: int, end_frame: int, stop: Event) -> None:
        """Wait until the next chunk is due and make it, unless another thread did.

        Real pace waits for the last chunk wanted, within BATCH_S, and makes them together: waking once for several
        costs a quarter less than waking for each.
        """
        due, size = self._begun, self._chain.frames
        if self._real and self._converted_frames() < (due + 1) * size:
            last = min(math.ceil(end_frame / size), due + math.ceil(BATCH_S * self._rate_hz / size))
            self._wait_for(max(last, due + 1) * size, stop)
        with self._making:
            with self._lock:
                if self._begun != due or self._history.end > wanted_frame:
                    return
                self._begun += 1
                while self._to_do and self._to_do[0][0] <= due * self._chain.frames:
                    self._to_do.popleft()[1]()
            samples = self._chain.chunk(due)
            with self._lock:
                self._delivery.push(samples)

    def _wait_for(self, converted_frame: int, stop: Event) -> None:
        """Wait on the stop event until the clock has reached a frame; the deadline is absolute, so nothing drifts."""
        while (missing := converted_frame - self._converted_frames()) > 0:
            with self._lock:
                self._require_alive(0)
            if stop.wait(min(missing / self._rate_hz, LONGEST_WAIT_S)):
                raise StoppedError("the capture was stopped")

    def _pass_over_idle(self, first_frame: int) -> None:
        """In real pace, leave out what nobody asked for in time; what was done meanwhile still takes effect."""
        with self._lock:
            ahead = first_frame - self._history.end
            if not self._real or ahead < HISTORY_S * self._rate_hz:
                return
            chunks = int((ahead - PRE_ROLL_S * self._rate_hz) // self._chain.frames)
            self._begun += chunks
            self._history.skip_to(self._history.end + chunks * self._chain.frames)
