"""Reading a recording: find the tone and its steady part, fit it, tell hum from noise, and say what was left out."""

import attrs
import numpy as np

from wattproof.core.notes import Kind, Note, note
from wattproof.core.reading import Reading, ReadingSettings, State
from wattproof.core.signal import Capture, Samples, Span
from wattproof.core.units import DB_PER_RELATIVE, db
from wattproof.dsp.block import Block, analysed, orders_to
from wattproof.dsp.fit import SineFit, block_of, fit_block, fit_trend
from wattproof.dsp.mains import HIGHEST_LINE, NOMINAL_HZ, TOLERANCE, Hum, find_hum
from wattproof.dsp.model import Matrix, Model
from wattproof.dsp.overload import judge_overload
from wattproof.dsp.reading import TONE_OVER_NOISE, ChannelReader
from wattproof.dsp.remarks import carrier_note, lines_beside, second_tone_note
from wattproof.dsp.start import Line, Spectrum, hann_spectrum, highest_tone_hz, line_near
from wattproof.dsp.steady import find_steady, movement

LEAST_CYCLES = 3.0
LEAST_FRAMES = 256
MOST_FRAMES = 1 << 20  # one fit takes 11 s at 96 kHz; more would ask the tone's clock to hold still for longer
MOST_ORDERS = 1000  # the harmonics of 20 Hz up to 20 kHz
_WHOLE_ORDERS = 100  # a fit with this few orders goes on to half the rate, so that nothing beyond the band leaks back
_UNSTEADY_RELATIVE = 0.12  # 1 dB: a level that ranges wider has no one value
_UNSTEADY_RAD = 0.5  # and a phase that wanders wider has no one frequency
_MOVES_RELATIVE = 0.0115  # 0.1 dB: said, but read
_RAMP_GAIN = 0.9  # a cubic ramp is taken where it leaves less than this share of the linear ramp's noise power
_FOREIGN = 1e-3  # a line of −60 dB leans on its neighbours by −110 dB and less
_HUM_TONE = 0.01  # a line at a low multiple of the mains is taken for a tone from −40 dBFS up
_HUM_NUMBERS = 6


@attrs.frozen
class _Tone:
    """The line that is read as the tone, and notes on how it was chosen."""

    frequency_hz: float
    notes: tuple[Note, ...] = ()


def read_recording(
    capture: Capture,
    settings: ReadingSettings,
    *,
    fundamental_hz: float | None = None,
    channels: tuple[int, ...] | None = None,
) -> tuple[Reading, ...]:
    """Read each chosen channel of a capture by itself (channels count from 1; None: all).

    The longest steady part of the tone is read, its first 2²⁰ frames at most. The band is cut to half the rate.

    Raises:
        ValueError: a channel that the capture does not have.
    """
    chosen = channels or tuple(range(1, capture.channels + 1))
    for channel in chosen:
        if not 1 <= channel <= capture.channels:
            raise ValueError(f"there is no channel {channel}; the recording has {capture.channels}")
    if settings.high_hz > capture.rate_hz / 2.0:
        settings = attrs.evolve(settings, high_hz=capture.rate_hz / 2.0)
    return tuple(_RecordedChannel(capture, channel, settings, fundamental_hz).read() for channel in chosen)


@attrs.frozen(eq=False)
class _RecordedChannel:
    capture: Capture
    channel: int
    settings: ReadingSettings
    fundamental_hz: float | None

    @property
    def _rate_hz(self) -> float:
        return self.capture.rate_hz

    def read(self) -> Reading:
        if self.capture.frames < LEAST_FRAMES:
            return self._bare(
                self.capture.span, State.TOO_SHORT, note(Kind.TOO_FEW_CYCLES, cycles=0.0, need=LEAST_CYCLES)
            )
        samples = np.ascontiguousarray(self.capture.samples[:, self.channel - 1])
        tone = self._tone(samples)
        if isinstance(tone, Note):
            return self._silence(samples, tone)
        steady = find_steady(samples, self._rate_hz, tone.frequency_hz)
        frames = min(steady.frames, MOST_FRAMES)
        span = Span(self.capture.first_frame + steady.first_frame, frames, self._rate_hz)
        part = samples[steady.first_frame : steady.first_frame + frames]
        overload = judge_overload(self.capture.overloads, self.channel, span, tone.frequency_hz)
        if overload is not None:
            withheld = self._bare(span, State.OVERLOAD, overload)
            return attrs.evolve(withheld, peak_fs=float(np.max(np.abs(part))))
        cycles = frames * tone.frequency_hz / self._rate_hz
        if cycles < LEAST_CYCLES or frames < LEAST_FRAMES:
            return self._bare(span, State.TOO_SHORT, note(Kind.TOO_FEW_CYCLES, cycles=cycles, need=LEAST_CYCLES))
        return self._steady(part, span, tone, steady.notes)

    def _bare(self, span: Span, state: State, why: Note) -> Reading:
        return Reading(span=span, channel=self.channel, settings=self.settings, state=state, notes=(why,))

    def _tone(self, samples: Samples) -> _Tone | Note:
        """Return the tone to read, or why there is none."""
        least_hz = LEAST_CYCLES * self._rate_hz / samples.size
        spectrum = hann_spectrum(samples, self._rate_hz)
        top = self._rate_hz / 2.0 - 2.0 * spectrum.bin_hz
        if self.fundamental_hz is not None:
            return self._given(spectrum, line_near(spectrum, min(least_hz, top / 2), top), self.fundamental_hz)
        top = min(top, highest_tone_hz(self.settings.high_hz, self._rate_hz))
        strongest = line_near(spectrum, min(least_hz, top / 2), top)
        if strongest.over_noise < TONE_OVER_NOISE or strongest.amplitude == 0.0:
            return self._short_tone(samples) or note(Kind.NO_TONE)
        number = _mains_number(strongest.frequency_hz, spectrum.bin_hz)
        if number is not None and strongest.amplitude < _HUM_TONE:
            return note(Kind.ONLY_MAINS, frequency_hz=strongest.frequency_hz)
        return _Tone(strongest.frequency_hz)

    def _given(self, spectrum: Spectrum, strongest: Line, wanted_hz: float) -> _Tone | Note:
        reach = max(3.0 * spectrum.bin_hz, 1e-3 * wanted_hz)
        try:
            line = line_near(spectrum, wanted_hz - reach, wanted_hz + reach)
        except ValueError:
            return note(Kind.NO_TONE)
        skirt = abs(line.frequency_hz - wanted_hz) > reach  # of a stronger line outside
        if skirt or line.over_noise < TONE_OVER_NOISE or line.amplitude == 0.0:
            return note(Kind.NO_TONE)
        apart = abs(strongest.frequency_hz - line.frequency_hz) > reach
        if apart and strongest.amplitude > line.amplitude:
            louder = db(strongest.amplitude / line.amplitude)
            return _Tone(line.frequency_hz, (note(Kind.STRONGER_LINE, frequency_hz=strongest.frequency_hz, db=louder),))
        return _Tone(line.frequency_hz)

    def _short_tone(self, samples: Samples) -> _Tone | None:
        """Look again in quarters and sixteenths: a short tone in a long silence does not stand out of the whole."""
        for parts in (4, 16):
            length = samples.size // parts
            if length < LEAST_FRAMES:
                break
            pieces = samples[: parts * length].reshape(parts, length)
            loudest = pieces[int(np.argmax(np.sum(pieces**2, axis=1)))]
            spectrum = hann_spectrum(loudest, self._rate_hz)
            top = min(
                self._rate_hz / 2.0 - 2.0 * spectrum.bin_hz, highest_tone_hz(self.settings.high_hz, self._rate_hz)
            )
            line = line_near(spectrum, min(LEAST_CYCLES * self._rate_hz / length, top / 2), top)
            if line.over_noise >= TONE_OVER_NOISE and line.amplitude >= _HUM_TONE / 10.0:
                return _Tone(line.frequency_hz)
        return None

    def _steady(self, part: Samples, span: Span, tone: _Tone, notes: tuple[Note, ...]) -> Reading:
        ranged, wandered = movement(part, self._rate_hz, tone.frequency_hz)
        if ranged > _UNSTEADY_RELATIVE or wandered > _UNSTEADY_RAD:
            return self._unsteady(part, span, (*notes, _moves(ranged, span)))
        block = block_of(part[:, None])
        try:
            start = self._restarted(part, tone.frequency_hz)
            analysis = self._analysed(block, start)
        except (ValueError, np.linalg.LinAlgError):
            return self._unsteady(part, span, (*notes, note(Kind.BREAK, at_s=span.start_s)))
        span = attrs.evolve(span, frames=block.size)
        if ranged > _MOVES_RELATIVE:
            notes = (*notes, _moves(ranged, span))
        lines = lines_beside(analysis, 0, *self.settings.band_hz)
        reader = ChannelReader(analysis, 0, self.settings, tuple(line.frequency_hz for line in lines))
        if not reader.has_tone():
            return self._silence(part, note(Kind.NO_TONE))
        return reader.read(span, self.channel, (*tone.notes, *notes, *self._remarks(analysis, lines)))

    def _restarted(self, part: Samples, near_hz: float) -> float:
        """Return the frequency of the tone in the steady part alone, for the fit to start from."""
        spectrum = hann_spectrum(part, self._rate_hz)
        reach = max(2.0 * spectrum.bin_hz, 1e-3 * near_hz)
        return line_near(spectrum, max(near_hz - reach, spectrum.bin_hz), near_hz + reach).frequency_hz

    def _analysed(self, block: Matrix, start_hz: float) -> Block:
        analysis = analysed(block, self._fitted(block, start_hz, ramp=1))
        hum = self._hum(analysis.left, analysis)
        foreign = self._foreign(attrs.evolve(analysis, hum=(hum,)))
        lines = _sum(foreign, _waveform(hum))
        if lines is not None:
            analysis = self._without(block, lines, analysis)
        if self._bends(analysis):
            analysis = self._without(block, lines, analysis, ramp=3)
        if lines is None:
            return attrs.evolve(analysis, hum=(hum,))
        hum = self._hum(analysis.left if foreign is None else analysis.left - foreign, analysis)
        wave = _waveform(hum)
        return analysed(block, analysis.fit, left=analysis.left if wave is None else analysis.left - wave, hum=hum)

    def _without(self, block: Matrix, lines: Matrix | None, last: Block, ramp: int | None = None) -> Block:
        """Fit again without lines that lean on the harmonics beside them; they go back into what is left."""
        clean = block if lines is None else block - lines
        fit = self._fitted(clean, last.fit.frequency_hz, ramp or last.fit.model.ramp)
        return analysed(block, fit)

    def _foreign(self, analysis: Block) -> Matrix | None:
        """Return the waveform of strong lines that are no harmonic, in the band or above it; None if there are none."""
        first = float(abs(analysis.fit.coefficients[0, 0]))
        hum = _waveform(analysis.hum[0])
        rest, taken = analysis.left if hum is None else analysis.left - hum, None
        for line in lines_beside(analysis, 0, self.settings.low_hz, self._rate_hz / 2.0):
            if line.amplitude < _FOREIGN * first:
                continue
            fit = fit_block(rest, self._rate_hz, line.frequency_hz, Model((1,), 1, 1))
            wave = fit.waveform(trend=False)
            rest, taken = rest - wave, _sum(taken, wave)
        return taken

    def _bends(self, analysis: Block) -> bool:
        """Tell whether level or phase bend within the block: a cubic ramp takes a tenth of what a linear one left."""
        fit = analysis.fit
        alone = analysis.left + fit.waveform(trend=False, others=False)
        model = Model(fit.model.orders[:1], 3, fit.model.trend)
        cubic = analysed(alone, fit_block(alone, self._rate_hz, fit.frequency_hz, model))
        return _power_in_band(cubic, self.settings) < _RAMP_GAIN * _power_in_band(analysis, self.settings)

    def _fitted(self, block: Matrix, start_hz: float, ramp: int) -> SineFit:
        seconds = block.size / self._rate_hz
        whole = orders_to(start_hz, self._rate_hz / 2.0, self._rate_hz, seconds)
        count = orders_to(start_hz, self.settings.high_hz, self._rate_hz, seconds)
        orders = tuple(range(1, min(MOST_ORDERS, whole if whole <= _WHOLE_ORDERS else count) + 1))
        cycles = start_hz * seconds
        return fit_block(block, self._rate_hz, start_hz, Model(orders, ramp, 3 if cycles >= 5.0 else 1))

    def _hum(self, left: Matrix, analysis: Block) -> Hum | None:
        power = analysis.spectrum.power[0]
        tone = analysis.fit.frequency_hz if analysis.fit.model.orders else None
        return find_hum(left, power, self._rate_hz, tone, self.settings.band_hz)

    def _remarks(self, analysis: Block, lines: tuple[Line, ...]) -> tuple[Note, ...]:
        low, high = self.settings.band_hz
        fundamental_hz = analysis.fit.frequency_hz
        found = [carrier_note(analysis, 0), second_tone_note(analysis, 0, lines, (low, high))]
        if not low * (1.0 - 1e-6) <= fundamental_hz <= high * (1.0 + 1e-6):
            found.insert(0, note(Kind.FUNDAMENTAL_OUTSIDE_BAND, frequency_hz=fundamental_hz))
        return tuple(remark for remark in found if remark is not None)

    def _unsteady(self, part: Samples, span: Span, notes: tuple[Note, ...]) -> Reading:
        return Reading(
            span=span,
            channel=self.channel,
            settings=self.settings,
            state=State.UNSTEADY,
            notes=notes,
            peak_fs=float(np.max(np.abs(part))),
        )

    def _silence(self, samples: Samples, why: Note) -> Reading:
        part = samples[:MOST_FRAMES]
        block = block_of(part[:, None])
        span = Span(self.capture.first_frame, block.size, self._rate_hz)
        overload = judge_overload(self.capture.overloads, self.channel, span, None)
        if overload is not None:
            return attrs.evolve(self._bare(span, State.OVERLOAD, overload), peak_fs=float(np.max(np.abs(part))))
        analysis = analysed(block, fit_trend(block, self._rate_hz))
        hum = self._hum(analysis.left, analysis)
        if hum is not None and hum.waveform is not None:
            analysis = analysed(block, analysis.fit, left=analysis.left - hum.waveform, hum=hum)
        return ChannelReader(analysis, 0, self.settings).read_silence(span, self.channel, (why,))


def _power_in_band(analysis: Block, settings: ReadingSettings) -> float:
    spectrum = analysis.spectrum
    return float(spectrum.power[0, spectrum.bins(*settings.band_hz)].sum())


def _waveform(hum: Hum | None) -> Matrix | None:
    return hum.waveform if hum is not None and hum.numbers else None


def _sum(lines: Matrix | None, more: Matrix | None) -> Matrix | None:
    return lines if more is None else more if lines is None else lines + more


def _moves(relative: float, span: Span) -> Note:
    moved = relative * DB_PER_RELATIVE
    return note(Kind.LEVEL_MOVES, db=moved, db_per_s=moved / span.seconds)


def _mains_number(frequency_hz: float, bin_hz: float) -> int | None:
    """Return which low multiple of 50 or 60 Hz a line is, or None."""
    for nominal in NOMINAL_HZ:
        number = round(frequency_hz / nominal)
        if 1 <= number <= min(_HUM_NUMBERS, HIGHEST_LINE) and abs(frequency_hz - number * nominal) <= max(
            TOLERANCE * frequency_hz, bin_hz
        ):
            return number
    return None
