"""From an analysed block to a reading: levels, ratios, harmonics, and the uncertainty that the noise gives each.

Squares are of peak amplitudes ("amp²"), so that a full-scale sine is 1 and a mean square counts twice. A residual R has
u(R²) that adds two kinds: a harmonic's square carries a cross term with the noise on its line, 4·A²·n + 2·(2n)²/2 each,
and the noise carries the scatter of its own power, 2/ν of its square for ν degrees of freedom.
"""

import math
from typing import Any

import attrs
import numpy as np

from wattproof.core.notes import Note
from wattproof.core.quantity import Quantity, measured
from wattproof.core.reading import (
    Harmonic,
    Mains,
    MainsLine,
    Reading,
    ReadingSettings,
    Reference,
    Remark,
    State,
)
from wattproof.core.signal import Samples, Span
from wattproof.core.units import DB_PER_RELATIVE, power_w
from wattproof.dsp.band import BandNoise, band_noise
from wattproof.dsp.block import EDGE, Block
from wattproof.dsp.mains import contains_mains
from wattproof.dsp.prepared import Phasors

TONE_OVER_NOISE = 10.0**1.5  # 15 dB above the noise in its own bandwidth makes a line a tone
_ROUNDING = 3e-13  # −250 dB of the fundamental: below, a harmonic is the rounding of numbers
_SEEN = math.sqrt(
    2.0 * 9.0
)  # in u, of one quadrature: 3·√(noise on one line), which noise alone exceeds by chance e^−9


@attrs.frozen(eq=False)
class _Parts:
    """Squares of one channel (amp²) and the standard uncertainties of these squares."""

    fundamental: float
    u_fundamental: float
    harmonics: float
    u_harmonics: float
    hum: float
    u_hum: float
    noise: float
    u_noise: float

    @property
    def residual(self) -> float:
        return self.harmonics + self.hum + self.noise

    @property
    def u_residual(self) -> float:
        return math.hypot(self.u_harmonics, self.u_hum, self.u_noise)


def _root(square: float, u_square: float, unit: str = "1") -> Quantity:
    """Return the root of a square; near zero, where no slope exists, u is the root of the square's own."""
    value = math.sqrt(max(square, 0.0))
    limit = math.sqrt(u_square)
    return measured(value, min(u_square / (2.0 * value), limit) if value else limit, unit)


@attrs.frozen(eq=False)
class ChannelReader:
    """Reads one channel of a block. Everything that a reading says of distortion is made here."""

    block: Block
    channel: int  # index into the block's arrays
    settings: ReadingSettings
    lines_hz: tuple[float, ...] = ()  # steady lines in the noise, as `remarks.lines_beside` finds them

    def _noise(self, orders_inside: int) -> BandNoise:
        low, high = self.settings.band_hz
        fitted = 2.0 * orders_inside + 2.0 * self.block.fit.model.ramp + 1.0
        high = min(high, self.block.rate_hz / 2.0)
        return band_noise(self.block.spectrum, self.channel, low, high, fitted=fitted, lines_hz=self.lines_hz)

    def _hum(self) -> tuple[float, float]:
        hum = self.block.hum[self.channel]
        if hum is None:
            return 0.0, 0.0
        square = sum(2.0 * (seen - noise) for seen, noise in zip(hum.mean_squares, hum.line_noise, strict=True))
        u = math.sqrt(sum(8.0 * s * n for s, n in zip(hum.mean_squares, hum.line_noise, strict=True)))
        return square, u

    def has_tone(self) -> bool:
        """Tell whether the fitted line stands 15 dB above the noise in its own bandwidth."""
        square = abs(self.block.amplitudes[self.channel, 0]) ** 2
        return bool(square > 0.0 and square / 2.0 >= TONE_OVER_NOISE * self.block.noise[self.channel, 0])

    def read(self, span: Span, channel: int, notes: tuple[Note, ...] = (), state: State = State.OK) -> Reading:
        """Return the reading of a block that holds a tone."""
        fit, line_noise = self.block.fit, self.block.noise[self.channel]
        amplitudes = self.block.amplitudes[self.channel]
        inside = self._orders_inside()
        squares = amplitudes.real**2 + amplitudes.imag**2
        counted = slice(max(1, inside.start), inside.stop)
        noise = self._noise(max(0, inside.stop - inside.start))
        heights, lines = squares[counted], line_noise[counted]
        hum, u_hum = self._hum()
        parts = _Parts(
            fundamental=float(squares[0]),
            u_fundamental=2.0 * math.sqrt(float(squares[0] * line_noise[0])),
            harmonics=max(0.0, float(np.add.reduce(heights) - 2.0 * np.add.reduce(lines))),
            u_harmonics=2.0 * math.sqrt(float(heights @ lines + lines @ lines)),
            hum=hum,
            u_hum=u_hum,
            noise=2.0 * noise.mean_square,
            u_noise=2.0 * noise.u,
        )
        fundamental_inside = inside.start == 0 < inside.stop
        return Reading(
            span=span,
            channel=channel,
            settings=self.settings,
            state=state,
            notes=notes,
            fundamental_hz=self._frequency(float(squares[0]), float(line_noise[0])),
            fundamental_fs=_root(parts.fundamental, parts.u_fundamental),
            harmonics=self._harmonics(amplitudes, line_noise, counted),
            mains=self._mains(parts.fundamental),
            moving_db_per_s=fit.relative_slope(self.channel) * DB_PER_RELATIVE,
            **self._levels(span, parts, inside_fundamental=fundamental_inside),
            **self._ratios(parts, inside_fundamental=fundamental_inside, any_harmonic=heights.size > 0),
        )

    def _orders_inside(self) -> slice:
        """Return which of the orders 1, 2, 3… lie in the band, both edges included, as a slice of the block's lines."""
        low, high = self.settings.band_hz
        frequency_hz = self.block.fit.frequency_hz
        first = max(1, math.ceil(low * (1.0 - EDGE) / frequency_hz))
        last = min(self.block.orders.size, math.floor(high * (1.0 + EDGE) / frequency_hz))
        return slice(first - 1, max(first - 1, last))

    def _frequency(self, square: float, line_noise: float) -> Quantity:
        fit = self.block.fit
        variance = float(fit.prepared.unit_variance[1]) * fit.frames / 2.0 if fit.model.ramp else 0.0
        phase = math.sqrt(line_noise * variance / square)
        return measured(fit.frequency_hz, phase / (math.pi * fit.seconds), "Hz")

    def _ratios(self, parts: _Parts, *, inside_fundamental: bool, any_harmonic: bool) -> dict[str, Any]:
        fundamental = parts.fundamental if inside_fundamental else 0.0
        to_total = self.settings.reference == Reference.TOTAL
        reference = fundamental + parts.residual if to_total else parts.fundamental
        if reference <= 0.0:
            return {}
        # with the total as reference the residual stands in both: d(r/(1+r)) = dr/(1+r)²
        shrink = (fundamental / reference) if to_total else 1.0

        def ratio(square: float, u_square: float) -> Quantity:
            return _root(square / reference, u_square * shrink / reference)

        return {
            "thdn": ratio(parts.residual, parts.u_residual),
            "thd": ratio(parts.harmonics, parts.u_harmonics) if any_harmonic else None,
            "hum": ratio(parts.hum, parts.u_hum),
            "noise": ratio(parts.noise, parts.u_noise),
        }

    def _levels(self, span: Span, parts: _Parts, *, inside_fundamental: bool) -> dict[str, Any]:
        flat = self.block.samples[self.channel].ravel()
        mean, highest, lowest = float(flat.sum()) / flat.size, float(flat.max()), float(flat.min())
        about = float(flat @ flat) / flat.size - mean * mean
        square = parts.residual + (parts.fundamental if inside_fundamental else 0.0)
        u_square = math.hypot(parts.u_residual, parts.u_fundamental if inside_fundamental else 0.0)
        level = _root(square, u_square)
        rms = math.sqrt(max(about, 0.0))
        excursion = max(highest - mean, mean - lowest)
        crest = measured(excursion / rms, math.sqrt(parts.noise / 2.0) / rms, "1") if rms else None
        dc_u = math.sqrt(max(parts.noise, 0.0) / 2.0 / max(1.0, 2.0 * span.seconds * self.settings.high_hz))
        full_scale, load = self.settings.full_scale_vrms, self.settings.load_ohm
        volts = level.scaled(full_scale, "V") if full_scale else None
        return {
            "level_fs": level,
            "level_vrms": volts,
            "power_w": _power(volts, load) if volts and load else None,
            "dc_fs": measured(float(self.block.fit.dc[self.channel]), dc_u, "1"),
            "peak_fs": max(highest, -lowest),
            "crest_factor": crest,
        }

    def _harmonics(self, amplitudes: Phasors, line_noise: Samples, counted: slice) -> tuple[Harmonic, ...]:
        fit, hum = self.block.fit, self.block.hum[self.channel]
        first = float(abs(amplitudes[0]))
        if first == 0.0:
            return ()
        mains_hz = hum.frequency_hz if hum else None
        turn = float(np.angle(amplitudes[0])) + math.pi / 2.0
        chosen = amplitudes[counted]
        angles = np.arctan2(chosen.imag, chosen.real)
        heights = np.abs(chosen) / first
        spreads = np.sqrt(line_noise[counted]) / first
        phases = np.remainder(angles + (1.5 * math.pi - self.block.orders[counted] * turn), 2.0 * math.pi) - math.pi
        rows = zip(fit.model.orders[counted], heights.tolist(), spreads.tolist(), phases.tolist(), strict=True)
        found = []
        for order, height, u, phase in rows:
            is_seen = height >= _SEEN * u and height >= _ROUNDING
            frequency_hz = order * fit.frequency_hz
            remark = None if is_seen else Remark.NOT_SEEN
            if is_seen and contains_mains(frequency_hz, mains_hz, fit.seconds):
                remark = Remark.MAY_CONTAIN_MAINS
            found.append(Harmonic(order, frequency_hz, measured(height, u, "1"), phase, remark))
        return tuple(found)

    def _mains(self, reference_square: float) -> Mains:
        hum = self.block.hum[self.channel]
        if hum is None or reference_square <= 0.0:
            return Mains(hum.frequency_hz if hum else None)
        lines = []
        for number, seen, noise in zip(hum.numbers, hum.mean_squares, hum.line_noise, strict=True):
            height = math.sqrt(2.0 * seen / reference_square)
            ratio = measured(height, math.sqrt(noise / reference_square), "1")
            lines.append(MainsLine(number * hum.frequency_hz, ratio))
        return Mains(hum.frequency_hz, tuple(lines))

    def read_withheld(self, span: Span, channel: int, state: State, notes: tuple[Note, ...]) -> Reading:
        """Return what stays honest where the samples cannot be read: their peak."""
        flat = self.block.samples[self.channel]
        return Reading(
            span=span,
            channel=channel,
            settings=self.settings,
            state=state,
            notes=notes,
            peak_fs=float(max(flat.max(), -flat.min())),
        )

    def read_silence(self, span: Span, channel: int, notes: tuple[Note, ...]) -> Reading:
        """Return the reading of a block without a tone, whose fit was of the trend alone: ratios are to the total."""
        noise = self._noise(0)
        hum, u_hum = self._hum()
        square = 2.0 * noise.mean_square
        parts = _Parts(0.0, 0.0, 0.0, 0.0, hum, u_hum, square, 2.0 * noise.u)
        total = parts.residual
        shares: dict[str, Any] = {}
        if total > 0.0:
            # both shares of one total: d(n/(n+h)) = (h·dn − n·dh)/(n+h)², and the other way round
            u_share = math.hypot(hum * parts.u_noise, square * u_hum) / total**2
            shares = {"noise": _root(square / total, u_share), "hum": _root(hum / total, u_share)}
        return Reading(
            span=span,
            channel=channel,
            settings=self.settings,
            state=State.NO_TONE,
            notes=notes,
            mains=self._mains(total),
            **self._levels(span, parts, inside_fundamental=False),
            **shares,
        )


def _power(volts: Quantity, load_ohm: float) -> Quantity:
    slope = 2.0 * volts.value / load_ohm
    return measured(power_w(volts.value, load_ohm), slope * volts.u, "W", volts.dof)
