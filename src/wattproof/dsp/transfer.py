"""The complex gain from a tone that was played to every captured channel, fitted at the tone's own frequency."""

import cmath
import math

import attrs
import numpy as np
from numpy.typing import NDArray

from wattproof.core.signal import Capture, Samples, Tone
from wattproof.dsp.band import line_noise, noise_spectrum
from wattproof.dsp.fit import EXACT_PHASE_RAD, block_of, fit_block
from wattproof.dsp.model import Matrix, Model

FEW_CYCLES = 2.5  # below them a cubic trend, which takes the settling of couplings, would take from the tone
MOST_ORDERS = 8  # harmonics that are fitted beside it, so that none of them leaks into it
SAME_CLOCK = 2e-6  # relative: further apart output and input do not share a clock, and the phase has no meaning
CLOCK_CYCLES = 50.0  # fewer tell nothing of the clocks: what a coupling still settles bends the frequency


@attrs.frozen(eq=False)
class Transfer:
    """Gain of each channel: full scales captured per full scale played, its phase that of a delay e^(−jωt).

    `gain` and `u` have shape (channels,); `u` is the standard uncertainty of the real or the imaginary part, from the
    noise beside the line. `one_clock` tells whether the phase has a meaning.
    """

    frequency_hz: float
    gain: NDArray[np.complex128]
    u: Samples
    one_clock: bool


def transfer(capture: Capture, tone: Tone, origin_frame: int, *, follow: bool = True) -> Transfer:
    """Return the gain from a tone to a capture; the tone is sin(2πf·(n − origin_frame)/rate) at the absolute frame n.

    Without `follow` the frequency is taken as it was played, for channels that may hold no tone at all.

    Raises:
        ValueError: the block is too short for a fit.
    """
    block = block_of(capture.samples)
    rate_hz = capture.rate_hz
    frames = block.shape[1] * block.shape[2]
    orders = max(1, min(MOST_ORDERS, int(0.45 * rate_hz / tone.frequency_hz)))
    trend = 3 if tone.frequency_hz * frames / rate_hz >= FEW_CYCLES else 1
    limit = EXACT_PHASE_RAD if follow else math.inf
    fit = fit_block(
        block, rate_hz, tone.frequency_hz, Model(tuple(range(1, orders + 1)), 1, trend), phase_limit_rad=limit
    )
    left: Matrix = block - fit.waveform()
    noise = noise_spectrum(left, rate_hz)
    u = np.sqrt(line_noise(noise.power, np.array([fit.frequency_hz / noise.bin_hz]))[:, 0])
    centre = capture.first_frame - origin_frame + (frames - 1) / 2.0
    cycles = math.fmod(centre * tone.frequency_hz / rate_hz, 1.0)
    played = -1j * tone.level_fs * cmath.exp(2j * math.pi * cycles)
    apart = abs(fit.frequency_hz / tone.frequency_hz - 1.0)
    long_enough = tone.frequency_hz * frames / rate_hz >= CLOCK_CYCLES
    return Transfer(
        tone.frequency_hz, fit.coefficients[:, 0] / played, u / tone.level_fs, apart <= SAME_CLOCK or not long_enough
    )
