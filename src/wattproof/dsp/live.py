"""Readings of a running tone, block after block: the frequency is followed; blocks shorten while the level moves."""

from collections.abc import Sequence

import attrs
import numpy as np

from wattproof.core.notes import Kind, Note, note
from wattproof.core.picture import Picture
from wattproof.core.reading import Reading, ReadingSettings, State
from wattproof.core.signal import Capture, Gap, Samples, Span
from wattproof.dsp.block import Block, analysed, orders_to
from wattproof.dsp.fit import LIVE_PHASE_RAD, SineFit, block_of, fit_block, fit_prepared, fit_trend
from wattproof.dsp.grid import grid_for
from wattproof.dsp.mains import quick_hum
from wattproof.dsp.model import Matrix, Model
from wattproof.dsp.movement import KINK, LONGEST_MOVING_S, Jump, movement_of
from wattproof.dsp.overload import judge_overload
from wattproof.dsp.picture import draw
from wattproof.dsp.prepared import Prepared
from wattproof.dsp.reading import TONE_OVER_NOISE, ChannelReader
from wattproof.dsp.remarks import carrier_note
from wattproof.dsp.start import hann_spectrum, highest_tone_hz, line_near
from wattproof.dsp.workspace import Workspace

STILL_S = 0.25
SHORTEST_S = 0.015
LEAST_CYCLES = 3.0
LEAST_STEP_DB = 0.1  # a jump with less is one of phase: frames are lost or repeated
MOST_DB_PER_BLOCK = 0.3  # a curve of distortion against level is averaged over a block: 0.3 dB costs 0.014 dB of level
REFINED_PHASE_RAD = 1e-7  # at the ends of a block; the 64th harmonic, which no ramp follows, leaks −104 dB of itself
MOST_ORDERS = 64  # what a live fit resolves; the harmonics of a deep bass tone beyond count as noise


class LiveReader:
    """Reads blocks of a capture, one reading per channel; all channels carry one tone of one clock.

    `refined` readings don't lean on the frequency of the block before: each can be made again from its own block.
    """

    def __init__(
        self,
        rate_hz: float,
        settings: Sequence[ReadingSettings],
        *,
        most_db_per_block: float = MOST_DB_PER_BLOCK,
        kink: float = KINK,
        refined: bool = False,
    ) -> None:
        self._rate_hz = rate_hz
        self._most_db_per_block, self._kink, self._refined = most_db_per_block, kink, refined
        self._phase_rad = REFINED_PHASE_RAD if refined else LIVE_PHASE_RAD
        self._settings = tuple(settings)
        self._frequency_hz: float | None = None
        self._prepared: Prepared | None = None
        self._hint_hz: float | None = None
        self._work = Workspace()
        self._told_frame = -1  # up to where jumps have been told
        self.next_frames = self._frames(STILL_S)

    def _frames(self, seconds: float) -> int:
        least = LEAST_CYCLES / (self._frequency_hz or 1000.0)
        return grid_for(round(max(seconds, least) * 1.005 * self._rate_hz)).frames

    def restart(self, frequency_hz: float | None = None) -> None:
        """Forget the tone that was followed; look for the next one near frequency_hz, or anywhere."""
        self._frequency_hz, self._prepared, self._hint_hz = None, None, frequency_hz
        self.next_frames = self._frames(STILL_S)

    def follow(self, frequency_hz: float, told_frame: int = -1) -> None:
        """Take up a tone whose frequency is known, as if it had been followed so far.

        Up to `told_frame` a jump of the level counts as told, so that what comes after it is read.
        """
        self.restart(frequency_hz)
        self._frequency_hz, self._told_frame = frequency_hz, told_frame

    def take(self, capture: Capture, picture_channel: int | None = None) -> tuple[tuple[Reading, ...], Picture | None]:
        """Read a capture: one reading per channel, and the picture of one channel (counted from 1) if wanted.

        While the level moves only the newest part is read, so short that it moves by 0.3 dB at most.
        """
        x = capture.samples
        missing = [gap for gap in capture.gaps if _touches(gap, capture.span)]
        if missing:
            at_s = missing[0].first_frame / self._rate_hz
            return self._all(capture, State.GAP, note(Kind.GAP, at_s=at_s, why=missing[0].why)), None
        if self._frequency_hz is None:
            self._frequency_hz = self._found(x)
        if self._frequency_hz is None:
            return self._silence(capture), None
        if capture.frames < LEAST_CYCLES * 0.99 / self._frequency_hz * self._rate_hz:
            cycles = capture.frames * self._frequency_hz / self._rate_hz
            few = note(Kind.TOO_FEW_CYCLES, cycles=cycles, need=LEAST_CYCLES)
            return self._all(capture, State.TOO_SHORT, few), None
        columns = self._work.array("columns", (capture.channels, capture.frames))
        np.copyto(columns, x.T)
        moves = movement_of(columns[self._loudest(columns.T)], self._rate_hz, self._frequency_hz, self._kink)
        if moves.jump is not None:
            return self._after(capture, moves.jump, picture_channel)
        return self._read(capture, columns.T, moves.db_per_s, picture_channel)

    def _after(
        self, capture: Capture, jump: Jump, picture_channel: int | None
    ) -> tuple[tuple[Reading, ...], Picture | None]:
        """Refuse the block in which a jump is new; read what follows one that was told, or one that is none to tell."""
        frame = capture.first_frame + jump.first_frame
        told = not jump.twisted and (abs(jump.db) < LEAST_STEP_DB or frame <= self._told_frame)
        left = capture.frames - jump.clear_frame
        if told and left >= max(self._frames(SHORTEST_S), 16):
            rest = capture.samples[jump.clear_frame :]
            after = attrs.evolve(capture, samples=rest, first_frame=capture.first_frame + jump.clear_frame)
            loudest = np.ascontiguousarray(rest[:, self._loudest(rest)])
            slope = movement_of(loudest, self._rate_hz, self._frequency_hz or 1.0, self._kink)
            return self._read(after, rest, slope.db_per_s, picture_channel)
        self._told_frame = capture.first_frame + jump.clear_frame
        self.next_frames = self._frames(LONGEST_MOVING_S)
        at_s = (frame + (jump.clear_frame - jump.first_frame) / 2.0) / self._rate_hz
        if jump.twisted and abs(jump.db) < LEAST_STEP_DB:
            return self._all(capture, State.UNSTEADY, note(Kind.BREAK, at_s=at_s)), None
        return self._all(capture, State.UNSTEADY, note(Kind.LEVEL_STEP, at_s=at_s, db=jump.db)), None

    @staticmethod
    def _loudest(samples: Samples) -> int:
        return int(np.argmax([float(column @ column) for column in samples.T]))

    def _found(self, x: Samples) -> float | None:
        """Return the frequency of the strongest line of the strongest channel, or None where it is no tone."""
        best: tuple[float, float] | None = None
        for channel in range(x.shape[1]):
            setting = self._settings[channel]
            low = max(setting.low_hz, LEAST_CYCLES * self._rate_hz / x.shape[0])
            high = highest_tone_hz(setting.high_hz, self._rate_hz)
            if self._hint_hz:
                low, high = 0.9 * self._hint_hz, min(high, 1.1 * self._hint_hz)
            spectrum = hann_spectrum(x[:, channel], self._rate_hz)
            if high * x.shape[0] / self._rate_hz < 1.0 or high <= low:
                continue
            line = line_near(spectrum, low, high)
            if not low - spectrum.bin_hz <= line.frequency_hz <= high + spectrum.bin_hz:  # a stronger line's skirt
                continue
            if line.over_noise >= TONE_OVER_NOISE and line.amplitude > 0 and (best is None or line.amplitude > best[0]):
                best = line.amplitude, line.frequency_hz
        return None if best is None else best[1]

    def _fit(self, block: Matrix, ramp: int) -> SineFit | None:
        """Fit at the prepared frequency; prepare anew only where that has moved. None where the tone was lost."""
        frequency_hz = self._frequency_hz or 0.0
        grid = grid_for(block.shape[1] * block.shape[2])
        seconds = grid.frames / self._rate_hz
        high = max(setting.high_hz for setting in self._settings)
        count = min(MOST_ORDERS, orders_to(frequency_hz, high, self._rate_hz, seconds))
        trend = 3 if frequency_hz * seconds >= 5.0 else 1
        model = Model(tuple(range(1, count + 1)), ramp, trend)
        ready = self._prepared
        if ready is None or ready.model != model or ready.grid is not grid:
            fit = fit_block(block, self._rate_hz, frequency_hz, model, phase_limit_rad=self._phase_rad)
        else:
            fit = fit_prepared(block, ready, self._rate_hz)
            if abs(fit.phase_error_rad) > 0.3 * np.pi:  # 0.3 bin: a fit from here may run to a wrong place
                return None
            turned = abs(fit.phase_error_rad)
            if turned > self._phase_rad and (self._refined or turned > self._limit(fit)):
                fit = fit_block(block, self._rate_hz, fit.frequency_hz, model, phase_limit_rad=self._phase_rad)
        self._prepared = fit.prepared
        self._frequency_hz = fit.frequency_hz
        return fit

    def _limit(self, fit: SineFit) -> float:
        """A frequency error may leave, to second order, a thousandth of what harmonics and noise already leave."""
        coefficients = fit.coefficients
        beyond = np.abs(coefficients[:, fit.model.ramp + 1 :]) ** 2
        share = float(beyond.sum() / max(np.sum(np.abs(coefficients[:, 0]) ** 2), 1e-300))
        return max(LIVE_PHASE_RAD, 0.1 * share**0.5) if share < 1.0 else LIVE_PHASE_RAD

    def _read(
        self, capture: Capture, samples: Samples, db_per_s: float, picture_channel: int | None
    ) -> tuple[tuple[Reading, ...], Picture | None]:
        moving = db_per_s != 0.0
        frames = capture.frames
        if moving:
            seconds = min(LONGEST_MOVING_S, max(SHORTEST_S, self._most_db_per_block / abs(db_per_s)))
            frames = min(frames, self._frames(seconds))
        self.next_frames = self._frames(LONGEST_MOVING_S if moving else STILL_S)
        block = block_of(samples[capture.frames - frames :])
        span = Span(capture.first_frame + capture.frames - frames, block[0].size, self._rate_hz)
        try:
            fit = self._fit(block, 3 if moving else 1)
        except (ValueError, np.linalg.LinAlgError):
            fit = None
        if fit is None:
            self.restart(self._hint_hz)
            return self._all(capture, State.UNSTEADY, note(Kind.BREAK, at_s=span.start_s)), None
        analysis = self._with_hum(analysed(block, fit, work=self._work))
        moved = (note(Kind.LEVEL_MOVES, db=db_per_s * span.seconds, db_per_s=db_per_s),) if moving else ()
        readings = tuple(self._one(analysis, capture, span, channel, moved) for channel in range(block.shape[0]))
        if picture_channel is None:
            return readings, None
        reading = readings[picture_channel - 1]
        return readings, draw(analysis, picture_channel - 1, reading)

    def _with_hum(self, analysis: Block) -> Block:
        tone_hz = analysis.fit.frequency_hz if analysis.fit.model.orders else None
        low = max(setting.low_hz for setting in self._settings)
        high = min(setting.high_hz for setting in self._settings)
        hum, spectrum = quick_hum(analysis.spectrum, tone_hz, (low, high))
        return analysis if hum == analysis.hum else attrs.evolve(analysis, hum=hum, spectrum=spectrum)

    def _one(self, analysis: Block, capture: Capture, span: Span, channel: int, moved: tuple[Note, ...]) -> Reading:
        reader = ChannelReader(analysis, channel, self._settings[channel])
        overload = judge_overload(capture.overloads, channel + 1, span, analysis.fit.frequency_hz)
        if overload is not None:
            return reader.read_withheld(span, channel + 1, State.OVERLOAD, (overload,))
        if not reader.has_tone():
            return reader.read_withheld(span, channel + 1, State.NO_TONE, (note(Kind.NO_TONE),))
        carrier = carrier_note(analysis, channel)
        return reader.read(span, channel + 1, (*moved, carrier) if carrier else moved)

    def _silence(self, capture: Capture) -> tuple[Reading, ...]:
        self.next_frames = self._frames(STILL_S)
        block = block_of(capture.samples)
        span = Span(capture.first_frame, block[0].size, self._rate_hz)
        analysis = self._with_hum(analysed(block, fit_trend(block, self._rate_hz)))
        readings = []
        for channel in range(block.shape[0]):
            reader = ChannelReader(analysis, channel, self._settings[channel])
            overload = judge_overload(capture.overloads, channel + 1, span, None)
            if overload is not None:
                readings.append(reader.read_withheld(span, channel + 1, State.OVERLOAD, (overload,)))
            else:
                readings.append(reader.read_silence(span, channel + 1, (note(Kind.NO_TONE),)))
        return tuple(readings)

    def _all(self, capture: Capture, state: State, why: Note) -> tuple[Reading, ...]:
        return tuple(
            Reading(span=capture.span, channel=channel + 1, settings=setting, state=state, notes=(why,))
            for channel, setting in enumerate(self._settings)
        )


def _touches(gap: Gap, span: Span) -> bool:
    return gap.first_frame < span.end_frame and span.first_frame < gap.first_frame + max(gap.frames, 1)
