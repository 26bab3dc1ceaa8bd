"""Output resistance from two loads: the simulated output stage, with and without its filter, is read as it is made."""

import pytest

from tests.procedures.sitting import done, result
from wattproof.bench.simulated.truth import output_impedance
from wattproof.core.notes import Kind
from wattproof.procedures.output_resistance import OutputResistancePlan


def test_a_complex_output_impedance_is_read_at_every_tone() -> None:
    points = done("output-resistance").curves[0].points
    assert points[-1].frequency_hz == pytest.approx(20_000.0, rel=1e-9, abs=0.0)
    for point in points:
        truth = output_impedance(0.08, point.frequency_hz)
        assert abs(point.impedance.resistance.value - truth.real) < 2.0 * point.impedance.resistance.u
        assert abs(point.impedance.reactance.value - truth.imag) < 2.0 * point.impedance.reactance.u
        assert point.impedance.reactance.value == pytest.approx(truth.imag, rel=0.005, abs=0.0)


def test_unloaded_against_loaded_the_damping_factor_lies_in_its_interval() -> None:
    plan = OutputResistancePlan(
        channels="1", loads="1e6,8", measured_ohm="1e6,8", from_hz=1_000.0, to_hz=4_000.0, per_octave=0.5
    )
    curve = result(plan).curves[0]
    truth = 8.0 / 0.08  # no filter: nothing but the resistance
    for point in curve.points:
        assert point.damping.high is not None
        assert point.damping.low < truth < point.damping.high
    assert abs(curve.drift) < 1e-4
    assert Kind.SENSE_POINT in {note.kind for note in curve.notes}


def test_one_load_or_a_rising_order_is_refused() -> None:
    for loads in ("8", "4,8", "8,4,2"):
        with pytest.raises(ValueError, match="give two, the higher first"):
            OutputResistancePlan(loads=loads)
    with pytest.raises(ValueError, match="one for each load"):
        OutputResistancePlan(measured_ohm="8.01")
