"""The sentences for people: every note and state is put into words here, in one place, ready for translation."""

from collections.abc import Mapping
from string import Formatter
from types import MappingProxyType
from typing import Any

import attrs

from wattproof.core.around_words import AROUND_WORDS
from wattproof.core.notes import Kind, Note
from wattproof.core.power_words import POWER_WORDS
from wattproof.core.preflight_words import PREFLIGHT_WORDS
from wattproof.core.reading import State


@attrs.frozen
class Wording:
    """How one kind of note is said: a template with named fields, and what each named value means."""

    template: str
    values: Mapping[str, str] = MappingProxyType({})


_AT = "s from the start of the recording or run"
_WORDINGS = {
    Kind.STARTS_LATE: Wording(
        "the tone starts at {at_s:.3f} s: what lies before it was left out",
        {"at_s": f"where the steady part begins, {_AT}"},
    ),
    Kind.ENDS_EARLY: Wording(
        "the tone ends at {at_s:.3f} s: what lies after it was left out",
        {"at_s": f"where the steady part ends, {_AT}"},
    ),
    Kind.BREAK: Wording(
        "the tone breaks at {at_s:.3f} s: only the longest steady part was read",
        {"at_s": f"where the tone breaks, {_AT}"},
    ),
    Kind.LEVEL_MOVES: Wording(
        "the level moves by {db:+.2f} dB at {db_per_s:+.1f} dB/s: the fit follows it, and the figures are means",
        {"db": "change over the block, signed, dB", "db_per_s": "its rate, signed, dB/s"},
    ),
    Kind.OVERLOADED: Wording(
        "{percent:.2g} % of samples at full scale, up to {longest_frames:.0f} in a row; the interface is overloaded, "
        "not the amplifier: add {add_db:.0f} dB of attenuation or turn the input gain down",
        {
            "percent": "share of samples at full scale, %",
            "longest_frames": "longest run of them, frames",
            "add_db": "attenuation that gives room again, dB",
        },
    ),
    Kind.GAP: Wording(
        "frames may be missing at {at_s:.3f} s ({why}): this block was refused; close what else uses the interface",
        {"at_s": f"where the gap begins, {_AT}", "why": "the witness, in words"},
    ),
    Kind.TOO_FEW_CYCLES: Wording(
        "too short: {cycles:.1f} cycles of the tone where {need:.0f} are needed; record longer",
        {"cycles": "cycles in the steady part", "need": "fewest that can be read"},
    ),
    Kind.NO_TONE: Wording("no tone: no line stands 15 dB above the noise; check the wiring and the level"),
    Kind.ONLY_MAINS: Wording(
        "no tone: the strongest line is mains hum at {frequency_hz:.1f} Hz; give --fundamental to read it as a tone",
        {"frequency_hz": "frequency of the line, Hz"},
    ),
    Kind.LEVEL_STEP: Wording(
        "the level steps by {db:+.2f} dB at {at_s:.3f} s: a block with a step in it cannot be read",
        {"at_s": f"where the step is, {_AT}", "db": "height of the step, signed, dB"},
    ),
    Kind.SECOND_TONE: Wording(
        "a second tone at {frequency_hz:.1f} Hz, {db:.1f} dB to the fundamental and no harmonic of it, counts in noise",
        {"frequency_hz": "its frequency, Hz", "db": "its level to the fundamental, dB"},
    ),
    Kind.CARRIER: Wording(
        "oscillation or carrier: content above 20 kHz is {db:.1f} dB to the fundamental; look for a switching residue "
        "or an unstable amplifier, which can burn a tweeter or itself",
        {"db": "content above 20 kHz to the fundamental, dB"},
    ),
    Kind.NO_HARMONIC_IN_BAND: Wording("THD not measurable: no harmonic of the tone lies inside the band"),
    Kind.FUNDAMENTAL_OUTSIDE_BAND: Wording(
        "the fundamental, {frequency_hz:.1f} Hz, lies outside the band; widen it with --band LO-HI",
        {"frequency_hz": "frequency of the fundamental, Hz"},
    ),
    Kind.STRONGER_LINE: Wording(
        "a line at {frequency_hz:.1f} Hz is stronger than the given fundamental, by {db:.1f} dB",
        {"frequency_hz": "frequency of the stronger line, Hz", "db": "its level to the fundamental, dB"},
    ),
    Kind.BAND_CUT: Wording(
        "the sampling rate ends the band at {high_hz:.0f} Hz",
        {"high_hz": "upper edge that was used, Hz"},
    ),
    Kind.CUT_SHORT: Wording(
        "the file is cut short: {frames:.0f} of the {promised_frames:.0f} frames that its header promises",
        {"promised_frames": "frames by the header", "frames": "frames that are there"},
    ),
    Kind.NOT_AS_NAMED: Wording(
        "the file is named {named} but holds {found}",
        {"named": "format by the file's name", "found": "format by its content"},
    ),
    Kind.DAMAGED: Wording(
        "the file is damaged: {what}; copy or record it again",
        {"what": "what was found, in words"},
    ),
    Kind.HARMONICS_CUT: Wording(
        "harmonics above order {orders:.0f} are not told apart: they count in noise",
        {"orders": "highest order that was fitted"},
    ),
    Kind.SHORTENED: Wording(
        "only {seconds:.2f} s of the steady part were read; give --start and --seconds to read another part",
        {"seconds": "length that was read, s"},
    ),
    Kind.CALIBRATING: Wording("calibrating: {what}", {"what": "the step of the calibration, in words"}),
}
WORDINGS: Mapping[Kind, Wording] = MappingProxyType(
    {
        **_WORDINGS,
        **{
            kind: Wording(template, values)
            for kind, (template, values) in (POWER_WORDS | PREFLIGHT_WORDS | AROUND_WORDS).items()
        },
    }
)

_STATES = {
    State.OK: "sound reading",
    State.OVERLOAD: "the interface is overloaded, not the amplifier",
    State.NO_TONE: "no tone",
    State.UNSTEADY: "the signal is not steady",
    State.TOO_SHORT: "too short to be read",
    State.GAP: "frames are missing",
}


class _Signed(Formatter):
    """Formats numbers with a minus sign in the place of a hyphen; words stay as they are."""

    def format_field(self, value: Any, format_spec: str) -> str:  # noqa: ANN401 - the base class is typed so
        text = str(super().format_field(value, format_spec))
        return text if isinstance(value, str) else text.replace("-", "\N{MINUS SIGN}").replace("inf", "\N{INFINITY}")


def sentence(note: Note) -> str:
    """Return a note in plain words, without a full stop.

    Raises:
        ValueError: the note lacks a value that its sentence needs.
    """
    given = dict(note.values)
    missing = sorted(WORDINGS[note.kind].values.keys() - given.keys())
    if missing:
        raise ValueError(f"the note '{note.kind}' lacks {', '.join(missing)}; its sentence needs them")
    return _Signed().vformat(WORDINGS[note.kind].template, (), given)


def state_words(state: State) -> str:
    """Return what a state means, in plain words."""
    return _STATES[state]
