"""Puts things together: names the concrete benches and the live reading, finds the user's folders, opens the log."""

import logging
from collections.abc import Mapping
from logging.handlers import RotatingFileHandler
from pathlib import Path
from types import MappingProxyType
from typing import TYPE_CHECKING, Literal

from wattproof.bench.protocol import Bench
from wattproof.core.audio_device import Device
from wattproof.core.calibration import Calibration
from wattproof.core.errors import WrongUseError
from wattproof.core.opening import Opening, named_opening
from wattproof.core.reading import ReadingSettings
from wattproof.core.rig import Rig
from wattproof.procedures.around_plan import AroundPlan
from wattproof.procedures.power_plan import PowerPlan
from wattproof.procedures.requests import Procedure
from wattproof.procedures.terminal_reader import TerminalReader
from wattproof.procedures.watch import Reader, ReaderFactory, Watch, reading_settings, watch
from wattproof.runner.live import Keeper
from wattproof.runner.measuring import Measurement
from wattproof.runner.rewired import RewiredReader
from wattproof.runner.watching import WatchRunner

if TYPE_CHECKING:
    from wattproof.runner.around import Sitting

NAME = "wattproof"
SIMULATED = "simulated"
SIMULATED_RATE_HZ = DEVICE_RATE_HZ = 96_000.0  # harmonics of 20 kHz lie below half of it
MARKER_FS = 0.001  # −60 dBFS, for 20 ms
SIMULATED_LEVEL_FS = 0.25  # takes each simulated amplifier beyond clipping when its knob is turned up
Pace = Literal["real", "free"]
_LOG_BYTES = 1_000_000  # a few weeks of ordinary use; two older files are kept beside it
_LOG_FILES = 2
_log = logging.getLogger(__name__)


def open_bench(text: str = SIMULATED, pace: Pace = "real") -> Bench:
    """Return an open bench, capturing in silence.

    `text` is "simulated" or "simulated:NAME", the path of a recording that exists, or else a device; at its end may
    stand what `core.opening` reads: the rate, and which sockets of a device. `pace` is "real" for one that keeps time
    under a window, "free" for one that delivers as fast as it can; a device keeps its own.

    Raises:
        WrongUseError: no such amplifier, recording or device.
    """
    bench = _bench(text, pace)
    bench.open()
    if bench.identity.real:
        _measure_round_trip(bench)
    _log.info("opened %s at %g Hz", bench.identity.name, bench.identity.rate_hz)
    return bench


def _bench(named: str, pace: Pace) -> Bench:
    text, opening = (named, Opening()) if Path(named).is_file() else named_opening(named)
    kind, _, name = text.partition(":")
    if kind == SIMULATED:
        from wattproof.bench.simulated import CHARACTERS, SimulatedBench  # noqa: PLC0415 - only the bench in use loads

        _require_no_sockets(opening, "the simulated bench")
        return SimulatedBench(name or CHARACTERS[0], pace=pace, rate_hz=opening.rate_hz or SIMULATED_RATE_HZ)
    if not text or text.isspace():
        raise WrongUseError("no bench is named; give simulated, simulated:NAME, the path of a recording, or a device")
    if Path(text).is_file():
        from wattproof.bench.recording import RecordingBench  # noqa: PLC0415 - likewise

        _require_no_sockets(opening, "a recording")
        if opening.rate_hz is not None:
            raise WrongUseError("a recording keeps the rate that it was made with; leave rate= out")
        return RecordingBench(text, pace=pace)
    from wattproof.bench.portaudio.bench import PortaudioBench  # noqa: PLC0415 - likewise

    return PortaudioBench(text, opening.rate_hz or DEVICE_RATE_HZ, inputs=opening.inputs, outputs=opening.outputs)


def _require_no_sockets(opening: Opening, what: str) -> None:
    if opening.inputs is not None or opening.outputs is not None:
        raise WrongUseError(f"{what} has no sockets to choose; leave in= and out= out, they are a device's")


def _measure_round_trip(bench: Bench) -> None:
    """Measure a device's round trip by a marker too soft for any amplifier to mind; unheard, a bound stays."""
    from wattproof.bench.portaudio.bench import PortaudioBench  # noqa: PLC0415 - only where a device may be open
    from wattproof.bench.portaudio.marker import Marker  # noqa: PLC0415 - likewise

    if not isinstance(bench, PortaudioBench):
        return
    try:
        trip = bench.measure_round_trip(Marker(MARKER_FS))
    except WrongUseError as error:
        _log.info("round trip not measured: %s", error)
        return
    _log.info("round trip of %s: %d frames", bench.identity.name, trip.frames)


def list_devices() -> tuple[Device, ...]:
    """Return every device that the sound system offers now, with the rates at which it really opens.

    Raises:
        WrongUseError: there is no PortAudio.
        BenchLostError: the sound system does not answer.
    """
    from wattproof.bench.portaudio.devices import list_devices as listed  # noqa: PLC0415 - likewise
    from wattproof.bench.portaudio.devices import with_rates  # noqa: PLC0415 - likewise

    return with_rates(listed())


def make_watch_runner(bench: Bench, reader: ReaderFactory | None = None) -> WatchRunner:
    """Return a runner that already watches an open bench.

    The tone is on where the bench itself says what is wired, as the simulated one does, and off on a real one: a
    person starts it. `reader` makes the live analysis; without it the one in `dsp` is taken.
    """
    declared = getattr(bench, "rig", None)
    wires_itself = isinstance(declared, Rig)
    calibration = known_calibration(bench)
    new_reader = _live_reader if reader is None else reader
    channels = bench.identity.inputs

    def rig_now() -> Rig:
        rig = getattr(bench if runner is None else runner.bench, "rig", None)
        return rig if isinstance(rig, Rig) else Rig()

    def settings_now() -> tuple[ReadingSettings, ...]:
        return reading_settings(rig_now(), calibration, channels)

    def new_watch() -> Procedure:
        assert runner is not None  # noqa: S101 - it makes its watches itself; tells the type checker
        rate_hz = runner.bench.identity.rate_hz  # another one after it was opened anew, perhaps
        follows = RewiredReader(
            settings_now, lambda settings: TerminalReader(new_reader(rate_hz, settings), rig_now, calibration)
        )
        return watch(plan, follows, rate_hz, runner.outputs)

    plan = Watch(level_fs=SIMULATED_LEVEL_FS) if wires_itself else Watch()
    runner: WatchRunner | None = None
    runner = WatchRunner(bench, rig_now, calibration, new_watch)
    level_fs = min(plan.level_fs, runner.limit.ceiling_fs(runner.outputs))
    runner.wish(tone_on=wires_itself, frequency_hz=plan.frequency_hz, level_fs=level_fs)
    runner.begin()
    return runner


def open_watch(text: str = SIMULATED) -> WatchRunner:
    """Open a bench that keeps time and watch it; `close` of the runner lets go of both.

    Raises:
        WattproofError: the bench cannot be opened; nothing is left open then.
    """
    bench = open_bench(text)
    try:
        runner = make_watch_runner(bench)
    except BaseException:
        bench.close()
        raise
    runner.reopen = lambda: open_bench(text)
    return runner


def make_measurement(
    bench: Bench,
    plan: PowerPlan,
    rig: Rig | None = None,
    hand_db_per_s: float | None = 6.0,
    keeper: Keeper | None = None,
) -> Measurement:
    """Return a power measurement on an open bench, not started yet.

    A simulated bench has its own rig and a hand that turns its knob by `hand_db_per_s` and does what is asked; on any
    other one, and where the speed is None, a person is asked. Without a rig a plain one is taken: one channel, no
    attenuator.

    Raises:
        WrongUseError: the plan does not fit the bench; volts that are not known, for one.
    """
    from wattproof.runner.hands import BenchHand  # noqa: PLC0415 - a command that reads files does without

    own = getattr(bench, "rig", None)
    simulated = isinstance(own, Rig)
    wired = rig or (own if isinstance(own, Rig) else Rig())
    hand = BenchHand(bench, hand_db_per_s) if simulated and hand_db_per_s is not None else None
    return Measurement(
        bench, wired, known_calibration(bench), plan, _curve_reader, hand, keeper
    )  # volts: Driving.taken


def make_sitting(
    bench: Bench,
    plan: AroundPlan,
    rig: Rig | None = None,
    calibration: Calibration | None = None,
    settings: Mapping[str, float] = MappingProxyType({}),
) -> "Sitting":
    """Return a procedure around the power statement on an open bench, not started yet; the plan's kind names it.

    `settings` turn a simulated bench's own controls; it plugs and switches by itself. Without a rig a plain one
    is taken.

    Raises:
        WrongUseError: the plan does not fit the bench, or settings are given for a bench without controls.
    """
    from wattproof.runner.around import AroundHand, Sitting  # noqa: PLC0415 - a command that reads files does without
    from wattproof.runner.jobs import job_for  # noqa: PLC0415 - likewise

    own = getattr(bench, "rig", None)
    if settings and not isinstance(own, Rig):
        raise WrongUseError("--set turns the controls of a simulated bench; set the amplifier's own by hand")
    hand = AroundHand(bench, settings) if isinstance(own, Rig) else None
    if hand is not None:
        hand.prepare()
        own = getattr(bench, "rig", None)  # the load may have been switched
    wired = rig or (own if isinstance(own, Rig) else Rig())
    known = bench.calibration if calibration is None else calibration
    return Sitting(bench, wired, known, plan, job_for(plan), _live_reader, hand)


def _live_reader(rate_hz: float, settings: tuple[ReadingSettings, ...]) -> Reader:
    from wattproof.dsp.live import LiveReader  # noqa: PLC0415 - a command that reads files does without

    return LiveReader(rate_hz, settings)


class LogFile(RotatingFileHandler):
    """A bounded log file that stays quiet when the disk takes no more: a log must never disturb a measurement."""

    def handleError(self, record: logging.LogRecord) -> None:  # noqa: N802 - the library's own hook
        """Let the line go."""


def _curve_reader(rate_hz: float, settings: tuple[ReadingSettings, ...]) -> Reader:
    from wattproof.procedures.curve_reader import curve_reader  # noqa: PLC0415 - likewise

    return curve_reader(rate_hz, settings)


def data_folder() -> Path:
    """Return the folder that the platform means for records of this program: rigs and calibrations."""
    import platformdirs  # noqa: PLC0415 - not on the way to the first reading

    return platformdirs.user_data_path(NAME, appauthor=False)


def known_calibration(bench: Bench) -> Calibration:
    """Return the stored calibration of a real device at its rate, or what the bench itself declares where none is.

    Raises:
        WrongUseError: the stored record is of another device or rate, or its file is not as it should be.
    """
    if not bench.identity.real:
        return bench.calibration
    from wattproof.store.calibration_file import read_calibration, require_suits  # noqa: PLC0415 - likewise
    from wattproof.store.record_file import file_name  # noqa: PLC0415 - likewise

    identity = bench.identity
    path = calibration_folder() / file_name(f"{identity.name}-{identity.rate_hz:g}")
    if not path.is_file():
        return bench.calibration
    stored = read_calibration(path)
    require_suits(stored, identity.name, identity.rate_hz, ())
    return stored


def calibration_folder() -> Path:
    """Return the folder of calibration records, one TOML file for each device and rate."""
    return data_folder() / "calibrations"


def rig_folder() -> Path:
    """Return the folder of rigs, one TOML file each."""
    return data_folder() / "rigs"


def named_rig(name: str) -> Rig:
    """Return a rig by the name of its file in the rig folder, or by a path that ends in .toml.

    Raises:
        WrongUseError: there is none, or its file is not as it should be; the line names file, line and field.
    """
    from wattproof.store.record_file import file_name  # noqa: PLC0415 - only a rig that is asked for is read
    from wattproof.store.rig_file import read_rig  # noqa: PLC0415 - likewise

    if name.endswith(".toml"):
        return read_rig(Path(name))
    path = rig_folder() / file_name(name)
    if not path.is_file():
        there = ", ".join(sorted(each.stem for each in rig_folder().glob("*.toml"))) or "none yet"
        raise WrongUseError(
            f"no rig is called {name!a} in {rig_folder()} (there: {there}); give a path to a .toml file"
        )
    return read_rig(path)


def log_folder() -> Path:
    """Return the folder that the platform means for log files of this program."""
    import platformdirs  # noqa: PLC0415 - not on the way to the first reading

    return platformdirs.user_log_path(NAME, appauthor=False)


def open_log() -> str:
    """Send the log to a file in the platform's folder and return its path; empty where it cannot be written.

    A second call returns the same path. The files are bounded: the oldest is dropped.
    """
    logger = logging.getLogger(NAME)
    for handler in logger.handlers:
        if isinstance(handler, LogFile):
            return handler.baseFilename
    logger.propagate = False
    logger.setLevel(logging.INFO)
    path = log_folder() / f"{NAME}.log"
    try:
        path.parent.mkdir(parents=True, exist_ok=True)
        handler = LogFile(path, maxBytes=_LOG_BYTES, backupCount=_LOG_FILES, encoding="utf-8")
    except OSError:
        logger.addHandler(logging.NullHandler())
        return ""
    handler.setFormatter(logging.Formatter("%(asctime)s %(levelname)s %(name)s: %(message)s"))
    logger.addHandler(handler)
    return str(path)


def close_log() -> None:
    """Let go of the log file."""
    logger = logging.getLogger(NAME)
    for handler in tuple(logger.handlers):
        logger.removeHandler(handler)
        handler.close()
