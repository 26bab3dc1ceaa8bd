"""From full scale to volts and watts: budgets with shared sources, limits, and what stays as it was."""

import math
from typing import Any

import attrs
import pytest

from wattproof.core.calibration import Calibration, Floor, Scale
from wattproof.core.quantity import Quantity, measured
from wattproof.core.reading import Harmonic, Reading, ReadingSettings, Reference, Remark, State
from wattproof.core.rig import Attenuator, Load, Rig, Wiring
from wattproof.core.signal import Span
from wattproof.dsp.sources import INTERFACE, NOISE, shapes_of, stated95
from wattproof.dsp.uncertainty import known
from wattproof.procedures.absolute import absolute

LOAD = Load(8.0, measured_ohm=8.0, accuracy=0.004)
WIRING = Wiring("left", 1, 1, LOAD, Attenuator(ratio=20.0, measured_accuracy=0.002))
RIG = Rig("table", (WIRING,))
FLOORS = (Floor(1, 0.5, measured(3e-6, 1e-8, "1"), ((2, measured(1e-6, 0.0, "1")), (3, measured(1e-6, 0.0, "1")))),)
CALIBRATION = Calibration(
    device="x",
    inputs=(Scale(1, known(2.0, "V", "level calibration meter", 0.005), "measured", "2026-01-01"),),
    out_floors=FLOORS,
    in_floors=FLOORS,
)


def harmonic(order: int, ratio: float, remark: Remark | None = None) -> Harmonic:
    return Harmonic(order, order * 997.0, measured(ratio, 1e-7, "1"), 0.0, remark)


def reading(second: float = 1e-3, third: float = 1e-4, noise: float = 1e-4, state: State = State.OK) -> Reading:
    thd = math.hypot(second, third)
    return Reading(
        span=Span(0, 48_000, 48_000.0),
        channel=1,
        settings=ReadingSettings(reference=Reference.FUNDAMENTAL),
        state=state,
        fundamental_hz=measured(997.0, 1e-5, "Hz"),
        fundamental_fs=measured(0.5, 1e-6, "1"),
        level_fs=measured(0.5, 1e-6, "1"),
        thd=measured(thd, 1e-7, "1"),
        noise=measured(noise, noise / 100.0, "1"),
        hum=measured(0.0, 0.0, "1"),
        thdn=measured(math.hypot(thd, noise), 1e-7, "1"),
        harmonics=(harmonic(2, second), harmonic(3, third), harmonic(4, 1e-7, Remark.NOT_SEEN)),
    )


def told(quantity: Quantity | None) -> Quantity:
    assert quantity is not None
    return quantity


def test_volts_and_watts_are_those_at_the_terminals_with_every_doubt() -> None:
    made = absolute(reading(), RIG, CALIBRATION, 0.5)
    volts, watts = told(made.level_vrms), told(made.power_w)
    assert volts.value == pytest.approx(0.5 * 2.0 * 20.0, rel=1e-12, abs=0.0)
    assert watts.value == pytest.approx(50.0, rel=1e-12, abs=0.0)
    # by hand: meter 0.25 %, ratio 0.2 %/√3, load 0.4 %/√3, statistics 2e-6
    relative = math.hypot(0.0025, 0.002 / math.sqrt(3.0), 2e-6)
    assert volts.u / volts.value == pytest.approx(relative, rel=1e-6, abs=0.0)
    assert watts.u / watts.value == pytest.approx(math.hypot(2 * relative, 0.004 / math.sqrt(3.0)), rel=1e-6, abs=0.0)
    assert {part.source for part in watts.parts} == {
        "statistics",
        "level calibration meter",
        "attenuator left measured",
        "load left measured",
    }
    assert set(shapes_of(watts)) == {part.source for part in watts.parts} - {"statistics"}


def test_a_harmonic_within_reach_of_the_interface_is_a_limit() -> None:
    made = absolute(reading(third=3e-6), RIG, CALIBRATION, 0.5)
    second, third, fourth = made.harmonics
    assert (second.ratio.limited_by, third.ratio.limited_by, fourth.ratio.limited_by) == (None, INTERFACE, NOISE)
    # seen 3e-6, |out| + |in| = 2e-6, 2u = 2e-7
    assert third.ratio.value == pytest.approx(5.2e-6, rel=1e-9, abs=0.0)
    assert second.ratio.u == pytest.approx(math.hypot(1e-7, 2e-6 / math.sqrt(2.0)), rel=1e-9, abs=0.0)


def test_an_interface_floor_is_never_an_amplifiers_number() -> None:
    own = 2e-6  # |out| + |in| in the same phase: the amplifier adds nothing
    made = absolute(reading(second=own, third=own, noise=6.1e-6), RIG, CALIBRATION, 0.5)
    for quantity in (made.thd, made.noise, made.thdn, made.harmonics[0].ratio, made.harmonics[1].ratio):
        assert told(quantity).limited_by == INTERFACE


def test_noise_is_that_of_the_amplifier() -> None:
    made = absolute(reading(noise=2e-5), RIG, CALIBRATION, 0.5)
    # own noise at 0.5: 3e-6 from either converter, so 6e-6 each to the fundamental
    assert told(made.noise).value == pytest.approx(math.sqrt(2e-5**2 - 2 * 6e-6**2), rel=1e-9, abs=0.0)


def test_the_parts_add_up_to_thdn() -> None:
    made = absolute(reading(), RIG, CALIBRATION, 0.5)
    parts = [told(quantity).value for quantity in (made.thd, made.noise, made.hum)]
    assert told(made.thdn).value == pytest.approx(math.hypot(*parts), rel=1e-9, abs=0.0)
    assert made.sinad is not None


def test_ratios_keep_the_reference_of_the_reading() -> None:
    raw = reading(second=0.1, third=0.0, noise=1e-3)
    total = math.hypot(1.0, 0.1, 1e-3)
    parts: dict[str, Any] = {
        name: told(getattr(raw, name)).scaled(1.0 / total, "1") for name in ("thd", "noise", "hum", "thdn")
    }
    level = measured(0.5 * total, 1e-6, "1")
    to_total = attrs.evolve(raw, settings=ReadingSettings(), level_fs=level, **parts)
    one, other = absolute(raw, RIG, CALIBRATION, 0.5), absolute(to_total, RIG, CALIBRATION, 0.5)
    assert told(other.thd).value == pytest.approx(told(one.thd).value / total, rel=1e-9, abs=0.0)


def test_what_is_not_known_stays_as_it_was_read() -> None:
    raw = reading()
    assert absolute(attrs.evolve(raw, channel=2), RIG, CALIBRATION) == attrs.evolve(raw, channel=2)
    bare = absolute(raw, RIG, Calibration())
    assert (bare.level_vrms, bare.power_w) == (None, None)
    assert bare.harmonics[0] == raw.harmonics[0]


def test_a_load_that_was_switched_in_counts_as_it_was_read_with() -> None:
    raw = attrs.evolve(reading(), settings=ReadingSettings(full_scale_vrms=40.0, load_ohm=4.0))
    watts = told(absolute(raw, RIG, CALIBRATION, 0.5).power_w)
    assert watts.value == pytest.approx(100.0, rel=1e-12, abs=0.0)
    assert "load left tolerance" in {part.source for part in watts.parts}


def test_a_reading_that_is_not_ok_gets_no_figures_that_it_did_not_have() -> None:
    overloaded = Reading(
        span=Span(0, 100, 48_000.0), channel=1, settings=ReadingSettings(), state=State.OVERLOAD, peak_fs=1.0
    )
    assert absolute(overloaded, RIG, CALIBRATION) == overloaded


def test_one_dominating_meter_gives_the_interval_of_a_rectangle() -> None:
    sharp = attrs.evolve(WIRING, attenuator=Attenuator(ratio=20.0))
    volts = told(absolute(reading(), Rig("table", (sharp,)), CALIBRATION, 0.5).level_vrms)
    # 95 % of a rectangle of half-width √3·u is 0.95·√3·u, not 1.96·u (JCGM 101:2008, 9.2)
    assert stated95(volts).half_width == pytest.approx(0.95 * math.sqrt(3.0) * volts.u, rel=1e-3, abs=0.0)
