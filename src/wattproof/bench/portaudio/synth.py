"""What the child sounds: sines of exact phase whose every change is a ramp, and a marker; numbers in, samples out."""

import numpy as np
from numpy.typing import NDArray

RAMP_S = 0.010  # common practice, no source: 5 to 20 ms; long enough for no click, short enough to mute within 0.1 s
PIECE = 2_048  # frames computed at once, so that nothing is allocated whatever the callback asks
CYCLE = 1 << 64  # phase is an integer of 64 bits: it wraps by itself and stays exact for ever
_RADIANS = 2.0 * np.pi / CYCLE


class _Voice:
    """One sine: phase step, phase and the gain of each output."""

    __slots__ = ("gains", "phase", "sounds", "step")

    def __init__(self, step: int, phase: int, gains: list[float]) -> None:
        self.step = step
        self.phase = phase
        self.gains = gains
        self.sounds = any(gains)


class Synth:
    """Renders outputs block by block, in absolute frames from 0.

    A requested tone takes over by a cross-fade of raised cosines over RAMP_S; the phase of a new tone begins at 0
    where its ramp begins, a change of level alone keeps the phase. `fade` ramps everything down to silence from
    wherever it stands. A request waits until a ramp under way is done; `answered` and `answer_frame` tell when the
    newest one began.
    """

    def __init__(self, rate_hz: float, outputs: int, marker: NDArray[np.float32]) -> None:
        self.ramp = round(RAMP_S * rate_hz)
        self.frame = 0
        self.answered = 0
        self.answer_frame = 0
        self._outputs = outputs
        self._rise = 0.5 - 0.5 * np.cos(np.pi * np.arange(1, self.ramp + 1) / self.ramp)
        self._fall = 1.0 - self._rise
        self._old = self._new = _Voice(0, 0, [0.0] * outputs)
        self._crossed = self.ramp  # frames of the cross-fade done
        self._faded = -1  # frames of the fade done; −1: none under way
        self._waiting: tuple[int, int, list[float], int] | None = None
        self._marker = marker
        self._marker_at = self._marker_end = 0
        self._marker_gains: list[float] = []
        self._count = np.arange(PIECE, dtype=np.uint64)
        self._phase = np.zeros(PIECE, dtype=np.uint64)
        self._wave = np.zeros(PIECE)
        self._part = np.zeros(PIECE)
        self._mix = np.zeros((outputs, PIECE))

    @property
    def silent(self) -> bool:
        """Whether nothing sounds and nothing waits to sound."""
        idle = self._crossed == self.ramp and self._marker_at == self._marker_end
        return idle and not self._new.sounds and self._waiting is None

    def tone(self, serial: int, step: int, gains: list[float]) -> None:
        """Ask for a tone of `step` / 2⁶⁴ cycles per frame; `gains` are the peaks at each output."""
        self._waiting = (serial, step, gains, 0)

    def sound_marker(self, serial: int, frames: int, gains: list[float]) -> None:
        """Ask for the marker's first frames; where a tone sounds it is left out."""
        self._waiting = (serial, 0, gains, frames)

    def fade(self) -> None:
        """Ramp down to silence from here; a request that waits is answered and forgotten."""
        if self._waiting is not None:
            self._answer(self._waiting[0])
            self._waiting = None
        if not self.silent and self._faded < 0:
            self._faded = 0

    def render(self, out: NDArray[np.float32]) -> None:
        """Fill `out`, shape (frames, outputs), with the frames that come next."""
        at, frames = 0, len(out)
        while at < frames:
            if self._waiting is not None and self._crossed == self.ramp and self._faded < 0:
                self._begin()
            count = min(frames - at, PIECE)
            if self._crossed < self.ramp:
                count = min(count, self.ramp - self._crossed)
            if self._faded >= 0:
                count = min(count, self.ramp - self._faded)
            if self._marker_at < self._marker_end:
                count = min(count, self._marker_end - self._marker_at)
            self._piece(out[at : at + count], count)
            at += count
            self.frame += count

    def _answer(self, serial: int) -> None:
        self.answered, self.answer_frame = serial, self.frame

    def _begin(self) -> None:
        assert self._waiting is not None  # noqa: S101 - render asked for it one line above; tells the type checker
        serial, step, gains, marker_frames = self._waiting
        self._waiting = None
        self._answer(serial)
        if marker_frames:
            if self.silent:
                self._marker_at, self._marker_end, self._marker_gains = 0, marker_frames, gains
            return
        self._old = self._new
        keeps_phase = self._old.sounds and self._old.step == step
        self._new = _Voice(step, self._old.phase if keeps_phase else 0, gains)
        if self._old.sounds or self._new.sounds:
            self._crossed = 0

    def _piece(self, out: NDArray[np.float32], count: int) -> None:
        """Render frames during which no ramp begins or ends."""
        crossing = self._crossed < self.ramp
        if self.silent:
            out.fill(0.0)
            return
        mix = self._mix[:, :count]
        mix.fill(0.0)
        if crossing:
            self._add(self._old, self._fall[self._crossed : self._crossed + count], count)
            self._add(self._new, self._rise[self._crossed : self._crossed + count], count)
            self._crossed += count
        else:
            self._add(self._new, None, count)
        if self._marker_at < self._marker_end:
            self._add_marker(count)
        if self._faded >= 0:
            np.multiply(mix, self._fall[self._faded : self._faded + count], out=mix)
            self._faded += count
            if self._faded == self.ramp:
                self._fall_silent()
        out[:] = mix.T

    def _add(self, voice: _Voice, weight: NDArray[np.float64] | None, count: int) -> None:
        if not voice.sounds:
            return
        phase, wave = self._phase[:count], self._wave[:count]
        np.multiply(self._count[:count], np.uint64(voice.step), out=phase)
        np.add(phase, np.uint64(voice.phase), out=phase)
        np.multiply(phase.view(np.int64), _RADIANS, out=wave)
        np.sin(wave, out=wave)
        if weight is not None:
            np.multiply(wave, weight, out=wave)
        self._spread(wave, voice.gains, count)
        voice.phase = (voice.phase + count * voice.step) % CYCLE

    def _add_marker(self, count: int) -> None:
        wave = self._wave[:count]
        wave[:] = self._marker[self._marker_at : self._marker_at + count]
        self._spread(wave, self._marker_gains, count)
        self._marker_at += count

    def _spread(self, wave: NDArray[np.float64], gains: list[float], count: int) -> None:
        part = self._part[:count]
        for output in range(self._outputs):
            if gains[output]:
                np.multiply(wave, gains[output], out=part)
                np.add(self._mix[output, :count], part, out=self._mix[output, :count])

    def _fall_silent(self) -> None:
        self._old = self._new = _Voice(0, 0, [0.0] * self._outputs)
        self._crossed, self._faded = self.ramp, -1
        self._marker_at = self._marker_end = 0
