"""The word length that a device really delivers, judged on words whose length the test made."""

import math

import numpy as np
import pytest

from wattproof.core.signal import Samples
from wattproof.dsp.sample_format import best_possible_db, sample_format, unused_low_bits


def tone(bits: int | None, peak: float = 0.3) -> Samples:
    rng = np.random.default_rng(3)
    wave = peak * np.sin(np.arange(20_000) * 0.0653) + 1e-4 * rng.standard_normal(20_000)
    if bits is None:
        return np.asarray(wave, dtype=np.float32).astype(np.float64)
    return np.asarray(np.rint(wave * 2.0 ** (bits - 1)) / 2.0 ** (bits - 1))


@pytest.mark.parametrize("bits", [8, 12, 16, 20, 24])
def test_whole_codes_tell_their_length(bits: int) -> None:
    form = sample_format(tone(bits))
    assert (form.bits, form.idle_bits, form.name) == (bits, (), f"{bits} bit")
    assert unused_low_bits(form) == 24 - bits


def test_what_is_no_whole_code_is_float() -> None:
    form = sample_format(tone(None))
    assert (form.bits, form.name) == (None, "float")
    assert best_possible_db(form) is None
    assert unused_low_bits(form) == 0


def test_a_volume_control_after_the_converter_makes_float_of_it() -> None:
    assert sample_format((tone(16) * 0.7).astype(np.float32).astype(np.float64)).name == "float"


def test_silence_and_a_few_values_tell_nothing() -> None:
    assert sample_format(np.zeros(1_000)).name == "unknown"
    assert sample_format(np.tile([0.0, 0.25, -0.25], 400)).name == "unknown"


def test_noise_of_a_few_codes_still_tells_24_bits() -> None:
    codes = np.random.default_rng(1).normal(0.0, 20.0, 5_000)
    assert sample_format(np.rint(codes) / 2.0**23).bits == 24


def test_a_stuck_bit_is_pointed_out() -> None:
    codes = np.rint(tone(24) * 2.0**23).astype(np.int64)
    stuck = codes & ~(1 << 6)
    assert sample_format(stuck / 2.0**23).idle_bits == (24 - 6,)


def test_the_best_that_a_word_allows() -> None:
    # closed form: 20·lg(2^N·√1.5) = 6.02·N + 1.76 dB (IEEE Std 1241-2010, 4.5.1)
    best = best_possible_db(sample_format(tone(16)))
    assert best == pytest.approx(16 * 20 * math.log10(2.0) + 10 * math.log10(1.5), rel=1e-9, abs=0.0)
