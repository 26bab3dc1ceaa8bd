"""Conditions of published rules, listed and ticked off one by one. Nothing here says that anything fulfils a standard.

A requirement whose figure nobody on the project has read in the rule's own text is marked unverified; it is a reminder
to read it, and no condition to rely on.
"""

from collections.abc import Sequence
from enum import StrEnum
from typing import Protocol

import attrs

from wattproof.procedures.power_plan import Driven, PowerPlan, Preset
from wattproof.procedures.power_rows import Row

UNVERIFIED = "unverified, read the text"
FTC = "16 CFR Part 432"
FTC_2024 = "16 CFR Part 432 as amended 12 August 2024 (89 FR 49797)"
IEC = "IEC 60268-3:2018"
IEC_HOLD_S = 60.0  # of the distortion-limited output power: from memory
FTC_HOLD_S = 300.0  # five minutes at full rated power: text in force to 11 August 2024, 432.3 (e)


class Tick(StrEnum):
    """Whether a condition was kept in this run."""

    DONE = "done"
    NOT_DONE = "not done"
    NOT_SEEN = "cannot be seen by the program"


@attrs.frozen
class Requirement:
    """One condition: the rule, what it asks in our words, whether its text was read here, and how this run stands."""

    rule: str
    asks: str
    read: bool
    tick: Tick

    @property
    def remark(self) -> str:
        """What to print beside it: nothing, or that its text has to be read."""
        return "" if self.read else UNVERIFIED


class _Point(Protocol):
    @property
    def held_s(self) -> float: ...


class _Row(Protocol):
    @property
    def row(self) -> Row: ...

    @property
    def points(self) -> Sequence[_Point]: ...


def requirements(plan: PowerPlan, rows: Sequence[_Row]) -> tuple[Requirement, ...]:
    """Return the conditions of the preset that was asked for, ticked off against the run."""
    if plan.preset is Preset.FTC:
        return _ftc(rows)
    return _iec(plan, rows) if plan.preset is Preset.IEC else ()


def preset_plan(plan: PowerPlan) -> PowerPlan:
    """Return a plan with what the preset asks of it set, where the person left it at its default."""
    if plan.preset is Preset.FTC:
        return attrs.evolve(plan, driven=Driven.ALL, hold_s=max(plan.hold_s, FTC_HOLD_S))
    if plan.preset is Preset.IEC:
        return attrs.evolve(plan, hold_s=max(plan.hold_s, IEC_HOLD_S))
    return plan


def _ftc(rows: Sequence[_Row]) -> tuple[Requirement, ...]:
    eight = bool(rows) and all(each.row.load.nominal_ohm == 8.0 for each in rows)
    return (
        Requirement(FTC_2024, "power is stated into 8 Ω", read=False, tick=_tick(eight)),
        Requirement(
            FTC_2024, "at least the two front channels are driven together", read=False, tick=_tick(_all_driven(rows))
        ),
        Requirement(FTC_2024, "20 Hz to 20 kHz at every frequency of the band", read=False, tick=Tick.NOT_DONE),
        Requirement(FTC_2024, "less than 1 % distortion from 250 mW to rated power", read=False, tick=Tick.NOT_DONE),
        Requirement(FTC, "five minutes at full rated power", read=False, tick=_tick(_held(rows, FTC_HOLD_S))),
        Requirement(
            FTC, "one hour before at one-eighth of rated power, all channels, 1 kHz", read=False, tick=Tick.NOT_SEEN
        ),
        Requirement(FTC, "still air of at least 25 °C", read=False, tick=Tick.NOT_SEEN),
        Requirement(
            FTC, "mains of 120 V and 60 Hz (or as for the market) of low distortion", read=False, tick=Tick.NOT_SEEN
        ),
    )


def _iec(plan: PowerPlan, rows: Sequence[_Row]) -> tuple[Requirement, ...]:
    bands = (plan.low_hz, plan.high_hz) == (20.0, 20_000.0)
    return (
        Requirement(IEC, "rated supply, stated in the statement", read=False, tick=_tick(plan.supply_v is not None)),
        Requirement(IEC, "rated load, a pure resistance within 1 %", read=False, tick=Tick.NOT_SEEN),
        Requirement(IEC, "rated source impedance and e.m.f.", read=False, tick=Tick.NOT_SEEN),
        Requirement(
            IEC, "power at the stated distortion, held for 60 s", read=False, tick=_tick(_held(rows, IEC_HOLD_S))
        ),
        Requirement(
            IEC,
            "distortion as everything but the fundamental, to the total",
            read=False,
            tick=_tick(plan.reference.value == "total"),
        ),
        Requirement(IEC, "measuring band stated", read=False, tick=_tick(bands or plan.high_hz > 0.0)),
        Requirement(IEC, "all channels driven", read=False, tick=_tick(_all_driven(rows))),
    )


def _tick(kept: bool) -> Tick:  # noqa: FBT001 - one word, said at once
    return Tick.DONE if kept else Tick.NOT_DONE


def _all_driven(rows: Sequence[_Row]) -> bool:
    return bool(rows) and all(len(each.row.driven) > 1 for each in rows)


def _held(rows: Sequence[_Row], seconds: float) -> bool:
    points = [point for each in rows for point in each.points]
    return (
        bool(points)
        and all(point.held_s >= seconds for point in points if point.held_s)
        and any(point.held_s >= seconds for point in points)
    )
