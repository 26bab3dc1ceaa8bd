"""The simulated table: what is plugged where, and what an interface adds to a loop by itself."""

from collections.abc import Iterator
from threading import Event

import numpy as np
import pytest

from wattproof.bench.simulated import Interface, SimulatedBench
from wattproof.bench.simulated.table import Mistake
from wattproof.core.errors import WrongUseError
from wattproof.core.signal import Samples, Sweep, Tone
from wattproof.signals.sweep import sweep_samples

RATE_HZ = 48_000.0
QUIET = Interface(output_noise_fs=0.0, input_noise_fs=0.0, attenuator_ratio=20.0, input_offset_fs=0.0)


@pytest.fixture
def bench() -> Iterator[SimulatedBench]:
    made = SimulatedBench(rate_hz=RATE_HZ, interface=QUIET)
    made.open()
    yield made
    made.close()


def rms(bench: SimulatedBench, tone: Tone) -> Samples:
    """Return the rms of each input, to a full-scale sine, while a tone sounds."""
    stands = bench.play(tone)
    captured = bench.capture(stands + 24_000, 24_000, Event()).samples
    return np.asarray(np.sqrt(2.0 * np.mean(captured**2, axis=0)), dtype=np.float64)


@pytest.mark.parametrize(("connection", "gain"), [("direct", 1.0), ("pad", 0.05)])
def test_a_loop_gives_back_what_is_played(bench: SimulatedBench, connection: str, gain: float) -> None:
    bench.connect(connection)
    # both full scales are 2 V rms; the coupling at 2 Hz costs 2e-6 at 997 Hz
    np.testing.assert_allclose(rms(bench, Tone(997.0, 0.5, (1, 2))), 0.5 * gain, rtol=1e-4, atol=0.0)


def test_the_meter_shows_the_tone_at_its_output(bench: SimulatedBench) -> None:
    bench.play(Tone(320.0, 0.25, (2,)))
    assert (bench.meter_vrms(1), bench.meter_vrms(2)) == (0.0, 0.5)
    bench.mute()
    assert bench.meter_vrms(2) == 0.0


def test_the_amplifier_can_be_plugged_back(bench: SimulatedBench) -> None:
    bench.connect("direct")
    rms(bench, Tone(997.0, 0.1, (1,)))
    bench.connect("amplifier")
    assert rms(bench, Tone(997.0, 0.1, (1,)))[0] != pytest.approx(0.1, rel=0.1, abs=0.0)
    with pytest.raises(WrongUseError, match="can be amplifier, direct, pad"):
        bench.connect("sideways")


def test_each_mistake_is_heard() -> None:
    for mistake, expected in (
        (Mistake(swapped=True), (0.0, 0.1)),
        (Mistake(unplugged=(1,)), (0.0, 0.0)),
        (Mistake(), (0.1, 0.0)),
    ):
        bench = SimulatedBench(rate_hz=RATE_HZ, interface=QUIET, mistake=mistake)
        bench.open()
        bench.connect("direct")
        np.testing.assert_allclose(rms(bench, Tone(997.0, 0.1, (1,))), expected, rtol=1e-4, atol=1e-6)
        bench.close()


def test_a_sweep_comes_back_after_the_latency_as_it_is_defined(bench: SimulatedBench) -> None:
    bench.connect("direct")
    sweep = Sweep(200.0, 0.5, (1,), end_hz=8_000.0, seconds=1.0)
    begins = bench.play(sweep)
    captured = bench.capture(begins, 60_000, Event()).samples[:, 0]
    played = sweep_samples(sweep, RATE_HZ)
    late = QUIET.latency_frames
    # 2e-3: two frames of the raised rate that the clipper would take, and the coupling's phase at 200 Hz, 0.01 rad
    np.testing.assert_allclose(captured[late : late + played.size], played, rtol=0.0, atol=1e-2)
    assert np.max(np.abs(captured[: late - 100])) < 1e-5
    assert np.max(np.abs(captured[late + played.size + 2_000 :])) < 5e-3  # the coupling's tail


def test_crosstalk_and_hum_of_the_interface_come_with_it() -> None:
    own = Interface(
        output_noise_fs=0.0, input_noise_fs=0.0, crosstalk=1e-2, input_hum=((2, 1e-3),), input_offset_fs=0.0
    )
    bench = SimulatedBench(rate_hz=RATE_HZ, interface=own)
    bench.open()
    bench.connect("direct")
    np.testing.assert_allclose(rms(bench, Tone(997.0, 0.0)), 1e-3, rtol=2e-2, atol=0.0)  # 1 % crosstalk of hum too
    assert rms(bench, Tone(997.0, 0.5, (1,)))[1] == pytest.approx(5e-3, rel=0.05, abs=0.0)
    bench.close()
