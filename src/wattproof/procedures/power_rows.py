"""The rows of a power statement: which channel into which load, what sounds, and how each of them is read."""

from collections.abc import Mapping

import attrs

from wattproof.core.calibration import Calibration
from wattproof.core.errors import WrongUseError
from wattproof.core.reading import ReadingSettings
from wattproof.core.rig import Load, Rig, Wiring
from wattproof.procedures.guard import mounted_w
from wattproof.procedures.power_plan import Driven, PowerPlan
from wattproof.procedures.watch import ReaderFactory

OPEN_LOAD_OHM = 1e4  # from here on it is no load: a valve amplifier's transformer sees nothing that takes its energy


@attrs.frozen(eq=False)
class Place:
    """Where a procedure works: what is wired, what is known of the sockets, and how captures are read.

    `ceilings_fs` is the highest level, as a ratio to full scale, that each output may sound; a recording has none.
    `real` tells whether an amplifier may be hurt.
    """

    rate_hz: float
    inputs: int
    rig: Rig
    calibration: Calibration
    ceilings_fs: Mapping[int, float]
    new_reader: ReaderFactory
    real: bool


@attrs.frozen
class Row:
    """One row: a channel (counted from 1), its wiring, the load, and the channels and outputs that sound."""

    index: int
    channel: int
    wiring: Wiring
    load: Load
    driven: tuple[int, ...]
    outputs: tuple[int, ...]


def rows_of(plan: PowerPlan, place: Place) -> tuple[Row, ...]:
    """Return the rows in the order in which they are measured: load by load, within it channel by channel.

    A channel that the rig does not wire is reached through the first wiring, by switching plugs.

    Raises:
        WrongUseError: no volts are known, no load is set for a valve amplifier, or bursts without a load.
    """
    wirings = place.rig.wirings
    rows: list[Row] = []
    for nominal_ohm in plan.loads_ohm or (wirings[0].load.nominal_ohm,):
        if (plan.valve or plan.in_bursts) and nominal_ohm >= OPEN_LOAD_OHM:
            what = "a valve amplifier" if plan.valve else "a test in bursts"
            raise WrongUseError(f"load {nominal_ohm:g} Ω: {what} never runs without a load; connect one")
        for channel in plan.channel_list:
            wiring = wirings[channel - 1] if channel <= len(wirings) else wirings[0]
            everyone = tuple(range(1, len(wirings) + 1))
            driven = everyone if plan.driven is Driven.ALL and channel in everyone else (channel,)
            sounding = {wirings[each - 1].output for each in driven if each <= len(wirings)} or {wiring.output}
            outputs = tuple(sorted(sounding)) if place.ceilings_fs else ()
            load = _load(plan, wiring.load, nominal_ohm)
            rows.append(Row(len(rows), channel, wiring, load, driven, outputs))
    return tuple(rows)


def ceiling_fs(plan: PowerPlan, place: Place, outputs: tuple[int, ...]) -> float:
    """Return the highest level that this run may drive the outputs with, as a ratio to full scale."""
    most = [1.0]
    for output in outputs:
        most.append(place.ceilings_fs[output])
        scale = place.calibration.output_vrms(output)
        if scale is not None and plan.drive_vrms is not None:
            most.append(plan.drive_vrms / scale.value)
    return min(most)


def settings_of(plan: PowerPlan, place: Place, row: Row) -> tuple[ReadingSettings, ...]:
    """Return how each input is read while a row is measured: volts at the terminals, watts in the row's load.

    Raises:
        WrongUseError: volts per full scale of the row's input are not known.
    """
    high_hz = min(plan.high_hz, place.rate_hz / 2.0)
    return tuple(_settings(plan, place, row, socket, high_hz) for socket in range(1, place.inputs + 1))


def wired_as(rig: Rig, row: Row) -> Rig:
    """Return the rig as it is while a row is measured: with the row's load on every channel."""
    wirings = tuple(
        attrs.evolve(wiring, load=row.load if wiring == row.wiring else _same(wiring.load, row.load))
        for wiring in rig.wirings
    )
    return attrs.evolve(rig, wirings=wirings)


def _same(own: Load, load: Load) -> Load:
    return own if own.nominal_ohm == load.nominal_ohm else load


def _settings(plan: PowerPlan, place: Place, row: Row, socket: int, high_hz: float) -> ReadingSettings:
    wired = next((wiring for wiring in place.rig.wirings if wiring.input == socket), None)
    scale = place.calibration.input_vrms(socket)
    volts = plan.full_scale_vrms
    if volts is None and scale is not None:
        volts = scale.value * (1.0 if wired is None else wired.attenuator.ratio)
    if volts is None and socket == row.wiring.input:
        raise WrongUseError(
            f"input {socket}: its volts are not known; calibrate it, or give --full-scale-vrms V, the V rms at the "
            "amplifier's terminals that drive it to full scale"
        )
    ohm = row.load.ohm if wired is not None and volts is not None else None
    return ReadingSettings(plan.low_hz, high_hz, plan.reference, volts, ohm)


def _load(plan: PowerPlan, wired: Load, nominal_ohm: float) -> Load:
    load = wired if wired.nominal_ohm == nominal_ohm else Load(nominal_ohm=nominal_ohm, rated_w=wired.rated_w)
    return attrs.evolve(load, rated_w=mounted_w(load.rated_w, plan.load_printed_w, heat_sink=plan.heat_sink))
