"""A bench is named together with its rate and sockets, and what cannot be is refused in one line."""

import pytest

from wattproof.core.errors import WrongUseError
from wattproof.core.opening import Opening, named_opening


@pytest.mark.parametrize(
    ("text", "name", "opening"),
    [
        ("JACK/loopback", "JACK/loopback", Opening()),
        ("JACK/loopback rate=48000", "JACK/loopback", Opening(48_000.0)),
        ("ALSA/Box: USB Audio (hw:1,0) in=3,4 rate=96000 out=7", "ALSA/Box: USB Audio (hw:1,0)",
         Opening(96_000.0, (3, 4), (7,))),
        ("simulated:class-d-bridge rate=192000", "simulated:class-d-bridge", Opening(192_000.0)),
        ("ASIO/rate=1 inside a name", "ASIO/rate=1 inside a name", Opening()),
    ],
)  # fmt: skip
def test_what_stands_behind_the_name_is_taken_off_and_read(text: str, name: str, opening: Opening) -> None:
    assert named_opening(text) == (name, opening)


@pytest.mark.parametrize(
    ("text", "words"),
    [
        ("JACK/x rate=fast", "give the rate in Hz"),
        ("JACK/x rate=96", "give the rate in Hz"),
        ("JACK/x rate=", "give the rate in Hz"),
        ("JACK/x in=", "in=: give one socket or two"),
        ("JACK/x in=0", "counted from 1"),
        ("JACK/x out=1,1", "out=1,1: give one socket or two"),
        ("JACK/x out=1,2,3", "one socket or two"),
        ("JACK/x in=1 in=2", "twice"),
    ],
)
def test_what_cannot_be_is_refused_in_one_line(text: str, words: str) -> None:
    with pytest.raises(WrongUseError, match=words) as refused:
        named_opening(text)
    assert "\n" not in str(refused.value)
