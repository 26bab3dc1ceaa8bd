"""What comes next, in one line for the hand: chosen from the newest reading by plain comparisons. Pure."""

from wattproof.core.reading import Reading, State
from wattproof.gui import text

_FIRST, _SECOND = 0.01, 0.10  # the distortions at which rated output is usually stated (common practice, no source)


def hint_for(reading: Reading | None, *, tone_on: bool | None) -> str:
    """Return the next step; `tone_on` is None where the bench can't sound a tone."""
    if not tone_on:
        return "" if tone_on is None else text.NEXT_START
    if reading is None:
        return ""
    if reading.state is not State.OK or reading.thdn is None:
        return {State.OVERLOAD: text.NEXT_UNLOAD, State.NO_TONE: text.NEXT_CHECK}.get(reading.state, "")
    if reading.thdn.value >= _SECOND:
        return text.NEXT_BACK
    return text.next_line(round(100 * (_FIRST if reading.thdn.value < _FIRST else _SECOND)))
