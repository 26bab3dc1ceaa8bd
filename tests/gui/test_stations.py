"""What the stations of the chain say, and what comes next."""

import re

import attrs
import pytest

from tests.gui.fake_runner import FakeRunner
from wattproof.bench.protocol import Control
from wattproof.core.quantity import Quantity
from wattproof.core.reading import Reading, State
from wattproof.core.rig import Limits, Load, Rig, Wiring
from wattproof.gui.hints import hint_for
from wattproof.gui.stations import Place, Station, Table, knob_of, setting, stations_of


def table(reading: Reading | None = None, rig: Rig | None = None) -> Table:
    runner = FakeRunner()
    return Table(runner.wishes, rig or runner.rig, runner.calibration, runner.bench.controls, reading)


def sound() -> Reading:
    return FakeRunner().read()[0]


def words(station: Station) -> str:
    return f"{station.figure} {station.below}"


def test_each_station_carries_its_live_figure() -> None:
    reading = sound()
    assert reading.level_vrms is not None
    shown = stations_of(table(reading))
    assert shown[Place.TONE].figure == "0.500 V"  # a quarter of the output's full scale of 2 V
    assert "limit 1 V" in shown[Place.TONE].below
    assert shown[Place.AMPLIFIER].figure.startswith(f"{reading.level_vrms.value:.3g}")
    assert "× " in shown[Place.AMPLIFIER].below
    assert "knob" in shown[Place.AMPLIFIER].below
    assert shown[Place.LOAD].figure == "8 Ω"
    assert "W of 50 W" in shown[Place.LOAD].below
    assert shown[Place.ATTENUATOR].figure == "÷ 13.3"
    assert "of full scale" in shown[Place.CAPTURE].figure


def test_an_overload_leaves_no_measured_figure_in_the_chain() -> None:
    reading = attrs.evolve(sound(), state=State.OVERLOAD)
    shown = stations_of(table(reading))
    assert shown[Place.CAPTURE].hatched
    assert shown[Place.CAPTURE].figure == "overloaded"
    assert not re.search(r"\d", words(shown[Place.CAPTURE]))
    assert not re.search(r"\d", words(shown[Place.AMPLIFIER]))
    assert "W" not in words(shown[Place.LOAD])


def test_a_load_above_its_rating_is_warned_of() -> None:
    rig = Rig("bench", (Wiring(load=Load(rated_w=5.0)),), Limits())
    reading = attrs.evolve(sound(), power_w=Quantity(9.0, "W"))
    load = stations_of(table(reading, rig))[Place.LOAD]
    assert load.warned
    assert "above its 5 W rating" in load.below


def test_the_knob_is_found_by_name_and_never_a_switch_or_the_load() -> None:
    supply = Control("supply", "Supply", "V", 8.0, 24.0, 15.0, "")
    knob = Control("knob", "Knob", "dB", -60.0, 0.0, -20.0, "")
    load = Control("load", "Load", "Ω", 4.0, 1e6, 1e6, "", (4.0, 8.0, 1e6))
    assert knob_of((load, supply, knob)) is knob
    assert knob_of((load, supply)) is supply
    assert knob_of((load,)) is None
    assert setting(load) == "open"
    assert setting(attrs.evolve(load, value=4.0)) == "4 Ω"
    assert setting(knob) == "−20.0 dB"


@pytest.mark.parametrize(("thdn", "said"), [(0.001, "1 % is next"), (0.05, "10 % is next"), (0.2, "turn back")])
def test_the_next_step_follows_the_reading(thdn: float, said: str) -> None:
    reading = attrs.evolve(sound(), thdn=Quantity(thdn, "1"))
    assert said in hint_for(reading, tone_on=True)


def test_the_next_step_never_urges_on_where_nothing_honest_is_read() -> None:
    for state in State:
        if state is not State.OK:
            assert "turning" not in hint_for(attrs.evolve(sound(), state=state), tone_on=True)
    assert hint_for(None, tone_on=True) == ""
    assert "Start the tone" in hint_for(None, tone_on=False)
