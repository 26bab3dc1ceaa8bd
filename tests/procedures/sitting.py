"""Runs procedures around the power statement on simulated amplifiers, as the commands do, and remembers what came."""

import contextlib
from collections.abc import Mapping
from functools import cache
from types import MappingProxyType
from typing import Any

from wattproof.app import make_sitting
from wattproof.bench.simulated import SimulatedBench
from wattproof.core.run import Ending
from wattproof.procedures.around_plan import AroundPlan
from wattproof.procedures.crosstalk import CrosstalkPlan
from wattproof.procedures.efficiency import EfficiencyPlan
from wattproof.procedures.frequency import FrequencyPlan
from wattproof.procedures.gain import GainPlan
from wattproof.procedures.idle import IdlePlan
from wattproof.procedures.output_resistance import OutputResistancePlan
from wattproof.procedures.response import Method, ResponsePlan
from wattproof.report.quantities import Frame
from wattproof.runner.around import Found


def ran(
    plan: AroundPlan,
    settings: Mapping[str, float] = MappingProxyType({}),
    character: str = "class-d-bridge",
    bench: SimulatedBench | None = None,
) -> Found:
    """Return how a plan ended on a simulated bench, and what it found."""
    opened = bench or SimulatedBench(character)
    opened.open()
    with contextlib.closing(opened):
        return make_sitting(opened, plan, None, None, settings).run()


def result(
    plan: AroundPlan, settings: Mapping[str, float] = MappingProxyType({}), character: str = "class-d-bridge"
) -> Any:  # noqa: ANN401 - each plan has a result of its own kind
    """Return the result of a plan that has to end well."""
    found = ran(plan, settings, character)
    assert (found.ending, found.why) == (Ending.DONE, "")
    return found.result


PLANS: Mapping[str, tuple[AroundPlan, Mapping[str, float], str]] = MappingProxyType({
    "idle": (IdlePlan(seconds=4.0, output_vrms=8.0), {}, "class-d-bridge"),
    "response": (
        ResponsePlan(channels="1", loads="8,4", loop=True, per_octave=0.25, level_vrms=1.5),
        {"filter": 1.0},
        "class-d-bridge",
    ),
    "sweep": (
        ResponsePlan(channels="1", method=Method.SWEEP, from_hz=40.0, to_hz=21_000.0, level_vrms=2.0),
        {"bass": 6.0},
        "class-a-single",
    ),
    "frequency": (FrequencyPlan(channels="1", per_octave=0.34), {}, "class-ab-crossover"),
    "gain": (GainPlan(positions="0,-20,-40", rated_vrms=8.0), {"mistrack": 3.0, "inverting": 1.0}, "class-d-bridge"),
    "output-resistance": (
        OutputResistancePlan(channels="1", measured_ohm="8,4", from_hz=1_000.0, per_octave=0.3),
        {"filter": 1.0},
        "class-d-bridge",
    ),
    "crosstalk": (CrosstalkPlan(from_hz=1_000.0, per_octave=0.3), {"crosstalk": -70.0}, "class-d-bridge"),
    "efficiency": (EfficiencyPlan(levels_vrms="1,4"), {}, "class-d-bridge"),
})  # fmt: skip


@cache
def once(name: str) -> tuple[Found, Frame]:
    """Return one of PLANS as it ended, run once for all who ask, and what its document stands in."""
    plan, settings, character = PLANS[name]
    found = ran(plan, settings, character)
    return found, Frame(found.name, plan, found.rig, found.ending, found.why)


def done(name: str) -> Any:  # noqa: ANN401 - as above
    """Return the result of one of PLANS, which has to have ended well."""
    found, _ = once(name)
    assert (found.ending, found.why) == (Ending.DONE, "")
    return found.result
