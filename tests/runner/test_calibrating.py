"""A calibration run on a bench: the simulated table plugs itself, a person is asked elsewhere."""

from collections.abc import Iterator

import pytest

from wattproof.bench.simulated import SimulatedBench
from wattproof.bench.simulated.table import Mistake
from wattproof.core.errors import StoppedError, WrongUseError
from wattproof.core.rig import Rig, Wiring
from wattproof.procedures.calibrate import CalibratePlan
from wattproof.procedures.level_calibration import Meter
from wattproof.procedures.requests import Action, Ask
from wattproof.runner.calibrating import make_calibration, plug_words
from wattproof.runner.screen import Ended, Event, ToneChanged

RATE_HZ = 48_000.0
QUICK = CalibratePlan(sweep_s=1.0, block_s=0.25, most_blocks=1)


@pytest.fixture
def simulated() -> Iterator[SimulatedBench]:
    bench = SimulatedBench(rate_hz=RATE_HZ)
    bench.open()
    yield bench
    bench.close()


def nobody(ask: Ask) -> str:
    raise AssertionError(f"a person was asked: {ask}")


def test_the_simulated_table_needs_nobody(simulated: SimulatedBench) -> None:
    events: list[Event] = []
    record = make_calibration(simulated, QUICK, Meter(percent=0.5)).run(events.append, nobody)
    assert record.device == "simulated:class-d-bridge"
    assert [scale.origin for scale in record.inputs] == ["measured", "measured"]
    assert isinstance(events[-1], Ended)
    tones = [event for event in events if isinstance(event, ToneChanged)]
    assert not tones[-1].on


def test_a_drive_above_the_limit_is_not_asked_for(simulated: SimulatedBench) -> None:
    loud = CalibratePlan(highest_fs=1.0, sweep_s=1.0, block_s=0.25, most_blocks=1, pad=False)
    run = make_calibration(simulated, loud, None)
    events: list[Event] = []
    run.run(events.append, nobody)
    # the simulated rig's limit is half of full scale; a person raises it, the program never
    assert max(event.level_fs for event in events if isinstance(event, ToneChanged)) == pytest.approx(
        0.5, rel=1e-9, abs=0.0
    )
    raised = make_calibration(simulated, loud, None, raise_limit=True)
    assert raised.runner.limit.ceiling_fs((1, 2)) == 1.0


def test_a_cable_that_is_missing_ends_it_with_a_sentence() -> None:
    bench = SimulatedBench(rate_hz=RATE_HZ, mistake=Mistake(unplugged=(1,)))
    bench.open()
    try:
        with pytest.raises(WrongUseError, match="no signal from output 1 at any input: a cable is missing"):
            make_calibration(bench, QUICK, None).run(lambda _: None, nobody)
    finally:
        bench.close()


def test_a_person_who_goes_away_stops_it(simulated: SimulatedBench) -> None:
    run = make_calibration(simulated, QUICK, None)

    def stop(event: Event) -> None:
        if isinstance(event, ToneChanged):
            run.runner.stop()

    with pytest.raises(StoppedError):
        run.run(stop, nobody)


def test_two_channels_on_one_output_are_refused(simulated: SimulatedBench) -> None:
    rig = Rig("odd", (Wiring("left", 1, 1), Wiring("right", 1, 2)))
    with pytest.raises(WrongUseError, match="share one output"):
        make_calibration(simulated, QUICK, None, rig)


def test_what_to_plug_is_said_in_plain_words() -> None:
    assert "1 > 1, 2 > 2" in plug_words(Ask(Action.CONNECT, "direct", "1 > 1, 2 > 2"))
    assert "20 to 30 dB" in plug_words(Ask(Action.CONNECT, "pad", "1 > 1"))
    assert plug_words(Ask(Action.CONFIRM, "meter", "output 2; 320 Hz")).startswith("Read the AC voltage at output 2")
