"""Reads recordings, several at a time, and hands the results back in the order asked for."""

import os
from collections.abc import Iterator, Sequence
from concurrent.futures import ThreadPoolExecutor
from typing import Protocol

import attrs

from wattproof.bench.recording.sound_file import SoundFileContent, open_sound
from wattproof.core.errors import WrongUseError
from wattproof.core.reading import Reading, ReadingSettings
from wattproof.core.signal import Capture
from wattproof.procedures.read_recording import read_recording
from wattproof.report.characters import printable
from wattproof.report.source import Source

MOST_WORKERS = 4  # each holds one recording in memory; more would not read faster than the disk


@attrs.frozen
class Wanted:
    """What is to be read of each recording.

    `channel` None means all. `band_given` tells a band that a person asked for, which a file must be able to show,
    from the default one, which is cut to half the rate.
    """

    settings: ReadingSettings = attrs.field(factory=ReadingSettings)
    band_given: bool = False
    channel: int | None = None
    fundamental_hz: float | None = None
    start_s: float = 0.0
    seconds: float | None = None


@attrs.frozen
class FileRead:
    """A recording that was read: one reading per channel asked for."""

    source: Source
    readings: tuple[Reading, ...]


@attrs.frozen
class FileRefused:
    """A recording that could not be read: `why` is one line that names the file and the way out."""

    file: str
    why: str


Outcome = FileRead | FileRefused


class Reader(Protocol):
    """How a capture is read: `procedures.read_recording` or a stand-in that behaves."""

    def __call__(
        self,
        capture: Capture,
        settings: ReadingSettings,
        *,
        fundamental_hz: float | None = None,
        channels: tuple[int, ...] | None = None,
    ) -> tuple[Reading, ...]:
        """Return one reading per channel."""
        ...


def read_file(path: str, wanted: Wanted, reader: Reader = read_recording) -> Outcome:
    """Read one recording. What stands in the way is an outcome, not an error, so that other files are still read."""
    try:
        return _read(path, wanted, reader)
    except WrongUseError as error:
        return FileRefused(path, printable(str(error)))
    except MemoryError:
        return FileRefused(
            path, f"{printable(path)}: it does not fit into memory; read a part with --start and --seconds"
        )
    except OSError as error:
        return FileRefused(path, f"{printable(path)}: it can't be read ({error.strerror or error}); check its disk")


def read_files(paths: Sequence[str], wanted: Wanted, reader: Reader = read_recording) -> Iterator[Outcome]:
    """Read recordings in parallel and yield their outcomes in order, each as soon as it and those before it are there.

    Threads, since numpy and the file library let go of the interpreter while they work; starting processes would cost
    more than reading a short file.
    """
    workers = min(len(paths), os.cpu_count() or 1, MOST_WORKERS)
    if workers <= 1:
        yield from (read_file(path, wanted, reader) for path in paths)
        return
    with ThreadPoolExecutor(workers, thread_name_prefix="read") as pool:
        yield from pool.map(lambda path: read_file(path, wanted, reader), paths)


def _read(path: str, wanted: Wanted, reader: Reader) -> FileRead:
    content = open_sound(path, start_s=wanted.start_s, seconds=wanted.seconds)
    source = Source(path, content.rate_hz, content.frames, content.channels, content.sha256)
    _check_against_file(source, wanted)
    channels = None if wanted.channel is None else (wanted.channel,)
    try:
        readings = reader(content.capture, wanted.settings, fundamental_hz=wanted.fundamental_hz, channels=channels)
    except ValueError as error:  # what a span can't be read as, though its file is sound
        why = f"it can't be read as asked ({error}); ask for a wider band or a longer part"
        raise WrongUseError(f"{printable(path)}: {why}") from error
    return FileRead(source, tuple(_with_notes_of_file(reading, content) for reading in readings))


def _with_notes_of_file(reading: Reading, content: SoundFileContent) -> Reading:
    return attrs.evolve(reading, notes=(*content.notes, *reading.notes))


def _check_against_file(source: Source, wanted: Wanted) -> None:
    name, half_hz = printable(source.file), source.rate_hz / 2
    if wanted.channel is not None and wanted.channel > source.channels:
        held = "1 channel" if source.channels == 1 else f"{source.channels} channels"
        raise WrongUseError(f"{name}: it has {held}, no channel {wanted.channel}; ask for one that it has, or for all")
    if wanted.fundamental_hz is not None and wanted.fundamental_hz >= half_hz:
        raise WrongUseError(
            f"{name}: it can't hold a fundamental of {wanted.fundamental_hz:g} Hz: half its rate is {half_hz:g} Hz; "
            "give a frequency below that, or none to have it found"
        )
    if wanted.band_given and wanted.settings.high_hz > half_hz:
        raise WrongUseError(
            f"{name}: it can't show a band to {wanted.settings.high_hz:g} Hz: half its rate is {half_hz:g} Hz; end the "
            "band there or below"
        )
