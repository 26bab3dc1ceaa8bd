"""Efficiency and heat: the supply's volts and amperes, typed, against the output power at each of several levels."""

from collections.abc import Sequence

import attrs

from wattproof.core.errors import StoppedError, WrongUseError
from wattproof.core.fields import declared
from wattproof.core.notes import Kind, Note, note
from wattproof.core.quantity import Part, Quantity
from wattproof.core.wording import sentence
from wattproof.dsp.energy import EnergyBalance, energy_balance
from wattproof.dsp.intervals import rectangular
from wattproof.dsp.uncertainty import named_scatter, product, total
from wattproof.procedures.around_plan import AroundPlace, AroundPlan
from wattproof.procedures.driving import Answer, Doing, Muted
from wattproof.procedures.power_plan import Driven, numbers
from wattproof.procedures.power_rows import Row, rows_of
from wattproof.procedures.power_switching import FULL, begin
from wattproof.procedures.requests import Action, Ask, Figure, Kept, Mark, Procedure, Role, Said
from wattproof.procedures.stepping import Stepping

SUPPLY = "supply"  # what a CONFIRM wants whose answer is "volts:amperes" of the supply
SETTLE_S = 1.0  # before the supply is read: its meter, and a slow supply


@attrs.frozen(kw_only=True)
class EfficiencyPlan(AroundPlan):
    """Settings of `efficiency`."""

    levels_vrms: str = declared(
        "1,2,4", label="Levels", unit="V rms", help='outputs in rising order, as "1,2,4"; each is held while one reads'
    )
    supply: str = declared(
        "",
        label="Supply",
        unit="V:A",
        help='volts and amperes at each level, as "12.1:0.35,12.0:0.9,11.9:2.6"; empty: asked for at each level',
    )
    driven: Driven = declared(Driven.ALL, label="Driven", help="one channel at a time, or all of them at once")
    accuracy: float = declared(
        0.01, label="Meters' accuracy", unit="1", minimum=0.0, maximum=0.2, help="of volts and of amperes, plain ratio"
    )
    read_s: float = declared(1.0, label="Reading", unit="s", minimum=0.2, maximum=10.0, help="of the output power")

    def __attrs_post_init__(self) -> None:
        super().__attrs_post_init__()
        levels = self.level_list
        if list(levels) != sorted(levels) or not levels:
            raise ValueError(f'levels-vrms is "{self.levels_vrms}"; give voltages in rising order, as 1,2,4')
        typed = typed_supply(self.supply)
        if typed and len(typed) != len(levels):
            raise ValueError(f"supply has {len(typed)} readings for {len(levels)} levels; give one V:A for each")

    @property
    def level_list(self) -> tuple[float, ...]:
        """The outputs in rising order."""
        return numbers("levels-vrms", self.levels_vrms, 1e-3)


def typed_supply(text: str) -> tuple[tuple[float, float], ...]:
    """Return volts and amperes of each reading in "V:A,V:A"; none of an empty text.

    Raises:
        ValueError: it is something else.
    """
    found = []
    for part in (each for each in text.split(",") if each.strip()):
        volts, _, amperes = part.partition(":")
        try:
            pair = float(volts), float(amperes)
        except ValueError:
            pair = (0.0, 0.0)
        if not all(0.0 < each < 1e4 for each in pair):
            raise ValueError(f'supply reading "{part.strip()}"; give volts and amperes, as 12.1:0.35')
        found.append(pair)
    return tuple(found)


def efficiency(plan: EfficiencyPlan, place: AroundPlace) -> Procedure:
    """Hold each level, read the output power of all channels, and have the supply's meters read meanwhile.

    Raises:
        WrongUseError: no volts are known, or what was typed is no reading of a supply.
        StoppedError: the guard ended the run for good; what was kept stands.
    """
    rows = rows_of(plan.guarded(driven=plan.driven), place)
    row = rows[0]
    stepping = Stepping(plan, place, row)
    yield from begin(stepping, FULL)
    try:
        for number, level_vrms in enumerate(plan.level_list):
            yield stepping.doing(number, len(plan.level_list), f"{level_vrms:g} V", 0.0)
            yield from stepping.reach(level_vrms)
            yield from _level(plan, stepping, rows, number)
    except Muted as muted:
        yield Said(muted.why, row.index)
        raise StoppedError(sentence(muted.why)) from muted
    yield from stepping.silence()


def _level(plan: EfficiencyPlan, stepping: Stepping, rows: Sequence[Row], number: int) -> Doing[None]:
    """Read at one level; the output is watched by the guard before and after somebody reads the supply's meters."""
    yield from stepping.look(SETTLE_S)
    typed = typed_supply(plan.supply)
    if typed:
        volts, amperes = typed[number]
    else:
        answer: Answer = yield Ask(Action.CONFIRM, SUPPLY, f"level {number + 1}")
        try:
            ((volts, amperes),) = typed_supply(str(answer))
        except ValueError as error:
            raise WrongUseError(
                f"the supply's reading {str(answer)!a}: give volts and amperes, as 12.1:0.35"
            ) from error
    reading = yield from stepping.look(plan.read_s)
    driven = rows if plan.driven is Driven.ALL else rows[:1]
    figures = (Figure("supply_v", volts), Figure("supply_a", amperes))
    for row in driven:
        own = stepping.all_inputs[row.wiring.input - 1]
        mark = Mark(Role.STEP, row.index, at=str(number), drive_fs=stepping.level_fs)
        yield Kept(reading if own is reading else own, mark, figures)


@attrs.frozen
class EfficiencyPoint:
    """One level: what the loads took together, what the supply gave, and the balance."""

    level_vrms: float
    output_w: Quantity
    supply_v: float
    supply_a: float
    supply_w: Quantity
    balance: EnergyBalance


@attrs.frozen
class EfficiencyResult:
    """What `efficiency` found."""

    plan: EfficiencyPlan
    rows: tuple[Row, ...]
    points: tuple[EfficiencyPoint, ...]
    notes: tuple[Note, ...]


def conclude(plan: EfficiencyPlan, place: AroundPlace, records: Sequence[Kept | Said]) -> EfficiencyResult:
    """Return what kept readings and findings amount to."""
    rows = rows_of(plan.guarded(driven=plan.driven), place)
    kept = [each for each in records if isinstance(each, Kept) and each.mark is not None]
    notes = [each.note for each in records if isinstance(each, Said)]
    points = []
    for number, level_vrms in enumerate(plan.level_list):
        own = [each for each in kept if each.mark is not None and each.mark.at == str(number)]
        point = _point(plan, level_vrms, own)
        if point is not None:
            points.append(point)
            if point.output_w.value > point.supply_w.value:
                powers = {"power_w": point.output_w.value, "supply_w": point.supply_w.value}
                notes.append(note(Kind.SUPPLY_IMPOSSIBLE, power_w=powers["power_w"], supply_w=powers["supply_w"]))
    notes.append(note(Kind.SUPPLY_MEAN))
    return EfficiencyResult(plan, rows, tuple(points), tuple(dict.fromkeys(notes)))


def _point(plan: EfficiencyPlan, level_vrms: float, own: Sequence[Kept]) -> EfficiencyPoint | None:
    powers = [
        named_scatter(each.reading.power_w, f"channel {each.reading.channel}")
        for each in own
        if each.reading.power_w is not None
    ]
    if not powers:
        return None
    by_name = {figure.name: figure.value for figure in own[0].figures}
    volts, amperes = by_name["supply_v"], by_name["supply_a"]
    u = rectangular(plan.accuracy)
    supply_w = product(
        Quantity(volts, "V", (Part("supply volts", volts * u),)),
        Quantity(amperes, "A", (Part("supply amperes", amperes * u),)),
        "W",
    )
    output_w = total(powers)
    return EfficiencyPoint(level_vrms, output_w, volts, amperes, supply_w, energy_balance(output_w, supply_w))
