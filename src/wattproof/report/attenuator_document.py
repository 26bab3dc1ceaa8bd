"""A planned attenuator as the JSON document that programs rely on.

The contract, version 1. Readers ignore keys that they don't know; `version` rises only when a key changes its meaning
or goes. The document is ASCII and holds no NaN and no infinity: what is unlimited or absent is null.

    {"wattproof": "attenuator", "version": 1,
     "topology": "single-ended" | "bridge-tied" | "bridge-tied to two inputs",
     "settings": {"power_w", "load_ohm", "full_scale_vrms", "input_ohm", "series", "tolerance", "input_tolerance",
       "rail_v", "cable_pf", "input_limit_v", "input_limit_ma", "interface_noise_vrms", "common_mode_vrms", "clamp_pf"},
     "parts": [{"name", "leg": null | "+" | "-", "ohm", "dissipation_w", "voltage_v", "fault_dissipation_w",
       "fault_voltage_v", "rated_w", "rated_v"}],
     "ratio": Q, "ratio_least", "ratio_greatest", "ratio_95": [lo, hi], "ratio_budget": [{"source", "u", "share"}],
     "full_power": {"output_vrms", "level_vrms", "headroom_db", "headroom_least_db", "amplifier_sees_ohm"},
     "input": {"source_ohm", "bandwidth_hz", "loss_20_khz_db"},
     "noise": {"thermal_vrms", "interface_vrms", "interface_assumed", "rise_db"},
     "bridge": null | {"common_mode": {"running_v", "swing_v", "switch_on_v", "one_half_at_rail_v", "limit_v"},
       "rejection": {"worst_db", "standard_db"}, "rejection_of_1_percent_parts": {"worst_db", "standard_db"},
       "hum": {"shared_vrms", "worst_vrms", "standard_vrms", "worst_db", "standard_db"}},
     "clamp": null | {"capacitance_pf", "distortion": [{"frequency_hz", "ratio"}]},
     "faults": [{"part", "kind": "open" | "short", "level_vrms", "pin_v", "limit_v", "input_ma", "shorted_ma",
       "limit_ma", "most_energy_j", "heat_share", "voltage_share", "harmless"}],
     "verdict": {"text", "basis"}, "warnings": [{"text", "basis"}], "assumptions": [{"text", "basis"}]}

Q is {"value", "u", "unit"} with u the standard uncertainty. `settings` holds what was used, stated or not. `ratio` is
volts at the amplifier over volts at the input; `ratio_least` and `ratio_greatest` are the worst cases, `ratio_95` the
95 % interval with every tolerance rectangular. `dissipation_w` is at full power, `voltage_v` with the terminal at its
rail. A bridge's parts and faults are alike in both legs; `parts` lists both, `faults` one. `most_energy_j` is the most
that any input can draw in one second. `basis` is "computed", a source, "as stated", "common practice, no source", or
empty for a sentence without figures.
"""

import math

import attrs

from wattproof.core.units import db
from wattproof.dsp.attenuator import Plan
from wattproof.dsp.attenuator_bridge import common_mode, rejection
from wattproof.dsp.attenuator_faults import Fault, faults
from wattproof.dsp.attenuator_noise import CLAMP_FREQUENCIES_HZ, bandwidth_hz, clamp_distortion, loss, noise
from wattproof.dsp.intervals import Shape, budget, interval95
from wattproof.report.attenuator_words import assumptions, verdict, warnings

VERSION = 1
ONE_PERCENT = 0.01

Document = dict[str, object]


def attenuator_document(plan: Plan) -> Document:
    """Return the document of a plan, as the contract in this module's docstring has it."""
    ratio, (least, greatest) = plan.ratio(), plan.extremes()
    interval = interval95(ratio, {part.source: Shape.RECTANGULAR for part in ratio.parts})
    return {
        "wattproof": "attenuator",
        "version": VERSION,
        "topology": topology(plan),
        "settings": _settings(plan),
        "parts": _parts(plan),
        "ratio": {"value": ratio.value, "u": ratio.u, "unit": ratio.unit},
        "ratio_least": least,
        "ratio_greatest": greatest,
        "ratio_95": [interval.low, interval.high],
        "ratio_budget": [{"source": row.source, "u": row.u, "share": row.share} for row in budget(ratio)],
        "full_power": _full_power(plan),
        "input": {
            "source_ohm": plan.leg.source_ohm,
            "bandwidth_hz": _finite(bandwidth_hz(plan)),
            "loss_20_khz_db": db(loss(plan, 20_000.0)),
        },
        "noise": _noise(plan),
        "bridge": _bridge(plan) if plan.wish.bridge_tied else None,
        "clamp": _clamp(plan),
        "faults": [_fault(fault) for fault in faults(plan)],
        "verdict": attrs.asdict(verdict(plan)),
        "warnings": [attrs.asdict(caution) for caution in warnings(plan)],
        "assumptions": [attrs.asdict(caution) for caution in assumptions(plan)],
    }


def topology(plan: Plan) -> str:
    """Return how output and input are joined, in words."""
    if not plan.wish.bridge_tied:
        return "single-ended"
    return "bridge-tied to two inputs" if plan.wish.two_inputs else "bridge-tied"


def _settings(plan: Plan) -> Document:
    wish = plan.wish
    return {
        "power_w": wish.power_w,
        "load_ohm": wish.load_ohm,
        "full_scale_vrms": wish.full_scale_vrms,
        "input_ohm": wish.input_ohm,
        "series": wish.series.value,
        "tolerance": wish.part_tolerance,
        "input_tolerance": wish.input_tolerance,
        "rail_v": wish.rail,
        "cable_pf": wish.cable_pf,
        "input_limit_v": wish.pin_limit_v,
        "input_limit_ma": wish.input_limit_ma,
        "interface_noise_vrms": noise(plan).interface_vrms,
        "common_mode_vrms": wish.common_mode_vrms,
        "clamp_pf": wish.clamp_pf,
    }


def _parts(plan: Plan) -> list[Document]:
    legs: tuple[str | None, ...] = ("+", "-") if plan.wish.bridge_tied else (None,)
    return [
        {
            "name": part.name,
            "leg": leg,
            "ohm": part.ohm,
            "dissipation_w": part.running_w,
            "voltage_v": part.running_v,
            "fault_dissipation_w": part.fault_w,
            "fault_voltage_v": part.fault_v,
            "rated_w": part.rated_w,
            "rated_v": part.rated_v,
        }
        for leg in legs
        for part in plan.parts
    ]


def _full_power(plan: Plan) -> Document:
    least = plan.wish.full_scale_vrms / (plan.wish.seen_vrms / plan.extremes()[0])
    return {
        "output_vrms": plan.wish.full_vrms,
        "level_vrms": plan.level_vrms,
        "headroom_db": db(plan.headroom),
        "headroom_least_db": db(least),
        "amplifier_sees_ohm": plan.with_attenuator_ohm,
    }


def _noise(plan: Plan) -> Document:
    told = noise(plan)
    return {
        "thermal_vrms": told.thermal_vrms,
        "interface_vrms": told.interface_vrms,
        "interface_assumed": told.interface_is_assumed,
        "rise_db": db(told.rise),
    }


def _bridge(plan: Plan) -> Document:
    shared, kept, coarse = common_mode(plan), rejection(plan), rejection(plan, ONE_PERCENT)
    return {
        "common_mode": {
            "running_v": shared.running_v,
            "swing_v": shared.swing_v,
            "switch_on_v": shared.switch_on_v,
            "one_half_at_rail_v": shared.stuck_v,
            "limit_v": shared.limit_v,
        },
        "rejection": {"worst_db": db(kept.worst), "standard_db": db(kept.standard)},
        "rejection_of_1_percent_parts": {"worst_db": db(coarse.worst), "standard_db": db(coarse.standard)},
        "hum": {
            "shared_vrms": plan.wish.common_mode_vrms,
            "worst_vrms": kept.hum_worst_vrms,
            "standard_vrms": kept.hum_standard_vrms,
            "worst_db": _finite(db(kept.hum_worst)),
            "standard_db": _finite(db(kept.hum_standard)),
        },
    }


def _clamp(plan: Plan) -> Document | None:
    if plan.wish.clamp_pf is None:
        return None
    distortion = [{"frequency_hz": hz, "ratio": clamp_distortion(plan, hz)} for hz in CLAMP_FREQUENCIES_HZ]
    return {"capacitance_pf": plan.wish.clamp_pf, "distortion": distortion}


def _fault(fault: Fault) -> Document:
    return {**attrs.asdict(fault), "kind": fault.kind.value, "harmless": fault.harmless}


def _finite(number: float) -> float | None:
    return number if math.isfinite(number) else None
