"""What a check of sessions found, as a JSON document for programs and in lines for people.

The contract of the document, version 1. Readers ignore keys that they don't know; it is ASCII.

    {"wattproof": "recheck", "version": 1, "sessions": [{"file", "sound": bool, "readings", "reproduced", "let_go",
     "unread", "largest_in_u": x, "hash": head of the chain, "expected": "" | hash, "faults": [sentences],
     "differences": [{"run", "number", "why"}]}]}

`let_go` counts readings whose raw capture was let go by choice of their run, `unread` those that state no figure.
"""

from collections.abc import Iterator, Sequence

from wattproof.core.rechecked import Rechecked
from wattproof.report.characters import printable

_MOST_SHOWN = 20


def recheck_document(outcomes: Sequence[Rechecked]) -> dict[str, object]:
    """Return the document as plain values."""
    return {"wattproof": "recheck", "version": 1, "sessions": [_entry(outcome) for outcome in outcomes]}


def _entry(outcome: Rechecked) -> dict[str, object]:
    return {
        "file": printable(outcome.path),
        "sound": outcome.sound,
        "readings": outcome.readings,
        "reproduced": outcome.reproduced,
        "let_go": outcome.let_go,
        "unread": outcome.unread,
        "largest_in_u": outcome.largest,
        "hash": outcome.head,
        "expected": outcome.expected,
        "faults": [printable(fault) for fault in outcome.faults],
        "differences": [{"run": each.run, "number": each.number, "why": each.why} for each in outcome.differences],
    }


def recheck_lines(outcome: Rechecked) -> Iterator[str]:
    """Yield what a person reads of one session."""
    name = printable(outcome.path)
    able = outcome.readings - outcome.let_go - outcome.unread
    line = f"{name}: {outcome.reproduced} of {able} readings reproduced"
    if outcome.reproduced:
        line += f", largest difference {outcome.largest:.1g} of its uncertainty"
    yield line
    if outcome.let_go:
        yield f"  {outcome.let_go} more have no raw capture, by choice of their run"
    if outcome.unread:
        yield f"  {outcome.unread} more were refused while measuring and state no figure"
    for fault in outcome.faults[:_MOST_SHOWN]:
        yield f"  wrong: {printable(fault)}"
    for each in outcome.differences[:_MOST_SHOWN]:
        yield f"  differs: run {each.run}, reading {each.number}: {printable(each.why)}"
    more = max(len(outcome.faults) - _MOST_SHOWN, 0) + max(len(outcome.differences) - _MOST_SHOWN, 0)
    if more:
        yield f"  and {more} more; --json lists all"
    yield f"  {verdict(outcome)}"
    yield f"  hash {outcome.head}" if outcome.head else "  no hash can be read"


def verdict(outcome: Rechecked) -> str:
    """Return what the check comes to: without a hash from elsewhere it never says untouched."""
    if not outcome.sound:
        return "not as it was written or measured"
    if outcome.expected:
        return "untouched since the hash was given"
    return "consistent (give --expect HASH from the report to know that nothing was cut off or rewritten)"
