"""Rigs as TOML files: what is wired on a table, edited by hand or by a form, checked whenever it is read."""

import math
from pathlib import Path

import attrs

from wattproof.core.rig import Attenuator, Rig, Wiring
from wattproof.dsp.attenuation import leg_of
from wattproof.store.record_file import Document, Format, new_converter, read_document, save, structured, written
from wattproof.store.toml_place import Path as Place

RIG = Format("rig", 1, new_converter())
FURTHEST = 1.5  # a measured load further from its nominal value than this is a slip of the unit or the decimal point
_AGREE = 1e-3  # a stated ratio that is not that of its resistors


def read_rig(file: Path) -> Rig:
    """Read a rig. A ratio that is left out is computed from the resistors and what loads them.

    Raises:
        WrongUseError: the line names file, line and field, and says what to do.
    """
    document = read_document(file, RIG)
    rig = structured(document, Rig, RIG)
    wirings = tuple(_checked(document, index, wiring) for index, wiring in enumerate(rig.wirings))
    return attrs.evolve(rig, wirings=wirings)


def write_rig(file: Path, rig: Rig) -> None:
    """Write a rig, whole or not at all.

    Raises:
        WrongUseError: the file cannot be written.
    """
    save(file, rig_text(rig))


def rig_text(rig: Rig) -> str:
    """Return the TOML text of a rig."""
    return written(RIG.converter.unstructure(rig), RIG)


def _checked(document: Document, index: int, wiring: Wiring) -> Wiring:
    place: Place = ("wirings", index)
    _check_load(document, (*place, "load"), wiring)
    leg = leg_of(wiring.attenuator)
    given = document.content.get("wirings", [{}])[index].get("attenuator", {})
    if leg is None:
        _check_complete(document, (*place, "attenuator"), wiring.attenuator)
        return wiring
    if "ratio" not in given:
        return attrs.evolve(wiring, attenuator=attrs.evolve(wiring.attenuator, ratio=leg.ratio))
    if wiring.attenuator.measured_accuracy is not None:
        return wiring  # a measured ratio stands beside its resistors
    if abs(math.log(wiring.attenuator.ratio / leg.ratio)) > _AGREE:
        raise document.error(
            (*place, "attenuator", "ratio"),
            f"{wiring.attenuator.ratio:g} is not what the resistors make, loaded by the input: {leg.ratio:.6g}; leave "
            "ratio out, or state measured_accuracy if it was measured",
        )
    return wiring


def _check_load(document: Document, place: Place, wiring: Wiring) -> None:
    load = wiring.load
    for name, ohm in (("measured_ohm", load.measured_ohm), ("hot_ohm", load.hot_ohm)):
        if ohm is None or 1.0 / FURTHEST <= ohm / load.nominal_ohm <= FURTHEST:
            continue
        milli = 1e3 / FURTHEST <= ohm / load.nominal_ohm <= 1e3 * FURTHEST
        hint = f"it looks like mΩ; give Ω, {ohm / 1e3:g}" if milli else "give Ω, as measured at the load's terminals"
        raise document.error((*place, name), f"{ohm:g} Ω beside a nominal {load.nominal_ohm:g} Ω: {hint}")


def _check_complete(document: Document, place: Place, attenuator: Attenuator) -> None:
    stated = [name for name in ("r1a_ohm", "r1b_ohm", "r2a_ohm", "r2b_ohm") if getattr(attenuator, name) is not None]
    if stated:
        missing = "a resistor to ground (r2a_ohm)" if stated[0].startswith("r1") else "a series resistor (r1a_ohm)"
        raise document.error((*place, stated[0]), f"{missing} is missing; state both, or the ratio alone")
