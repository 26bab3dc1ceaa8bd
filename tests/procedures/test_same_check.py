"""The five-second check on the simulated bench: a knob that was turned is refused, one that was not is told so."""

from collections.abc import Callable
from threading import Event

import attrs
import pytest

from wattproof.bench.simulated import Interface, SimulatedBench
from wattproof.core.calibration import Calibration
from wattproof.core.errors import WrongUseError
from wattproof.core.loopback import Loop, Response
from wattproof.core.quantity import measured
from wattproof.core.rig import Attenuator, Rig, Wiring
from wattproof.dsp.uncertainty import known
from wattproof.procedures.calibrate import Answer, Doing
from wattproof.procedures.level_calibration import Meter
from wattproof.procedures.requests import Acquire, Ask, Play
from wattproof.procedures.same_check import SameCheck, SamePlan
from wattproof.procedures.still_the_same import Against, Verdict
from wattproof.runner.acquire import Blocks

RATE_HZ = 48_000.0
METER = Meter(name="blue", percent=0.5, digits=2, step_v=1e-4)
RIG = Rig("loop", (Wiring("left", 1, 1, attenuator=Attenuator(ratio=1.0)),))
GAIN = Loop(
    output=1,
    input=1,
    latency_frames=0.0,
    inverted=False,
    gain=measured(1.0, 1e-6, "1"),
    frequency_hz=997.0,
    response=Response(),
)


def calibrated(bench: SimulatedBench) -> Calibration:
    scale = attrs.evolve(bench.calibration.inputs[0], full_scale_vrms=known(2.0, "V", "level calibration blue", 0.006))
    return Calibration(inputs=(scale,), loops=(GAIN,))


def drive(turned: float, part: Callable[[SameCheck], Doing[Verdict]], slip: float = 1.0) -> Verdict:
    """Run the check on a direct loop whose input gain was turned by a ratio since the calibration."""
    bench = SimulatedBench(rate_hz=RATE_HZ, interface=Interface(input_full_scale_vrms=2.0 / turned))
    bench.open()
    bench.connect("direct")
    blocks = Blocks(bench, Event(), lambda note: pytest.fail(f"refused: {note}"))
    steps = part(SameCheck(SamePlan(seconds=1.0), RIG, RIG.wirings[0], calibrated(bench), RATE_HZ))
    answer: Answer = None
    while True:
        try:
            item = steps.send(answer)
        except StopIteration as end:
            verdict: Verdict = end.value
            return verdict
        answer = None
        if isinstance(item, Play):
            answer = bench.play(item.tone)
            blocks.tone_stands(answer)
        elif isinstance(item, Acquire):
            answer = blocks.acquire(item)
        elif isinstance(item, Ask):
            answer = round(bench.meter_vrms(1), 4) * slip


def test_a_gain_that_is_still_the_same_passes() -> None:
    verdict = drive(1.0, lambda check: check.by_meter(METER))
    assert verdict.same
    assert verdict.against is Against.VOLTAGE


def test_a_gain_that_was_turned_is_refused() -> None:
    with pytest.raises(WrongUseError, match=r"input 1 has moved by -0\.8. dB.*calibrate anew"):
        drive(1.1, lambda check: check.by_meter(METER))


def test_a_loop_sees_the_product_and_says_so() -> None:
    assert drive(1.0, lambda check: check.by_loop()).against is Against.LOOP
    with pytest.raises(WrongUseError, match="output times input gain"):
        drive(1.01, lambda check: check.by_loop())


def test_a_meter_reading_in_millivolts_is_said_to_be_one() -> None:
    with pytest.raises(WrongUseError, match="it looks like mV"):
        drive(1.0, lambda check: check.by_meter(METER), slip=1e3)
