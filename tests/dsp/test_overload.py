"""Overload is judged on raw samples: runs at full scale that no fair sine makes."""

import math

import numpy as np
import pytest

from tests.dsp.waveforms import sine
from wattproof.core.notes import Kind
from wattproof.core.signal import Overload, Samples, Span
from wattproof.dsp.overload import judge_overload, longest_fair_run

RATE_HZ = 48_000.0
SPAN = Span(1000, 48_000, RATE_HZ)


def _runs(samples: Samples, channel: int = 1, top: float = 1.0) -> tuple[Overload, ...]:
    """Return runs of samples at full scale, as a bench would flag them."""
    full = np.abs(samples) >= top
    edges = np.flatnonzero(np.diff(np.r_[False, full, False].astype(int)))
    return tuple(Overload(channel, int(a), int(b - a)) for a, b in zip(edges[::2], edges[1::2], strict=True))


@pytest.mark.parametrize("frequency_hz", [20.0, 100.0, 997.0, 15_000.0])
def test_a_full_scale_sine_in_16_bit_words_is_no_overload(frequency_hz: float) -> None:
    words = np.clip(np.rint(sine(48_000, RATE_HZ, frequency_hz) * 32_768.0), -32_768, 32_767)
    top = 32_767.0
    longest = max((run.frames for run in _runs(words, top=top)), default=0)
    # closed form: |sin| stays within δ of 1 for 2·acos(1 − δ)/ω
    assert longest <= longest_fair_run(frequency_hz, RATE_HZ)
    assert judge_overload(_runs(words, top=top), 1, Span(0, 48_000, RATE_HZ), frequency_hz) is None


@pytest.mark.parametrize("frequency_hz", [20.0, 997.0])
@pytest.mark.parametrize("over_db", [0.1, 1.0, 6.0])
def test_a_sine_driven_beyond_full_scale_is_an_overload(frequency_hz: float, over_db: float) -> None:
    clipped = np.clip(10.0 ** (over_db / 20.0) * sine(48_000, RATE_HZ, frequency_hz), -1.0, 1.0)
    found = judge_overload(_runs(clipped), 1, Span(0, 48_000, RATE_HZ), frequency_hz)
    assert found is not None
    assert found.kind is Kind.OVERLOADED
    said = dict(found.values)
    share = 2.0 / math.pi * math.acos(10.0 ** (-over_db / 20.0))  # closed form: of the time, |A·sin| > 1
    assert float(said["percent"]) == pytest.approx(100.0 * share, rel=0.1, abs=0)
    assert over_db <= float(said["add_db"]) <= over_db + 2.5  # enough attenuation, and not much more


def test_runs_outside_the_span_or_of_another_channel_do_not_count() -> None:
    elsewhere = (Overload(1, 0, 1000), Overload(1, 49_000, 500), Overload(2, 5000, 500))
    assert judge_overload(elsewhere, 1, SPAN, 997.0) is None
    assert judge_overload(elsewhere, 2, SPAN, 997.0) is not None
    assert judge_overload((Overload(1, 900, 150),), 1, SPAN, 997.0) is not None  # 50 frames of it lie inside


def test_without_a_tone_the_lowest_one_sets_the_run_that_is_allowed() -> None:
    fair = longest_fair_run(20.0, RATE_HZ)
    assert judge_overload((Overload(1, 2000, fair),), 1, SPAN, None) is None
    assert judge_overload((Overload(1, 2000, fair + 1),), 1, SPAN, None) is not None
