"""The process that holds PortAudio: it lists devices or runs one stream, and falls silent when its parent goes.

Started as `python -m wattproof.bench.portaudio.child REQUEST` with a JSON object as REQUEST; tells the parent JSON
lines on its standard output, and takes the end of its standard input for the parent's death.
"""

import gc
import json
import os
import signal
import sys
import threading
import time
from collections.abc import Sized
from multiprocessing import resource_tracker
from types import FrameType, ModuleType
from typing import Any, cast

import numpy as np
from numpy.typing import NDArray

from wattproof.bench.portaudio import layout
from wattproof.bench.portaudio.channels import ALL, open_sockets
from wattproof.bench.portaudio.engine import Engine, StreamTimes
from wattproof.bench.portaudio.naming import Entry, NamingError, choose
from wattproof.bench.portaudio.rates import open_rates, settings_for

END_LIMIT_S = 1.0  # from the wish to end until the process is gone, whatever PortAudio does
LOOK_S = 0.05
STALE_S = (
    2.0  # without a beat for so long the process ends even where no callback comes to see it (engine.BEAT_LIMIT_S)
)
_INVALID_RATE, _INVALID_CHANNELS = -9997, -9998  # portaudio.h, PaErrorCode


class _NoLibraryError(Exception):
    """PortAudio or sounddevice is not installed."""


class _Voicebox:
    """The way to the parent: its own copy of standard output, since audio libraries chatter on the first."""

    def __init__(self) -> None:
        self._fd = os.dup(1)
        os.dup2(2, 1)

    def say(self, **message: object) -> None:
        """Tell the parent; where it is gone, nobody is told."""
        try:
            os.write(self._fd, (json.dumps(message) + "\n").encode("ascii"))
        except OSError:
            return


def _library() -> ModuleType:
    """Import sounddevice, which looks for PortAudio and starts it.

    Raises:
        _NoLibraryError: sounddevice finds none, or is not there itself.
    """
    try:
        import sounddevice  # noqa: PLC0415 - the search for PortAudio may fail, and is told to the parent
    except (OSError, ImportError) as error:
        raise _NoLibraryError(error) from error
    return cast("ModuleType", sounddevice)


def _entries(sound: Any) -> list[Entry]:  # noqa: ANN401 - sounddevice has no types
    hosts = [host["name"] for host in sound.query_hostapis()]
    return [
        Entry(
            host_api=hosts[device["hostapi"]],
            name=device["name"],
            inputs=device["max_input_channels"],
            outputs=device["max_output_channels"],
            default_rate_hz=device["default_samplerate"],
        )
        for device in sound.query_devices()
    ]


def _refusal(error: Exception, request: dict[str, Any]) -> str:
    """Return one line on why a stream did not open."""
    if isinstance(error, NamingError):
        return str(error)
    code = next((part for part in reversed(error.args) if isinstance(part, int)), 0)
    device, rate_hz = request["device"], request["rate_hz"]
    if code == _INVALID_RATE:
        return f"{device} does not open at {rate_hz:g} Hz; choose a rate that it offers"
    if code == _INVALID_CHANNELS:
        return f"{device} does not open with the inputs and outputs asked for; choose fewer"
    return f"{device} does not open: {error}; look whether another program holds it"


def _let_go(sound: Any) -> None:  # noqa: ANN401 - sounddevice has no types
    """End PortAudio while its server lives: a JACK server waits 5 s for a client that went without a word."""
    sound._terminate()  # noqa: SLF001 - the only way short of leaving it to the interpreter's end, which may hang


class _Stream:
    """One duplex stream from its opening to its end."""

    def __init__(self, request: dict[str, Any], voice: _Voicebox, parent_gone: threading.Event) -> None:
        self._request = request
        self._voice = voice
        self._sound: Any = None
        self._engine: Engine | None = None
        self._memory: layout.Memory | None = None
        self._sockets = (ALL, ALL)
        self._finished = threading.Event()
        self._parent_gone = parent_gone

    def run(self) -> None:
        """Open, serve until the end, close. Says `ready` or `refused`, then `ended`."""
        self._sound = _library()
        signal.signal(signal.SIGINT, signal.SIG_IGN)
        signal.signal(signal.SIGTERM, self._on_term)
        try:
            stream = self._open()
        except (NamingError, self._sound.PortAudioError, ValueError) as error:
            self._voice.say(event="refused", why=_refusal(error, self._request))
            _let_go(self._sound)
            return
        why = self._serve(stream)
        self._voice.say(event="ended", why=why)
        if why != "inactive":  # a stream whose server died never closes
            stream.close()
            _let_go(self._sound)

    def _open(self) -> Any:  # noqa: ANN401 - sounddevice has no types
        entries = _entries(self._sound)
        places = choose(entries, self._request["device"])
        shape = layout.Shape(*self._request["shape"])
        name = self._request["device"]
        ins = open_sockets(self._request["inputs"], entries[places[0]]["inputs"], shape.inputs, f"{name}: inputs")
        outs = open_sockets(self._request["outputs"], entries[places[1]]["outputs"], shape.outputs, f"{name}: outputs")
        self._sockets = ins, outs
        self._memory = layout.attach(self._request["memory"], shape)
        self._memory.touch()
        rate_hz = self._request["rate_hz"]
        self._engine = Engine(self._memory, rate_hz, (ins.used, outs.used))
        threading.Thread(target=self._look, daemon=True).start()
        stream = self._sound.Stream(
            device=places,
            samplerate=rate_hz,
            channels=(ins.opened, outs.opened),
            dtype="float32",
            blocksize=0,
            latency=self._request["latency_s"],
            clip_off=True,
            dither_off=True,
            extra_settings=tuple(settings_for(self._sound, entries[place]["host_api"]) for place in places),
            callback=self._callback,
            finished_callback=self._finished.set,
        )
        gc.collect()
        gc.freeze()
        gc.disable()
        stream.start()
        name = f"{entries[places[0]]['host_api']}/{entries[places[0]]['name']}"
        self._voice.say(event="ready", name=name, inputs=ins.used, outputs=outs.used)
        return stream

    def _serve(self, stream: Any) -> str:  # noqa: ANN401 - sounddevice has no types
        """Wait for the end and return its reason."""
        assert self._engine is not None  # noqa: S101 - _open made it; tells the type checker
        while not self._finished.wait(LOOK_S):
            if not stream.active and not self._finished.wait(LOOK_S):
                return "inactive"
        return self._engine.why or "finished"

    def _callback(
        self,
        indata: NDArray[np.float32],
        outdata: NDArray[np.float32],
        frames: int,  # noqa: ARG002 - sounddevice passes it; the arrays say the same
        times: StreamTimes,
        status: Any,  # noqa: ANN401 - sounddevice has no types
    ) -> None:
        assert self._engine is not None  # noqa: S101 - _open made it before the stream; tells the type checker
        if self._sockets[1].opened > self._sockets[1].used:
            outdata.fill(0.0)
        indata, outdata = indata[:, self._sockets[0].columns], outdata[:, self._sockets[1].columns]
        try:
            last = self._engine.run(indata, outdata, times, _flags(status) if status else 0)
        except Exception as error:  # noqa: BLE001 - whatever it is, the tone ends by a ramp; the parent is told why
            last = self._engine.run_down(outdata, f"failed: {type(error).__name__}: {error}")
        if last:
            raise self._sound.CallbackStop

    def _look(self) -> None:
        """Watch the parent beside the callback, which may be dead, and end the process past its deadline."""
        assert self._engine is not None  # noqa: S101 - started after it was made; tells the type checker
        assert self._memory is not None  # noqa: S101 - likewise
        beat, beat_at, since = -1, time.monotonic(), None
        while since is None or time.monotonic() - since < END_LIMIT_S:
            time.sleep(LOOK_S)
            now = time.monotonic()
            if self._memory.words[layout.BEAT] != beat:
                beat, beat_at = self._memory.words[layout.BEAT], now
            if self._parent_gone.is_set():
                self._engine.end("parent")
            elif now - beat_at > STALE_S:
                self._engine.end("beat")
            if since is None and (self._engine.why or self._memory.words[layout.ENDING]):
                since = now
        os._exit(3)

    def _on_term(self, _number: int, _frame: FrameType | None) -> None:
        if self._engine is not None:
            self._engine.end("term")


def _flags(status: Any) -> int:  # noqa: ANN401 - sounddevice has no types
    return (
        layout.INPUT_UNDERFLOW * bool(status.input_underflow)
        + layout.INPUT_OVERFLOW * bool(status.input_overflow)
        + layout.OUTPUT_UNDERFLOW * bool(status.output_underflow)
        + layout.OUTPUT_OVERFLOW * bool(status.output_overflow)
    )


def _untracked(name: Sized, rtype: str) -> None:
    """Take no note of a shared block: the parent made it and takes its name away; a second note would take it twice."""


def _leave_with_parent(gone: threading.Event) -> None:
    """Set `gone` where standard input ends, and end the process soon after, whatever PortAudio holds it with."""
    while os.read(0, 64):
        continue
    gone.set()
    time.sleep(END_LIMIT_S)
    os._exit(3)


def main(argument: str) -> None:
    """Do what the request says; the process is gone afterwards, without PortAudio's own end, which may hang."""
    resource_tracker.register = _untracked
    voice = _Voicebox()
    request = json.loads(argument)
    gone = threading.Event()
    threading.Thread(target=_leave_with_parent, args=(gone,), daemon=True).start()
    try:
        if request["do"] == "list":
            sound = _library()
            voice.say(event="devices", devices=_entries(sound))
            _let_go(sound)
        elif request["do"] == "rates":
            sound = _library()
            for device in request["devices"]:
                voice.say(event="rates", rates=open_rates(sound, _entries(sound), device, request["rates"]))
            _let_go(sound)
        else:
            _Stream(request, voice, gone).run()
    except _NoLibraryError as error:
        voice.say(event="no library", why=str(error))
    except BaseException as error:  # noqa: BLE001 - the parent is told before the process ends, whatever it is
        voice.say(event="failed", why=f"{type(error).__name__}: {error}")
    os._exit(0)


if __name__ == "__main__":
    main(sys.argv[1])
