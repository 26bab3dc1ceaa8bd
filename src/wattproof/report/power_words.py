"""What a person reads around a power statement: what is asked of them, and the paragraph in plain language."""

import math
from collections.abc import Iterator

from wattproof.core.quantity import Quantity
from wattproof.core.rounding import expanded, rounded
from wattproof.core.wording import sentence
from wattproof.procedures.driving import HERE
from wattproof.procedures.power_plan import ONSET
from wattproof.procedures.requests import Action, Ask
from wattproof.procedures.statement import PowerStatement, StatedPoint, StatedRow
from wattproof.report.around_words import around_asked

ONSET_DEFINITION = (
    "Onset of clipping, by this project's definition: with U the output voltage and Ur = THD+N times U, the unclipped "
    "trend at U is the non-negative least-squares fit (relative weights) of Ur^2 = a + b U^2 + c U^4 + d U^6 to the "
    "readings from 30 to 1 dB below U; onset is the highest U at which Ur rises through twice the trend, stays above "
    "it for the next 1 dB (or to the end) and reaches five times within it, in a record that begins at least 20 dB "
    "lower."
)
LEAST_SHOWN = 1e-4  # of a value: a finer uncertainty is not shown
_TURNS = {
    "full": "Turn the amplifier's volume control to where it shall be measured, or full up; nothing sounds yet",
    "down": "Turn the amplifier's volume control all the way down; nothing sounds yet",
    "up": "Turn the volume control up, slowly and steadily, until the tone is muted",
    "leave": "Leave the volume control where it is, hands off",
    "back": "Turn the volume control down again, as steadily",
}


def asked(ask: Ask) -> str:  # noqa: PLR0911 - one for each kind of question
    """Return what a person is asked, in one sentence without a full stop."""
    around = around_asked(ask)
    if around is not None:
        return around
    want = ask.want
    match ask.action:
        case Action.CONFIRM if want == HERE:
            return 'Parts are warm: say "I am here", else the tone is muted'
        case Action.CONFIRM:
            return (
                f"Confirm that a dummy load of {want} ohm is connected, no loudspeaker, and that the limits are right"
            )
        case Action.SWITCH_LOAD:
            return f"Switch the load to {want:g} ohm, in silence; a valve amplifier is switched off for it"
        case Action.SWITCH_CHANNEL:
            return f"Connect channel {want:g} in the place of the one before, in silence"
        case Action.TURN:
            return _TURNS.get(str(want), f"Turn the control: {want}")
        case _:
            return f"{ask.action}: {want}"


def paragraph(statement: PowerStatement) -> str:
    """Return the statement in plain language, a sentence or more for each row."""
    return " ".join(part for row in statement.rows for part in _sentences(statement, row))


def _sentences(statement: PowerStatement, stated: StatedRow) -> Iterator[str]:
    plan, row = statement.plan, stated.row
    supply = "supply not stated" if plan.supply_v is None else f"{plan.supply_v:.1f} V supply"
    driven = "one channel driven" if len(row.driven) == 1 else f"{len(row.driven)} channels driven"
    said = [f"{_watts(point)} {_where(point)}" for point in stated.points if point.power_w is not None]
    named = f"channel {row.channel}" if not row.wiring.name else f"{row.wiring.name} channel"
    box = "" if plan.claimed_w is None else f"; the box says {plan.claimed_w:g} W"
    head = f"Into {row.load.ohm:.1f} Ω, {supply}, {named}, {driven}, {plan.frequency_hz:g} Hz"
    yield f"{head}: {', '.join(said) if said else 'no power could be stated'}{box}."
    for point in stated.points:
        if point.why is not None:
            yield f"{point.at.capitalize()}: {sentence(point.why)}."
    held = {point.held_s for point in stated.points if point.power_w is not None}
    if held == {0.0}:
        yield "These are momentary values and no continuous power."
    elif held:
        yield f"Values held for {max(held):g} s are continuous over that time" + (
            ", the others momentary." if 0.0 in held else "."
        )


def _watts(point: StatedPoint) -> str:
    return figure(point.power_w, "W")


def figure(quantity: Quantity | None, unit: str) -> str:
    """Return value ± 95 % uncertainty and unit; an uncertainty below a ten-thousandth of the value is said to be less.

    That far down it is the repetition within one run alone, which nobody should read as more.
    """
    if quantity is None:
        return "–"
    least = abs(quantity.value) * LEAST_SHOWN
    if expanded(quantity) >= least:
        value, spread = rounded(quantity)
        return f"{value} ± {spread} {unit}"
    place = max(0, -math.floor(math.log10(least)))
    return f"{quantity.value:.{place}f} ± < {10.0**-place:g} {unit}"


def _where(point: StatedPoint) -> str:
    return "at the onset of clipping" if point.at == ONSET else f"at {point.at} THD+N"
