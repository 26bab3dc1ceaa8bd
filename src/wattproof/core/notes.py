"""Remarks on a reading, kept as data; `core.wording` turns them into sentences in one place."""

from enum import StrEnum

import attrs


class Kind(StrEnum):
    """What a note says. The values are stable: they are stored."""

    STARTS_LATE = "starts late"
    ENDS_EARLY = "ends early"
    BREAK = "break"
    LEVEL_MOVES = "level moves"
    OVERLOADED = "overloaded"
    GAP = "gap"
    TOO_FEW_CYCLES = "too few cycles"
    NO_TONE = "no tone"
    ONLY_MAINS = "only mains"
    LEVEL_STEP = "level step"
    SECOND_TONE = "second tone"
    CARRIER = "carrier"
    NO_HARMONIC_IN_BAND = "no harmonic in band"
    FUNDAMENTAL_OUTSIDE_BAND = "fundamental outside band"
    STRONGER_LINE = "stronger line"
    BAND_CUT = "band cut"
    CUT_SHORT = "cut short"
    NOT_AS_NAMED = "not as named"
    DAMAGED = "damaged"
    HARMONICS_CUT = "harmonics cut"
    SHORTENED = "shortened"


@attrs.frozen
class Note:
    """One remark: its kind and the numbers or words that its sentence needs, by name."""

    kind: Kind
    values: tuple[tuple[str, float | str], ...] = ()


def note(kind: Kind, **values: float | str) -> Note:
    """Build a note from named values."""
    return Note(kind, tuple(values.items()))
