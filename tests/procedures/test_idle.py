"""Noise and hum at rest: the simulated amplifiers' noise and mains lines are read as they were made."""

import math

import numpy as np
import pytest

from tests.procedures.sitting import done, ran
from wattproof.bench.simulated import Interface, SimulatedBench
from wattproof.bench.simulated.characters import CLASS_D_BRIDGE
from wattproof.core.notes import Kind
from wattproof.core.quantity import Quantity
from wattproof.core.rounding import expanded
from wattproof.procedures.idle import IdleChannel, IdlePlan, idle
from wattproof.procedures.requests import Action, Ask
from wattproof.runner.around import Found

WIDTH = math.sqrt(19_980.0 / 20_000.0)  # noise is stated in 20 kHz
HUM_VRMS = math.hypot(*(vrms for _, vrms in CLASS_D_BRIDGE.hum))


def holds(reading: Quantity, truth: float) -> None:
    """Three times u: one in 400 is missed, and the seed is fixed."""
    assert abs(reading.value - truth) <= 1.5 * expanded(reading)


def test_noise_and_hum_are_those_of_the_amplifier_alone() -> None:
    left = done("idle").channels[0]
    noise_vrms = CLASS_D_BRIDGE.noise_vrms * WIDTH
    holds(left.noise_vrms, noise_vrms)
    holds(left.unweighted_vrms, math.hypot(noise_vrms, HUM_VRMS))
    holds(left.hum_vrms, HUM_VRMS)


def test_a_weighted_noise_is_white_noise_and_hum_under_the_curve() -> None:
    left = done("idle").channels[0]
    # white noise in 20 Hz to 20 kHz is 2.048 dB lower under A (closed form); A at 100, 200 Hz: IEC 61672-1, table 3
    white = CLASS_D_BRIDGE.noise_vrms * WIDTH * 10.0 ** (-2.048 / 20.0)
    lines = (40e-6 * 10.0 ** (-19.1 / 20.0), 15e-6 * 10.0 ** (-10.9 / 20.0))
    holds(left.a_weighted_vrms, math.hypot(white, *lines))


def test_the_quasi_peak_reading_stands_above_the_weighted_rms_of_white_noise() -> None:
    left = done("idle").channels[0]
    # white noise in 20 kHz is 7.301 dB higher behind the network, rms (closed form); the meter shows 4.4 dB more of it
    rms = CLASS_D_BRIDGE.noise_vrms * WIDTH * 10.0 ** (7.301 / 20.0)
    assert 1.5 < left.quasi_peak_v.value / rms < 1.8
    assert left.quasi_peak_highest_v > left.quasi_peak_v.value


def test_the_mains_frequency_is_found_and_its_lines_are_listed() -> None:
    left = done("idle").channels[0]
    assert left.mains_hz == pytest.approx(50.0, rel=0.0, abs=0.01)
    seen = {round(line.frequency_hz): line.level_vrms.value for line in left.lines}
    assert seen[100] == pytest.approx(40e-6, rel=0.03, abs=0.0)
    assert seen[200] == pytest.approx(15e-6, rel=0.08, abs=0.0)


def test_the_density_is_that_of_white_noise_between_the_lines() -> None:
    left = done("idle").channels[0]
    white = CLASS_D_BRIDGE.noise_vrms / math.sqrt(20_000.0)
    inside = [density.value for hz, density in left.density if 1_000.0 < hz < 20_000.0]
    assert float(np.median(inside)) == pytest.approx(white, rel=0.02, abs=0.0)


def test_sixty_hertz_are_found_as_well_and_a_meters_offset_is_taken() -> None:
    found = ran(IdlePlan(seconds=2.0, dc_v="0.006,-0.011"), bench=SimulatedBench(mains_hz=60.0))
    left, right = found.result.channels
    assert left.mains_hz == pytest.approx(60.0, rel=0.0, abs=0.02)
    assert (left.dc_v.value, left.dc_origin, right.dc_v.value) == (0.006, "typed", -0.011)


def test_an_amplifier_quieter_than_the_interface_gets_a_limit() -> None:
    noisy = Interface(input_noise_fs=2e-4)  # 4 mV at the terminals, where the amplifier makes 0.11 mV
    left = ran(IdlePlan(seconds=2.0), bench=SimulatedBench(interface=noisy)).result.channels[0]
    assert left.noise_vrms.limited_by == "interface"
    assert left.noise_vrms.value > CLASS_D_BRIDGE.noise_vrms


class _Unplugging(SimulatedBench):
    """A person who says that the input is terminated and leaves the cable in."""

    def connect(self, name: str) -> None:
        del name


def kinds(found: Found, channel: int) -> set[Kind]:
    told: IdleChannel = found.result.channels[channel - 1]
    return {note.kind for note in told.notes}


def test_an_input_that_is_still_on_the_interface_is_found_out() -> None:
    assert Kind.NOT_TERMINATED in kinds(ran(IdlePlan(seconds=2.0), bench=_Unplugging()), 1)
    assert {note.kind for note in done("idle").channels[0].notes} >= {Kind.TERMINATED_SEEN}


def test_the_person_is_asked_to_terminate_before_anything_sounds() -> None:
    bench = SimulatedBench()
    with pytest.raises(ValueError, match="one voltage for each of the channels"):
        IdlePlan(dc_v="0.1")
    assert bench.rig.wirings[0].input == 1
    asks: list[object] = []
    from wattproof.app import make_sitting  # noqa: PLC0415 - this test looks at the generator alone

    sitting = make_sitting(bench, IdlePlan())
    steps = idle(sitting.plan, sitting.place)  # type: ignore[arg-type]  # the plan that was just given
    request = next(steps)
    while isinstance(request, Ask) or len(asks) < 3:
        if isinstance(request, Ask):
            asks.append(request.action)
            request = steps.send("yes")
        else:
            request = steps.send(None)
    assert asks[:3] == [Action.CONFIRM, Action.TURN, Action.CONNECT]
