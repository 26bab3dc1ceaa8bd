"""Drives under the same guard at one frequency after the other, and reads the complex gain beside each reading."""

import math
from collections.abc import Sequence

import attrs

from wattproof.core.errors import WattproofError
from wattproof.core.notes import Kind, Note, note
from wattproof.core.picture import Picture
from wattproof.core.reading import Reading, ReadingSettings, State
from wattproof.core.signal import Capture, Sweep, Tone
from wattproof.core.wording import sentence
from wattproof.dsp.transfer import Transfer, transfer
from wattproof.procedures.around_plan import REFERENCE_HZ, AroundPlace, AroundPlan
from wattproof.procedures.driving import START_FS, Doing, Driving
from wattproof.procedures.guard import BURST_DUTY, BURST_S, pause_s
from wattproof.procedures.power_plan import BURST_ABOVE_HZ, BURST_BELOW_HZ
from wattproof.procedures.power_rows import Row, settings_of
from wattproof.procedures.requests import Acquire, Figure, Kept, Mark, Play, Progress, Said
from wattproof.signals.ramp import RAMP_S

PLACE_KEPT_S = 4.0  # after a burst its level may sound again at once for so long
LOOK_S = 0.15
RAISE = 4.0  # 12 dB at most from one look to the next while a level is sought
REACHED = 0.003  # 0.026 dB: near enough to a level that was asked for
LEAST_CYCLES = 3.1  # three are the least that a reader takes; the rest of a burst is left for settling
BEGINNING_S = 0.08  # of a burst: ramps, and what a bench takes to end it; what it took counts in the pause
ROOM = 1.02  # of a tone's frequency: the band of a reader ends no lower
QUIET_S = 0.5  # before a sweep: the longest way round, and the last tone's end in couplings
_TRIES = 3
_LOOKS = 16


def in_bursts(frequency_hz: float) -> bool:
    """Whether the guard allows this frequency in bursts only."""
    return not BURST_BELOW_HZ <= frequency_hz <= BURST_ABOVE_HZ


class Stepping(Driving):
    """The drive and the readings of a procedure that changes its frequency. It works on one row at a time."""

    cycles = LEAST_CYCLES

    def __init__(self, plan: AroundPlan, place: AroundPlace, row: Row) -> None:
        super().__init__(plan.guarded(), place, row)
        self.around = plan
        self.capture: Capture | None = None
        self._zero = place.phase_from_zero
        self._origin = 0
        self._stands = 0  # the frame from which the last tone, or the last silence, stands
        self._sounding_hz = 0.0
        self._loud_fs, self._loud_until_s = 0.0, -math.inf
        self.free = False  # a loop without an amplifier: nothing in it burns

    def take_row(self, row: Row) -> None:
        """Go on with another row, in silence; somebody may have switched something, so the drive begins anew."""
        super().take_row(row)
        self._loud_fs, self._loud_until_s = 0.0, -math.inf

    def silence(self) -> Doing[None]:
        """Ramp down, and remember when that was done."""
        if self.row.outputs:
            stands = yield Play(Tone(self.plan.frequency_hz, 0.0, self.row.outputs))
            assert isinstance(stands, int)  # noqa: S101 - the answer that a Play has by contract
            self._stands = stands
        self.level_fs, self.last, self._since_play_s = 0.0, None, 0.0

    def tune(self, frequency_hz: float) -> None:
        """Take another frequency from the next tone on; what one frequency gave says nothing of the next."""
        if frequency_hz != self.plan.frequency_hz:
            inside = frequency_hz <= self.around.high_hz
            high_hz = self.around.high_hz if inside else ROOM * frequency_hz
            widened = high_hz != self.plan.high_hz
            self.plan = attrs.evolve(self.plan, frequency_hz=frequency_hz, high_hz=high_hz)
            if widened:  # a tone beyond the band is only found by a reader whose band holds it
                settings = settings_of(self.plan, self.place, self.row)
                self.reader = self.place.new_reader(self.place.rate_hz, settings)
            self.reader.restart(frequency_hz)
            self.last = None

    def taken(self, capture: Capture) -> tuple[tuple[Reading, ...], Picture | None]:
        """Read a block, and remember it."""
        self.capture = capture
        return super().taken(capture)

    def reach(self, wanted_vrms: float) -> Doing[Reading]:
        """Bring the output to a voltage at the reference frequency, slowly from below, and stay there.

        Where it cannot be reached the run says so and stays at what could.
        """
        self.tune(REFERENCE_HZ)
        yield from self.sound(START_FS)
        for _ in range(_LOOKS):
            reading = yield from self.look(LOOK_S, self.around_settle_s)
            vrms = 0.0 if reading.level_vrms is None else reading.level_vrms.value
            ratio = RAISE if reading.state is not State.OK or not vrms else min(wanted_vrms / vrms, RAISE)
            if abs(ratio - 1.0) < REACHED:
                break
            level_fs = min(self.level_fs * ratio, self.ceiling_fs)
            if level_fs == self.level_fs:
                yield Said(
                    note(Kind.LEVEL_NOT_REACHED, channel=self.row.channel, vrms=vrms, wanted_vrms=wanted_vrms),
                    self.row.index,
                )
                break
            yield from self.sound(level_fs)
        return reading

    def reader_settings(self, socket: int) -> ReadingSettings:
        """Return how an input is read now."""
        return settings_of(self.plan, self.place, self.row)[socket - 1]

    @property
    def around_settle_s(self) -> float:
        """How long a change of tone settles: couplings and a slow supply."""
        return 0.05

    def point(self, level_fs: float, seconds: float, mark: Mark, settle_s: float = 0.05) -> Doing[Kept]:
        """Read the tone as tuned at a level, in a burst where the guard wants it, with the complex gain as figures.

        Raises:
            Muted: the guard silenced the tone.
            WattproofError: nothing could be read.
        """
        frequency_hz = self.plan.frequency_hz
        burst = in_bursts(frequency_hz) and not self.free
        seconds = max(seconds, LEAST_CYCLES / frequency_hz)
        if burst:
            seconds = min(seconds, BURST_S - settle_s - BEGINNING_S)
            if frequency_hz < BURST_BELOW_HZ:  # couplings settle slowly: all of the burst that is not read
                settle_s = max(BURST_S - seconds - BEGINNING_S, 0.0)
        yield from self._to(level_fs)
        kept = yield from self._read_point(seconds, settle_s, mark)
        if burst:
            self._loud_fs = self.level_fs
            began = self._stands
            yield from self.silence()
            sounded_s = max((self._stands - began) / self.place.rate_hz, seconds + settle_s)
            yield from self.pause(pause_s(sounded_s))
            self._loud_until_s = self.clock_s - pause_s(sounded_s)
        return kept

    def hushed(self) -> Doing[None]:
        """Fall silent for somebody's hands; the next tone rises from the bottom again."""
        yield from self.silence()
        self._loud_fs, self._loud_until_s = 0.0, -math.inf

    def sweep(self, sweep: Sweep, tail_s: float) -> Doing[Capture]:
        """Sound a sweep at a level that sounded just before, and return all that came back.

        Raises:
            WattproofError: frames are missing, or the input was overloaded.
        """
        yield from self._to(sweep.level_fs)
        yield from self.look(LOOK_S, self.around_settle_s)
        yield from self.silence()
        yield from self.pause(QUIET_S)
        yield Play(sweep)
        capture = yield Acquire(round((sweep.seconds + tail_s) * self.place.rate_hz))
        assert isinstance(capture, Capture)  # noqa: S101 - the answer that an Acquire has by contract
        self.clock_s += capture.span.seconds
        yield from self.silence()
        if capture.gaps or capture.overloads:
            what = "frames are missing in the sweep" if capture.gaps else "the sweep overloads the interface"
            raise WattproofError(
                f"{what}: nothing of it can be told; lower the level, or close what else uses the interface"
            )
        return capture

    def transfer(self) -> Transfer:
        """Return the complex gain of the block that was read last.

        Raises:
            ValueError: nothing was read, or no fit stands.
        """
        if self.capture is None:
            raise ValueError("no block was read yet")
        tone = Tone(self.plan.frequency_hz, self.level_fs, self.row.outputs)
        return transfer(self.capture, tone, self._origin)

    def doing(self, done: int, of: int, what: str, left_s: float) -> Progress:
        """Return the record of how far the procedure is."""
        words = note(Kind.MEASURING_AT, what=what, frequency_hz=self.plan.frequency_hz)
        return self.progress(done / max(of, 1), left_s, words)

    def _to(self, level_fs: float) -> Doing[None]:
        """Bring the drive to a level: at once where that level sounded a moment ago, else as slowly as ever."""
        level_fs = min(level_fs, self.ceiling_fs)
        lately = self.clock_s - self._loud_until_s < PLACE_KEPT_S and self._loud_fs > 0.0
        if self.level_fs > 0.0 and self._sounding_hz != self.plan.frequency_hz:
            yield from self._play(min(level_fs, self.level_fs))
        elif self.level_fs == 0.0 and lately:
            self.reader.restart(self.plan.frequency_hz)
            yield from self._play(min(level_fs, self._loud_fs))
        yield from self.sound(level_fs)

    def _play(self, level_fs: float) -> Doing[None]:
        if self.row.outputs:
            anew = self.level_fs == 0.0 or self._sounding_hz != self.plan.frequency_hz
            stands = yield Play(Tone(self.plan.frequency_hz, level_fs, self.row.outputs))
            assert isinstance(stands, int)  # noqa: S101 - the answer that a Play has by contract
            self._stands = stands
            if self._zero:
                self._origin = 0
            elif anew:
                self._origin = stands - round(RAMP_S * self.place.rate_hz)
            self._sounding_hz = self.plan.frequency_hz
        self.level_fs, self._since_play_s = level_fs, 0.0

    def _read_point(self, seconds: float, settle_s: float, mark: Mark) -> Doing[Kept]:
        for _ in range(_TRIES):
            reading = yield from self.look(seconds, settle_s)
            if reading.state is State.OK:
                kept = Kept(
                    reading,
                    attrs.evolve(mark, drive_fs=self.level_fs, row=self.row.index),
                    gain_figures(self.transfer()),
                )
                yield kept
                return kept
            settle_s = 0.0
        yield from self.silence()
        why = "; ".join(sentence(each) for each in reading.notes) or reading.state.value
        raise WattproofError(f"input {self.row.wiring.input} at {self.plan.frequency_hz:g} Hz: {why}")


def gain_figures(seen: Transfer) -> tuple[Figure, ...]:
    """Return a complex gain as figures: for each input n "re n" and "im n", full scales captured per one played."""
    figures = [Figure("one clock", float(seen.one_clock), 0.0, seen.frequency_hz)]
    for channel, (gain, u) in enumerate(zip(seen.gain.tolist(), seen.u.tolist(), strict=True), 1):
        figures.append(Figure(f"re {channel}", gain.real, u, seen.frequency_hz))
        figures.append(Figure(f"im {channel}", gain.imag, u, seen.frequency_hz))
    return tuple(figures)


@attrs.frozen
class Gain:
    """A complex gain at a frequency: full scales captured per one played, `u` of its real or imaginary part."""

    frequency_hz: float
    z: complex
    u: float
    one_clock: bool = True


def gain_of(kept: Kept, channel: int) -> Gain | None:
    """Return the complex gain into an input that a kept reading holds, or None."""
    by_name = {figure.name: figure for figure in kept.figures}
    if f"re {channel}" not in by_name:
        return None
    re, im = by_name[f"re {channel}"], by_name[f"im {channel}"]
    return Gain(re.at_hz, complex(re.value, im.value), re.u, bool(by_name["one clock"].value))


def said_notes(records: Sequence[Kept | Said]) -> tuple[Note, ...]:
    """Return what a run found out, each once, in order: also where nothing could be kept."""
    return tuple(dict.fromkeys(each.note for each in records if isinstance(each, Said)))


def bursts_said(tones_hz: tuple[float, ...], row: Row) -> tuple[Said, ...]:
    """Return what is to be said where some tones are read in bursts."""
    if not any(in_bursts(frequency_hz) for frequency_hz in tones_hz):
        return ()
    return (Said(note(Kind.BURST_POINTS, burst_s=BURST_S, percent=100.0 * BURST_DUTY), row.index),)
