"""Names and signs come out so that the place they go to can show them."""

import pytest

from wattproof.report.characters import encodable, in_ascii, printable


@pytest.mark.parametrize(
    ("text", "shown"),
    [
        ("tag 31, left.flac", "tag 31, left.flac"),
        ("Überprüfung Ω ± −.wav", "Überprüfung Ω ± −.wav"),
        ("two\nlines\r\t", "two\\nlines\\r\\t"),
        ("\x1b[31mred", "\\x1b[31mred"),
        ("\u2028\u202egnp.wav", "\\u2028\\u202egnp.wav"),
        ("\udcff\udc80", "\\xff\\x80"),
        ("\ud800", "\\ud800"),
    ],
)
def test_a_name_stays_in_one_line_and_holds_nothing_hidden(text: str, shown: str) -> None:
    assert printable(text) == shown
    printable(text).encode()


def test_a_name_for_programs_keeps_all_that_is_text() -> None:
    assert encodable("two\nlines Ω \udcff \ud800.wav") == "two\nlines Ω \\xff \\ud800.wav"


def test_the_trade_s_signs_have_ascii_spellings() -> None:
    assert in_ascii("−6.02 dBFS ± 0.10, 8 Ω, 5 µV, 90°") == "-6.02 dBFS +- 0.10, 8 ohm, 5 uV, 90 deg"


def test_any_other_character_becomes_its_escape() -> None:
    assert in_ascii("café") == "caf\\xe9"
