"""The real bench: one duplex stream of an audio interface, held by a child process and read through shared memory."""

import atexit
import threading
import time
from threading import Event
from typing import Any

import attrs
import numpy as np
from numpy.typing import NDArray

from wattproof.bench.portaudio import channels, layout, marker, process, ring
from wattproof.bench.portaudio.channels import Sockets
from wattproof.bench.portaudio.layout import Memory
from wattproof.bench.portaudio.lookout import Lookout
from wattproof.bench.portaudio.marker import Marker, RoundTrip
from wattproof.bench.portaudio.process import Child
from wattproof.bench.portaudio.ring import OverwrittenError
from wattproof.bench.portaudio.synth import CYCLE, RAMP_S
from wattproof.bench.protocol import Control, Identity
from wattproof.bench.rails import rail_runs
from wattproof.core.calibration import Calibration
from wattproof.core.errors import BenchLostError, StoppedError, WrongUseError
from wattproof.core.signal import Capture, Gap, Samples, Sweep, Tone
from wattproof.signals.sweep import sweep_samples

MOST_CHANNELS = 2  # opened where none are asked for: one amplifier channel or two
OPEN_DEADLINE_S = 15.0  # a server waits up to 10 s for a client that was killed; one that has just woken up takes some
ANSWER_DEADLINE_S = 1.0  # a callback obeys within one period and a ramp
CLOSE_POLITE_S = 1.2  # the child's own deadline (child.END_LIMIT_S) and a little
LATENCY_S = 0.05  # asked of the sound system: small enough for mute within 0.1 s, large enough for a busy machine
ROUND_TRIP_BOUND_S = 0.25  # common practice, no source: above what interfaces take, also through a desktop's mixer
RAIL = 1.0 - 2.0**-15  # the highest code of a 16-bit converter, the coarsest that is met
POLL_S = 0.002
PAUSE_S = 0.02


class PortaudioBench:
    """An audio interface, chosen by host API and name, as a bench (see `bench.protocol.Bench`).

    `device` is HOST/NAME (see `naming.choose`). `inputs` and `outputs` are how many to open, from the first on (None:
    as many as there are, up to MOST_CHANNELS), or which sockets: with inputs=(3, 5) the bench's input 1 is the device's
    input 3 and its input 2 the device's 5. `marker` has the round trip measured when the bench opens; without it
    the round trip counts as ROUND_TRIP_BOUND_S, which is safe and slow: `play` then names a later frame than need be,
    and a suspect callback spoils more of the capture.
    """

    def __init__(
        self,
        device: str,
        rate_hz: float = 96_000.0,
        *,
        inputs: Sockets = None,
        outputs: Sockets = None,
        marker: Marker | None = None,
    ) -> None:
        chosen = channels.Choice(inputs, outputs)
        self._identity = Identity(
            device + chosen.words, rate_hz, chosen.inputs or MOST_CHANNELS, chosen.outputs or MOST_CHANNELS, real=True
        )
        self._request = {"device": device, "rate_hz": rate_hz, "inputs": inputs, "outputs": outputs}
        self._marker = marker
        self._round_trip = RoundTrip(round(ROUND_TRIP_BOUND_S * rate_hz), measured=False)
        self._memory: Memory | None = None
        self._child: Child | None = None
        self._lookout: Lookout | None = None
        self._holding = threading.RLock()  # held while the memory is copied from, or let go
        self._playing = threading.Lock()
        self._serial = 0
        self._mutes = 0
        self._muted = False
        self._next_frame = 0
        self._tone: Tone | None = None

    @property
    def identity(self) -> Identity:
        """What this bench is; how many sockets it has is known once it is open."""
        return self._identity

    @property
    def calibration(self) -> Calibration:
        """Nothing but the name: a device knows nothing of its scales."""
        return Calibration(device=self._identity.name, rate_hz=self._identity.rate_hz)

    @property
    def round_trip(self) -> RoundTrip:
        """From a sample played to the same sample captured: measured where a marker was given, else a bound."""
        return self._round_trip

    @property
    def child_pid(self) -> int | None:
        """The process that holds the stream; None before `open`."""
        return None if self._child is None else self._child.pid

    def open(self) -> None:
        """Start capturing, in silence; with a marker, sound it once and measure the round trip.

        Raises:
            WrongUseError: no PortAudio, no such device, it refuses what is asked, or the marker did not come back.
            BenchLostError: the sound system does not answer, or ended the stream at once.
        """
        shape = layout.shape_for(self._identity.rate_hz, self._identity.inputs, self._identity.outputs)
        self._memory = memory = layout.create(shape)
        memory.words[layout.MUTES], memory.words[layout.LATCHED] = self._mutes, int(self._muted)
        wanted: dict[str, object] = {
            "do": "stream",
            "memory": memory.name,
            "shape": shape,
            "latency_s": LATENCY_S,
        }
        atexit.register(self.close)
        try:
            self._child = Child(wanted | self._request)
            self._start(memory, self._child)
            if self._marker is not None:
                self.measure_round_trip(self._marker)
        except BaseException:
            self.close()
            raise
        finally:
            memory.unlink()

    def close(self) -> None:
        """Fall silent with a ramp and let go of the device; past its deadline the child is ended."""
        atexit.unregister(self.close)
        self._next_frame = self.next_frame
        if self._lookout is not None:
            self._lookout.ignore()
        if self._child is not None:
            self._write(layout.ENDING, 1)
            self._child.end(CLOSE_POLITE_S)
        if self._lookout is not None:
            self._lookout.rest()
        with self._holding:
            memory, self._memory = self._memory, None
            if memory is not None:
                memory.release()

    def play(self, tone: Tone) -> int:
        """Sound a tone (level 0: silence) and return the absolute frame from which it stands in the capture.

        That is the frame at which its ramp has ended, plus the round trip (`round_trip` says whether it is measured).

        Raises:
            WrongUseError: no such output, or a frequency that the rate cannot carry.
            BenchLostError: the device is gone.
        """
        rate_hz = self._identity.rate_hz
        self._check_outputs(tone.outputs)
        if tone.frequency_hz >= rate_hz / 2:
            raise WrongUseError(
                f"{tone.frequency_hz:g} Hz cannot be played at {rate_hz:g} Hz; choose below half the rate"
            )
        gains = [tone.level_fs if socket in tone.outputs else 0.0 for socket in range(1, self._identity.outputs + 1)]
        if isinstance(tone, Sweep):
            return self._sweep(tone, gains)
        with self._playing:
            before, lookout = self._tone, self._lookout
            begun = self._command(layout.TONE, gains, step=round(tone.frequency_hz / rate_hz * CYCLE))
            stands = begun + round(RAMP_S * rate_hz) + self._round_trip.frames
            sounds = tone.level_fs > 0.0 and not self._muted
            self._tone = tone if sounds else None
            if lookout is not None:
                if sounds:
                    lookout.zeros.sound(stands, changed=before is None or before.outputs != tone.outputs)
                else:
                    lookout.zeros.silence()
        return stands

    def capture(self, first_frame: int, frames: int, stop: Event) -> Capture:
        """Wait for the frames from first_frame on and return them, with the gaps and overloads they touch.

        Raises:
            StoppedError: `stop` was set while waiting.
            BenchLostError: the device is gone, or the frames were overwritten before they were asked for.
        """
        samples = np.empty((frames, self._identity.inputs))
        done = 0
        while True:
            lost = "" if self._lookout is None else self._lookout.lost
            done += self._copy(first_frame + done, samples[done:])
            if done == frames:
                break
            if lost:
                raise BenchLostError(lost)
            missing_s = (first_frame + frames - self.next_frame) / self._identity.rate_hz
            if stop.wait(min(max(missing_s, POLL_S), PAUSE_S)):
                raise StoppedError("the capture was stopped before it was complete")
        gaps = self._gaps(first_frame, frames)
        overloads = rail_runs(samples, -RAIL, RAIL, first_frame=first_frame)
        return Capture(samples, self._identity.rate_hz, first_frame, gaps, overloads)

    def measure_round_trip(self, sent: Marker) -> RoundTrip:
        """Sound a marker once, between tones, and take the time until it comes back for the round trip from now on.

        Raises:
            WrongUseError: no such output or input, a tone sounds, the bench is muted, or the marker did not come back.
            BenchLostError: the device is gone.
        """
        name, rate_hz = self._identity.name, self._identity.rate_hz
        self._check_outputs((sent.output,))
        if sent.input > self._identity.inputs:
            raise WrongUseError(f"{name} has no input {sent.input}; it has {self._identity.inputs}")
        if self._muted or self._tone is not None:
            busy = "it is muted" if self._muted else "a tone sounds"
            raise WrongUseError(f"{name}: no marker can be sounded while {busy}; end that first")
        wave = marker.waveform(rate_hz)
        gains = [sent.level_fs if socket == sent.output else 0.0 for socket in range(1, self._identity.outputs + 1)]
        with self._playing:
            begun = self._command(layout.MARKER, gains, wave=wave)
        capture = self.capture(begun, round(ROUND_TRIP_BOUND_S * rate_hz) + len(wave), Event())
        found = marker.find(capture.samples[:, sent.input - 1], wave)
        if found is None:
            raise WrongUseError(
                f"{name}: the marker from output {sent.output} did not come back at input {sent.input};"
                " look at the cable and the level, or open without a marker"
            )
        self._round_trip = RoundTrip(found, measured=True)
        if self._lookout is not None:
            self._lookout.echo(found)
        return self._round_trip

    @property
    def next_frame(self) -> int:
        """The absolute frame that will be captured next; after the end, where it would have been."""
        memory = self._memory
        try:
            return self._next_frame if memory is None else memory.words[layout.NEXT_FRAME]
        except ValueError:  # let go between the two looks
            return self._next_frame

    def mute(self) -> None:
        """Ramp down at once, from any thread, and stay silent until `release`. Takes no lock."""
        self._muted = True
        self._tone = None
        self._mutes += 1
        if self._lookout is not None:
            self._lookout.zeros.silence()
        self._write(layout.LATCHED, 1)
        self._write(layout.MUTES, self._mutes)

    def release(self) -> None:
        """Lift the mute latch; nothing sounds until the next `play`."""
        self._muted = False
        self._write(layout.LATCHED, 0)

    @property
    def controls(self) -> tuple[Control, ...]:
        """None: a device's knobs are turned by hand."""
        return ()

    def turn(self, name: str, value: float) -> None:
        """Refuse: there is no control.

        Raises:
            WrongUseError: always.
        """
        raise WrongUseError(f"{self._identity.name} has no control {name!r} to set to {value:g}; turn it by hand")

    def _sweep(self, sweep: Sweep, gains: list[float]) -> int:
        """Hand a sweep to the child as a waveform and return the frame of its first sample, the way round not counted.

        Raises:
            WrongUseError: a tone sounds, or the sweep is longer than what is shared with the child.
        """
        if self._tone is not None:
            raise WrongUseError(f"{self._identity.name}: no sweep can be sounded while a tone sounds; end that first")
        wave = sweep_samples(attrs.evolve(sweep, level_fs=1.0), self._identity.rate_hz).astype(np.float32)
        if wave.size > layout.MARKER_FRAMES:
            most_s = layout.MARKER_FRAMES / self._identity.rate_hz
            raise WrongUseError(f"a sweep of {sweep.seconds:g} s is too long; give at most {most_s:.0f} s")
        with self._playing:
            silent = [0.0] * len(gains)
            return self._command(layout.MARKER, silent if self._muted else gains, wave=wave)

    def _start(self, memory: Memory, child: Child) -> None:
        """Beat, and wait until the child is ready and the first samples came."""
        name = self._identity.name
        self._lookout = Lookout(name, memory, child, self._identity.rate_hz, self._round_trip.frames)
        self._lookout.start()
        deadline = time.monotonic() + OPEN_DEADLINE_S
        answer = child.hear(OPEN_DEADLINE_S)
        if answer is None:
            raise BenchLostError(
                f"{name} did not open within {OPEN_DEADLINE_S:g} s; look whether the sound system runs"
            )
        self._accept(answer)
        while memory.words[layout.ROWS] == 0:
            if time.monotonic() > deadline or child.gone:
                raise BenchLostError(f"{name} opened but delivers nothing; connect it anew or restart the audio server")
            time.sleep(POLL_S)
        self._lookout.watch()

    def _accept(self, answer: dict[str, Any]) -> None:
        process.refuse_without_library(answer)
        if answer["event"] == "refused":
            raise WrongUseError(answer["why"])
        if answer["event"] != "ready":
            raise BenchLostError(f"{self._identity.name} did not open: {answer['why']}; connect it anew")
        given = self._identity
        self._identity = Identity(given.name, given.rate_hz, answer["inputs"], answer["outputs"], real=True)

    def _check_outputs(self, sockets: tuple[int, ...]) -> None:
        beyond = [socket for socket in sockets if socket > self._identity.outputs]
        if beyond:
            raise WrongUseError(f"{self._identity.name} has no output {beyond[0]}; it has {self._identity.outputs}")

    def _command(self, kind: int, gains: list[float], *, step: int = 0, wave: NDArray[np.float32] | None = None) -> int:
        """Hand a command to the callback and return the output frame at which its ramp began."""
        memory = self._alive()
        deadline = time.monotonic() + ANSWER_DEADLINE_S
        try:
            for output, gain in enumerate(gains):
                memory.gains[output] = gain
            memory.words[layout.KIND] = kind
            memory.words[layout.STEP] = step
            if wave is not None:
                memory.marker[: len(wave)] = wave
                memory.words[layout.LENGTH] = len(wave)
            self._serial += 1
            memory.words[layout.COMMAND] = self._serial
            while memory.words[layout.ANSWERED] != self._serial:
                self._alive()
                if time.monotonic() > deadline:
                    raise BenchLostError(f"{self._identity.name} does not obey within {ANSWER_DEADLINE_S:g} s")
                time.sleep(POLL_S)
            return memory.words[layout.ANSWER_FRAME]
        except ValueError as error:  # the memory was let go by `close` in another thread
            raise BenchLostError(f"{self._identity.name} was closed while it was to play") from error

    def _alive(self) -> Memory:
        if self._lookout is not None and self._lookout.lost:
            raise BenchLostError(self._lookout.lost)
        if self._memory is None:
            raise BenchLostError(f"{self._identity.name} is not open; open it first")
        return self._memory

    def _copy(self, first_frame: int, into: Samples) -> int:
        """Copy what is there of the frames from first_frame on, and return how many."""
        with self._holding:
            if self._memory is None:
                raise BenchLostError(f"{self._identity.name} is not open; open it first")
            try:
                return ring.read(self._memory, first_frame, into)
            except OverwrittenError as error:
                raise BenchLostError(
                    f"{self._identity.name}: frame {first_frame} is not held ({error}); ask for frames within 5 s"
                ) from error

    def _gaps(self, first_frame: int, frames: int) -> tuple[Gap, ...]:
        with self._holding:  # the log is part of the memory
            if self._memory is None or self._lookout is None:
                return ()
            return self._lookout.gaps(first_frame, frames)

    def _write(self, word: int, value: int) -> None:
        """Write one word for the child, unless the memory is let go."""
        memory = self._memory
        if memory is not None:
            try:
                memory.words[word] = value
            except ValueError:  # let go between the two looks: the child is gone, and silent
                return
