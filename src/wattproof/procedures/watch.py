"""The endless live reading: sounds what the person wants, and reads block after block until it is stopped."""

import math
from collections.abc import Callable
from typing import Protocol

import attrs

from wattproof.core import checks
from wattproof.core.calibration import Calibration
from wattproof.core.errors import WrongUseError
from wattproof.core.fields import declared
from wattproof.core.picture import Picture
from wattproof.core.reading import Reading, ReadingSettings
from wattproof.core.rig import Rig, Wiring
from wattproof.core.signal import Capture, Tone
from wattproof.procedures.requests import Acquire, Play, Procedure, Shown, Wanted, Wishes

CYCLES_IN_A_BLOCK = 3.0  # our own measurement: two are the least that the fit stands, three keep it well conditioned
LONGEST_FOR_CYCLES_S = 1.0  # a tone so low that this holds too few cycles is refused by its reading, not waited for


@attrs.frozen
class Watch:
    """How a watch starts and how it cuts its blocks.

    A block is as long as the reader proposes, which shortens it while the level moves, from shortest_s to longest_s. A
    reading comes every 1/readings_per_s, or at every block where blocks are shorter.
    """

    frequency_hz: float = declared(
        997.0, label="Frequency", unit="Hz", help="tone to start with", validator=checks.positive
    )
    level_fs: float = declared(
        0.03, label="Drive", unit="of full scale", minimum=0.0, maximum=1.0, help="level of the tone to start with"
    )
    shortest_s: float = declared(
        0.015, label="Shortest block", unit="s", minimum=0.005, maximum=1.0, help="while the level moves fast"
    )
    longest_s: float = declared(
        0.25, label="Longest block", unit="s", minimum=0.005, maximum=10.0, help="while the level is still"
    )
    readings_per_s: float = declared(
        24.0, label="Readings a second", minimum=1.0, maximum=100.0, help="overlapping blocks make up for their length"
    )
    settle_s: float = declared(
        0.05, label="Settling", unit="s", minimum=0.0, maximum=60.0, help="waited after a change of tone"
    )

    def __attrs_post_init__(self) -> None:
        if self.shortest_s > self.longest_s:
            raise ValueError(
                f"the shortest block, {self.shortest_s:g} s, is longer than the longest, {self.longest_s:g} s"
            )


class Reader(Protocol):
    """The live analysis, as far as a watch knows it. It follows the tone from block to block."""

    @property
    def next_frames(self) -> int:
        """How long the next block should be, in frames."""
        ...

    def take(self, capture: Capture, picture_channel: int | None) -> tuple[tuple[Reading, ...], Picture | None]:
        """Read a block: one reading per channel (none where it is not fit to be read), and the picture of one."""
        ...

    def restart(self, frequency_hz: float | None) -> None:
        """Forget what was followed; start from a frequency, or look for one where it is None."""
        ...


ReaderFactory = Callable[[float, tuple[ReadingSettings, ...]], Reader]  # rate in Hz, settings of each channel


def reading_settings(rig: Rig, calibration: Calibration, channels: int) -> tuple[ReadingSettings, ...]:
    """Return how each captured channel is read: volts at the amplifier's terminals, power in its load.

    An input that the rig does not wire is read in its own volts; one whose scale is unknown in dBFS only.
    """
    wired = {wiring.input: wiring for wiring in rig.wirings}
    return tuple(_settings_of(wired.get(channel), calibration, channel) for channel in range(1, channels + 1))


def _settings_of(wiring: Wiring | None, calibration: Calibration, channel: int) -> ReadingSettings:
    scale = calibration.input_vrms(channel)
    if scale is None:
        return ReadingSettings()
    if wiring is None:
        return ReadingSettings(full_scale_vrms=scale.value)
    return ReadingSettings(full_scale_vrms=scale.value * wiring.attenuator.ratio, load_ohm=wiring.load.ohm)


def watch(plan: Watch, reader: Reader, rate_hz: float, outputs: tuple[int, ...] = (1,)) -> Procedure:
    """Read until stopped, sounding what is wanted on the outputs.

    The reader is told the wanted frequency, also in silence: hum must not pass for the tone there. Only on a bench
    without outputs does it look for whatever tone there is.

    The blocks' ends advance evenly and without a hole, whatever their lengths, so that a reading is never older than
    its own block.
    """
    sounding: Wishes | None = None
    blocks = _BlockLengths(plan, rate_hz)
    while True:
        wishes = yield Wanted()
        assert isinstance(wishes, Wishes)  # noqa: S101 - the answer that a Wanted has by contract
        settle_s = 0.0
        if sounding is None or _tone_of(wishes, outputs) != _tone_of(sounding, outputs):
            try:
                yield Play(_tone_of(wishes, outputs))
            except WrongUseError:  # the drive limit came down since it was wished
                yield Play(attrs.evolve(_tone_of(wishes, outputs), level_fs=0.0))
            reader.restart(wishes.frequency_hz if outputs else None)
            blocks.restart()
            settle_s = plan.settle_s
        sounding = wishes
        frames, hop = blocks.following(reader.next_frames, wishes.frequency_hz)
        capture = yield Acquire(frames, hop, settle_s)
        assert isinstance(capture, Capture)  # noqa: S101 - likewise
        readings, picture = reader.take(capture, wishes.channel)
        if readings:
            yield Shown(readings, picture)


def _tone_of(wishes: Wishes, outputs: tuple[int, ...]) -> Tone:
    return Tone(wishes.frequency_hz, wishes.level_fs if wishes.tone_on else 0.0, outputs)


class _BlockLengths:
    """Decides how long the next block is and how far it starts after the last one, in frames."""

    def __init__(self, plan: Watch, rate_hz: float) -> None:
        self._plan = plan
        self._rate_hz = rate_hz
        self._step = max(1, math.floor(rate_hz / plan.readings_per_s))
        self._last_frames: int | None = None

    def restart(self) -> None:
        """Begin anew after a change of tone: the next block has none before it."""
        self._last_frames = None

    def following(self, proposed_frames: int, frequency_hz: float) -> tuple[int, int | None]:
        """Return (frames, hop) of the next block; the hop is None where there is no block before it."""
        frames = self._within(proposed_frames, frequency_hz)
        last, self._last_frames = self._last_frames, frames
        if last is None:
            return frames, None
        frames = self._last_frames = min(frames, last + self._step - 1)  # it never reaches back before the last start
        return frames, last + min(self._step, frames) - frames

    def _within(self, proposed_frames: int, frequency_hz: float) -> int:
        cycles_s = min(CYCLES_IN_A_BLOCK / frequency_hz, LONGEST_FOR_CYCLES_S)
        shortest = math.ceil(max(self._plan.shortest_s, cycles_s) * self._rate_hz)
        longest = math.ceil(max(self._plan.longest_s, cycles_s) * self._rate_hz)
        return max(min(proposed_frames, longest), shortest)
