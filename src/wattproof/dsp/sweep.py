"""Response and delay of a linear path from a known excitation: the spectra's quotient, averaged over parts of octaves.

The quotient of the captured by the played spectrum is exact for a linear path, whatever the excitation, as long as all
of its answer lies in the capture; a window on the impulse response, which would blur the lowest octave, is not needed
for a path whose distortion is as small as an interface's own.
"""

import math

import attrs
import numpy as np
from numpy.typing import NDArray

from wattproof.core.signal import Samples

Phasors = NDArray[np.complex128]
POINTS_PER_OCTAVE = 12
ECHO_S = 0.003  # later than this no filter of a converter rings any more: common practice, no source
_WEAKEST = 1e-6  # of the strongest line's power: below, the excitation holds nothing to compare with
_DELAY_BAND_HZ = (300.0, 6_000.0)  # where the delay is taken: far from couplings and from the filters at the band's end


@attrs.frozen(eq=False)
class Path:
    """What lies between two sockets: a delay in frames (with fraction), and the gain without it, with its scatter."""

    delay_frames: float
    frequency_hz: Samples
    gain: Phasors
    u: Samples  # standard uncertainty of the gain's real or imaginary part
    echo: float = 0.0  # what comes again later than ECHO_S after the first arrival, as a share of that

    @property
    def inverted(self) -> bool:
        """Whether the path turns the sign: decided at the middle of the band that tells the delay."""
        return bool(self.gain[_middle(self.frequency_hz)].real < 0.0)


def points(low_hz: float, high_hz: float) -> Samples:
    """Return the frequencies of a response: both ends, and equal steps of about a twelfth of an octave between."""
    steps = max(1, round(POINTS_PER_OCTAVE * math.log2(high_hz / low_hz)))
    return np.asarray(np.geomspace(low_hz, high_hz, steps + 1), dtype=np.float64)


def path_of(captured: Samples, played: Samples, rate_hz: float, low_hz: float, high_hz: float) -> Path:
    """Return the path from `played` to `captured`, both shape (frames,), whose first frames are the same moment.

    Raises:
        ValueError: the capture is shorter than the excitation, or the band is not inside half the rate.
    """
    if captured.size < played.size or not 0.0 < low_hz < high_hz < rate_hz / 2.0:
        raise ValueError(
            f"{captured.size} frames of answer to {played.size}, {low_hz:g}-{high_hz:g} Hz at {rate_hz:g} Hz: "
            "capture all of the sweep, within half the rate"
        )
    size = 1 << (2 * captured.size - 1).bit_length()
    sent, came = np.fft.rfft(played, size), np.fft.rfft(captured, size)
    power = sent.real**2 + sent.imag**2
    known = power > _WEAKEST * float(power.max())
    quotient = np.where(known, came * np.conj(sent) / np.where(known, power, 1.0), 0.0)
    bin_hz = rate_hz / size
    impulse = np.abs(np.fft.irfft(quotient, size))
    whole = int(np.argmax(impulse[: captured.size]))
    later = impulse[whole + math.ceil(ECHO_S * rate_hz) : captured.size]
    echo = float(later.max() / impulse[whole]) if later.size and impulse[whole] else 0.0
    quotient *= np.exp(2j * np.pi * whole / size * np.arange(quotient.size))
    part = _rest_of_delay(quotient, bin_hz, rate_hz)
    quotient *= np.exp(2j * np.pi * part / size * np.arange(quotient.size))
    frequencies = points(low_hz, high_hz)
    gain, scatter = _averaged(quotient, power, frequencies / bin_hz)
    scatter *= math.sqrt(size / captured.size)  # the transform is longer than the capture: neighbouring bins are alike
    return Path(whole + part, frequencies, gain, scatter, echo)


def _rest_of_delay(quotient: Phasors, bin_hz: float, rate_hz: float) -> float:
    """Return what is left of the delay, in frames, from the phase's slope (least squares, weighted by the gain)."""
    low, high = _DELAY_BAND_HZ[0], min(_DELAY_BAND_HZ[1], 0.4 * rate_hz)
    bins = np.arange(math.ceil(low / bin_hz), math.floor(high / bin_hz))
    phase = np.unwrap(np.angle(quotient[bins]))
    slope = np.polyfit(bins * (2.0 * math.pi * bin_hz / rate_hz), phase, 1, w=np.abs(quotient[bins]) + 1e-30)[0]
    return float(-slope)


def _averaged(quotient: Phasors, weight: Samples, places: Samples) -> tuple[Phasors, Samples]:
    """Return the weighted mean of the bins within a 24th of an octave of each place, and the scatter of that mean."""
    reach = 2.0 ** (0.5 / POINTS_PER_OCTAVE)
    gain = np.empty(places.size, dtype=np.complex128)
    scatter = np.zeros(places.size)
    for index, place in enumerate(places.tolist()):
        first, last = math.ceil(place / reach), math.floor(place * reach)
        if last - first < 3:
            below = math.floor(place)
            share = place - below
            gain[index] = (1.0 - share) * quotient[below] + share * quotient[below + 1]
            continue
        bins = slice(first, min(last, quotient.size - 1) + 1)
        log_place = np.log(np.arange(bins.start, bins.stop) / place)
        w = weight[bins] / weight[bins].sum()
        # a straight line through the bins, read at the place itself: a slope must not shift the mean
        centre = float(w @ log_place)
        spread = float(w @ (log_place - centre) ** 2)
        mean = complex(w @ quotient[bins])
        slope = complex((w * (log_place - centre)) @ quotient[bins]) / spread
        gain[index] = mean - slope * centre
        left = quotient[bins] - mean - slope * (log_place - centre)
        scatter[index] = math.sqrt(
            float(w @ (left.real**2 + left.imag**2)) / 2.0 / (w.size - 2) * w.size * float(w @ w)
        )
    return gain, scatter


def _middle(frequency_hz: Samples) -> int:
    return int(np.argmin(np.abs(np.log(frequency_hz / math.sqrt(_DELAY_BAND_HZ[0] * _DELAY_BAND_HZ[1])))))
