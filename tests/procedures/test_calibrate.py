"""A calibration on the simulated bench against the simulator's own figures, and every mistake at the table."""

from collections.abc import Callable
from threading import Event

import numpy as np
import pytest

from wattproof.bench.simulated import Interface, SimulatedBench
from wattproof.bench.simulated.table import Mistake
from wattproof.core.calibration import Calibration
from wattproof.core.connection import Connection
from wattproof.core.errors import WattproofError, WrongUseError
from wattproof.procedures.calibrate import METER, CalibratePlan, Calibrating, Step, joins_of
from wattproof.procedures.calibration_record import Header, conclude
from wattproof.procedures.level_calibration import Meter
from wattproof.procedures.requests import Acquire, Action, Ask, Play, Progress, Shown
from wattproof.runner.acquire import Blocks

RATE_HZ = 48_000.0
OWN = Interface(
    output_harmonics=(3e-5, 2e-5),
    input_harmonics=(-2e-5, -3e-5),
    output_noise_fs=4e-6,
    input_noise_fs=3e-6,
    crosstalk=2e-5,
    clock_offset_ppm=4.0,
    input_hum=((1, 3e-5), (3, 2e-5)),
    attenuator_ratio=20.0,
)
PLAN = CalibratePlan(sweep_s=1.0, block_s=0.5, most_blocks=2)
METERED = Meter(percent=0.5, digits=2, step_v=1e-4)


def drive(
    bench: SimulatedBench, plan: CalibratePlan = PLAN, meter: Meter | None = METERED
) -> tuple[Calibrating, list[Step]]:
    """Answer a calibration's requests from a bench, without threads."""
    calibrating = Calibrating(plan, joins_of(bench.rig), RATE_HZ, 0.5, meter)
    blocks = Blocks(bench, Event(), lambda note: pytest.fail(f"refused: {note}"))
    steps, sounding, told = calibrating.steps(), None, []
    item = next(steps)
    while True:
        answer: object = None
        match item:
            case Play(tone):
                answer, sounding = bench.play(tone), tone
                blocks.tone_stands(answer)
            case Acquire():
                answer = blocks.acquire(item)
            case Ask(action=Action.CONNECT, want=str(want)):
                bench.connect(want)
                answer = "done"
            case Ask(want=want) if want == METER:
                assert sounding is not None
                answer = bench.meter_vrms(sounding.outputs[0])
            case Progress():
                told.append(calibrating.findings.step)
            case Shown():
                pass
        try:
            item = steps.send(answer)  # type: ignore[arg-type]  # the answer that its request has by contract
        except StopIteration:
            return calibrating, told


def opened(mistake: Mistake | None = None, character: str = "class-d-bridge") -> SimulatedBench:
    bench = SimulatedBench(character, rate_hz=RATE_HZ, interface=OWN, mistake=mistake)
    bench.open()
    return bench


@pytest.fixture(scope="module")
def record() -> Calibration:
    calibrating, told = drive(opened())
    assert told == list(Step)
    return conclude(calibrating.findings, Header("simulated:x", "2026-01-01"), METERED)


def test_the_record_is_bound_to_device_rate_and_format(record: Calibration) -> None:
    assert (record.device, record.rate_hz, record.sample_format, record.date) == (
        "simulated:x",
        RATE_HZ,
        "24 bit",
        "2026-01-01",
    )
    assert [(loop.output, loop.input) for loop in record.loops] == [(1, 1), (2, 2)]


def test_the_converters_are_told_apart_as_they_are(record: Calibration) -> None:
    # the simulator's curve makes h2 and h3 at full scale; at a level they fall with it and with its square
    for floors, own in ((record.out_floors, OWN.output_harmonics), (record.in_floors, OWN.input_harmonics)):
        for floor in floors:
            for (order, ratio), truth in zip(floor.harmonics, own, strict=False):
                expected = abs(truth) * floor.level_fs ** (order - 1)
                assert abs(ratio.value - expected) <= 4.0 * ratio.u, (floor.socket, floor.level_fs, order)


def test_their_noise_is_told_apart_too(record: Calibration) -> None:
    for floor in record.out_floors:
        assert abs(floor.noise_fs.value - OWN.output_noise_fs) <= 4.0 * floor.noise_fs.u
    for floor in record.in_floors:
        assert abs(floor.noise_fs.value - OWN.input_noise_fs) <= 4.0 * floor.noise_fs.u


def test_delay_response_and_clock_are_those_of_the_simulator(record: Calibration) -> None:
    for loop in record.loops:
        assert loop.latency_frames == pytest.approx(OWN.latency_frames, rel=0.0, abs=0.1)
        assert not loop.inverted
        assert loop.clock_ppm is not None
        assert abs(loop.clock_ppm.value - OWN.clock_offset_ppm) <= max(4.0 * loop.clock_ppm.u, 1e-3)
        frequency_hz, gain = loop.response.frequency_hz, np.abs(loop.response.gain)
        coupling = 1.0 / np.hypot(1.0, OWN.coupling_hz / frequency_hz)  # a first-order high-pass (closed form)
        # 0.01 dB; the clock offset of 4 ppm turns the upper end of a sweep by 0.1 rad, its size by less
        np.testing.assert_allclose(gain / gain[50], coupling / coupling[50], rtol=2e-3, atol=0.0)


def test_gain_pad_crosstalk_and_hum_are_those_of_the_simulator(record: Calibration) -> None:
    for loop in record.loops:
        assert loop.gain.value == pytest.approx(1.0, rel=1e-4, abs=0.0)
        assert loop.pad is not None
        assert loop.pad.value == pytest.approx(1.0 / OWN.attenuator_ratio, rel=1e-4, abs=0.0)
        assert loop.crosstalk is not None
        assert loop.crosstalk.value == pytest.approx(OWN.crosstalk, rel=0.02, abs=0.0)
        lines = {round(line.frequency_hz): line.ratio.value for line in loop.mains.lines}
        assert lines[50] == pytest.approx(3e-5, rel=0.05, abs=0.0)
        assert lines[150] == pytest.approx(2e-5, rel=0.05, abs=0.0)
        for point in loop.linearity:  # a cubic curve bends the level too: 3·h3·level², 1.5e-5 at half of full scale
            assert abs(point.departure.value) < 4.0 * point.departure.u + 3e-5
        assert [spectrum.tone_fs for spectrum in loop.noise] == [0.0, 0.5]


def test_the_meter_gives_the_volts_with_its_doubt(record: Calibration) -> None:
    for scale in (*record.inputs, *record.outputs):
        quantity = scale.full_scale_vrms
        assert scale.origin == "measured"
        assert abs(quantity.value - 2.0) <= 2.0 * quantity.u
        assert quantity.u / quantity.value == pytest.approx((0.005 + 2e-4) / 3**0.5, rel=0.01, abs=0.0)


def test_without_a_meter_what_the_bench_declares_is_kept() -> None:
    bench = opened()
    calibrating, _ = drive(bench, CalibratePlan(sweep_s=1.0, block_s=0.25, most_blocks=1, pad=False), None)
    record = conclude(calibrating.findings, Header("x", "2026-01-01"), None, bench.calibration)
    assert record.inputs == bench.calibration.inputs
    assert (record.out_floors, record.in_floors) == ((), ())  # one loop alone tells no converter apart


@pytest.mark.parametrize(
    ("mistake", "words"),
    [
        (Mistake(swapped=True), "channels are swapped"),
        (Mistake(unplugged=(2,)), "no signal from output 2"),
        (Mistake(inverted=(1,)), "turns the polarity"),
        (Mistake(monitoring=0.3), "monitoring is on"),
        (Mistake(no_pad=True), "0.0 dB by the pad: it is not in the way"),
    ],
)
def test_a_mistake_at_the_table_ends_it_with_a_sentence(mistake: Mistake, words: str) -> None:
    with pytest.raises(WrongUseError, match=words):
        drive(opened(mistake), CalibratePlan(sweep_s=1.0, block_s=0.25, most_blocks=1), None)


def test_a_meter_reading_in_millivolts_is_refused_while_the_cables_are_in() -> None:
    bench = opened()
    shown: Callable[[int], float] = bench.meter_vrms
    bench.meter_vrms = lambda output: 1e3 * shown(output)  # type: ignore[method-assign]  # a slip of the person's
    with pytest.raises(WrongUseError, match="it looks like mV"):
        drive(bench, CalibratePlan(sweep_s=1.0, block_s=0.25, most_blocks=1))


def test_a_loop_that_overloads_is_refused_with_a_way_out() -> None:
    bench = SimulatedBench(rate_hz=RATE_HZ, interface=Interface(output_full_scale_vrms=40.0, input_full_scale_vrms=0.1))
    bench.open()
    with pytest.raises(WattproofError, match="overloaded by the loop; turn its gain down"):
        drive(bench, CalibratePlan(sweep_s=1.0, block_s=0.25, most_blocks=1), None)


def test_the_table_is_asked_to_be_plugged_back() -> None:
    asked = []
    bench = opened()
    plug = bench.connect

    def connect(name: str) -> None:
        asked.append(name)
        plug(name)

    bench.connect = connect  # type: ignore[method-assign]  # listens in
    drive(bench, CalibratePlan(sweep_s=1.0, block_s=0.25, most_blocks=1), None)
    assert asked == [Connection.DIRECT, Connection.PAD, Connection.AMPLIFIER]
