"""Every note and state has its words, made from the values that its kind documents and no others."""

import ast
from string import Formatter

import pytest

from tests.house.sources import PACKAGE, modules, tree
from wattproof.core.notes import Kind, note
from wattproof.core.reading import State
from wattproof.core.wording import WORDINGS, sentence, state_words

_WORDS = {"why", "what", "named", "found"}  # the values that are words; the others are numbers


def _example(kind: Kind) -> dict[str, float | str]:
    return {name: "words" if name in _WORDS else -12.345 for name in WORDINGS[kind].values}


def test_every_kind_has_a_wording_and_no_other() -> None:
    assert set(WORDINGS) == set(Kind)


@pytest.mark.parametrize("kind", Kind)
def test_a_template_takes_the_documented_values_and_no_others(kind: Kind) -> None:
    taken = {name for _, name, _, _ in Formatter().parse(WORDINGS[kind].template) if name is not None}
    assert taken == set(WORDINGS[kind].values)
    assert all(WORDINGS[kind].values.values()), "each value says what it means"


@pytest.mark.parametrize("kind", Kind)
def test_every_note_is_one_plain_line_with_true_minus_signs(kind: Kind) -> None:
    text = sentence(note(kind, **_example(kind)))
    assert "{" not in text
    assert "\n" not in text
    assert not text.endswith(".")
    assert "-12" not in text


@pytest.mark.parametrize("kind", [kind for kind in Kind if WORDINGS[kind].values])
def test_a_note_that_lacks_a_value_is_refused_by_its_name(kind: Kind) -> None:
    given = _example(kind)
    lacking, _ = given.popitem()
    with pytest.raises(ValueError, match=rf"the note '{kind}' lacks {lacking}"):
        sentence(note(kind, **given))


def test_an_overload_names_the_interface_and_the_way_out() -> None:
    text = sentence(note(Kind.OVERLOADED, percent=1.3, longest_frames=12, add_db=10.0))
    assert text == (
        "1.3 % of samples at full scale, up to 12 in a row; the interface is overloaded, not the amplifier: "
        "add 10 dB of attenuation or turn the input gain down"
    )


def test_content_above_the_audio_band_is_called_oscillation_or_carrier() -> None:
    text = sentence(note(Kind.CARRIER, db=-32.04))
    assert text.startswith("oscillation or carrier: content above 20 kHz is −32.0 dB")


def test_a_tone_that_breaks_says_where_and_what_was_read() -> None:
    text = sentence(note(Kind.BREAK, at_s=2.31))
    assert text == "the tone breaks at 2.310 s: only the longest steady part was read"


def test_a_step_to_silence_is_infinite_not_a_code_word() -> None:
    assert "steps by −∞ dB at 1.500 s" in sentence(note(Kind.LEVEL_STEP, at_s=1.5, db=float("-inf")))


def test_words_within_a_note_keep_their_hyphens() -> None:
    assert "FLAC-in-WAV" in sentence(note(Kind.NOT_AS_NAMED, named="WAV", found="FLAC-in-WAV"))


def test_every_state_has_words_of_its_own() -> None:
    words = [state_words(state) for state in State]
    assert len(set(words)) == len(State)
    assert all(words)


def _notes_made() -> list[tuple[str, Kind, set[str]]]:
    """Return where the package makes a note, of which kind, and with which values."""
    made = []
    for path in modules(PACKAGE):
        for node in ast.walk(tree(path)):
            match node:
                case ast.Call(
                    func=ast.Name(id="note"),
                    args=[ast.Attribute(value=ast.Name(id="Kind"), attr=kind)],
                    keywords=keywords,
                ):
                    names = {keyword.arg or "**" for keyword in keywords}
                    made.append((f"{path.name}:{node.lineno}", Kind[kind], names))
                case _:
                    pass
    return made


def test_the_package_makes_notes_with_the_documented_values() -> None:
    made = _notes_made()
    assert made, "no note is made anywhere: the search is wrong"
    wrong = [(place, kind, names) for place, kind, names in made if names != set(WORDINGS[kind].values)]
    assert wrong == []
