"""Gain, balance, polarity and tracking: the JSON document that programs rely on, and the page for people.

The contract, version 1. Readers ignore keys that they don't know; `version` rises only when a key changes its meaning
or goes. The document is ASCII and holds no NaN and no infinity.

    {"wattproof": "gain", "version": 1, "settings": {..}, "rig": {..}, "ending", "why",
     "channels": [{"channel": 1, "name": "left", "inverted": true | false | null, "sensitivity_vrms": Q | null,
       "positions": [{"position": "as found", "gain": Q | null, "gain_db": x | null, "u_db": x | null,
         "from_first_db": x}]}],
     "balance": [{"position": "as found", "right_over_left_db": x, "u_db": x}],
     "notes": [sentences]}

Q is {"value", "u", "unit", "limited_by"}, u the standard uncertainty. `gain` is volts at the terminals over volts at
the interface's output, null where these are not known; `from_first_db` is to the first position. `balance` exists for
two channels, the second over the first. `sensitivity_vrms` is for `rated_vrms` of the settings at the first position.
`inverted` is null where the polarity could not be told.
"""

from wattproof.core.units import DB_PER_RELATIVE, db
from wattproof.procedures.gain import GainAt, GainChannel, GainResult
from wattproof.report.quantities import Document, Frame, cell, db_cell, envelope, q
from wattproof.report.sheet import Grid, Sheet


def gain_document(result: GainResult, frame: Frame) -> Document:
    """Return the document of one run of `gain`."""
    content: Document = {
        "channels": [_channel(each) for each in result.channels],
        "balance": [
            {
                "position": each.position,
                "right_over_left_db": db(each.ratio.value),
                "u_db": DB_PER_RELATIVE * each.ratio.u / each.ratio.value,
            }
            for each in result.balance
        ],
    }
    return envelope(frame, content, result.notes)


def _channel(channel: GainChannel) -> Document:
    return {
        "channel": channel.row.channel,
        "name": channel.row.wiring.name,
        "inverted": channel.inverted,
        "sensitivity_vrms": q(channel.sensitivity_vrms),
        "positions": [_at(each) for each in channel.at],
    }


def _at(at: GainAt) -> Document:
    gain = at.gain
    return {
        "position": at.position,
        "gain": q(gain),
        "gain_db": None if gain is None else db(gain.value),
        "u_db": None if gain is None else DB_PER_RELATIVE * gain.u / gain.value,
        "from_first_db": db(at.from_first.value),
    }


_POLARITY = {True: "turned", False: "kept", None: "not told"}


def gain_sheet(result: GainResult) -> Sheet:
    """Return the page of one run of `gain`."""
    rows = [_row(channel, each) for channel in result.channels for each in channel.at]
    columns = ("Ch", "Control", "Gain", "From first", "Sensitivity", "Polarity")
    grids = [Grid("", columns, tuple(rows))]
    if result.balance:
        balance = tuple((each.position, db_cell(each.ratio)) for each in result.balance)
        grids.append(Grid("Balance, second channel over first", ("Control", "dB"), balance))
    return Sheet("Gain", f"Tone 997 Hz, output {result.plan.level_vrms:g} V rms; ± at 95 %", tuple(grids), result.notes)


def _row(channel: GainChannel, at: GainAt) -> tuple[str, ...]:
    name = f"{channel.row.channel} {channel.row.wiring.name}".strip()
    once = (cell(channel.sensitivity_vrms), _POLARITY[channel.inverted]) if at is channel.at[0] else ("", "")
    return name, at.position, db_cell(at.gain), db_cell(at.from_first), *once
