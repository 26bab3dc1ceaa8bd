"""The table of a power statement, its paragraph, and what a person is asked."""

import attrs
import pytest

from tests.procedures.paper_amplifier import Paper
from tests.report.test_power_document import PLAN, stated
from wattproof.core.quantity import Quantity, measured
from wattproof.procedures.power_plan import Preset
from wattproof.procedures.power_rows import rows_of
from wattproof.procedures.requests import Action, Ask
from wattproof.procedures.statement import conclude
from wattproof.report.power_table import power_table
from wattproof.report.power_words import asked, figure, paragraph


def test_the_table_has_a_row_for_each_point_of_each_load() -> None:
    table = power_table(stated(), width=100)
    for words in ("onset", "1 %", "10 %"):
        assert sum(line.split("  ")[0].strip() == "1" and words in line for line in table.splitlines()) >= 2
    assert max(len(line) for line in table.splitlines()) <= 100


def test_the_paragraph_says_it_in_plain_language() -> None:
    text = paragraph(stated(attrs.evolve(PLAN, loads="8")))
    assert text.startswith("Into 8.0 Ω, 15.0 V supply, left channel, one channel driven, 997 Hz: 12.5")
    assert "W at the onset of clipping" in text
    assert "W at 1 % THD+N" in text
    assert "W at 10 % THD+N; the box says 50 W." in text
    assert "continuous" in text


def test_momentary_values_are_never_called_continuous() -> None:
    text = paragraph(stated(attrs.evolve(PLAN, loads="8", hold_s=0.0)))
    assert "momentary values and no continuous power" in text


def test_a_missing_point_is_explained() -> None:
    text = paragraph(stated(attrs.evolve(PLAN, loads="8", drive_vrms=0.1)))
    assert "no power could be stated" in text
    assert "THD+N does not rise through 1 %" in text


@pytest.mark.parametrize("preset", list(Preset))
def test_the_word_conforms_is_never_printed(preset: Preset) -> None:
    table = power_table(stated(attrs.evolve(PLAN, preset=preset)), width=100)
    assert "conform" not in table.lower()
    assert ("unverified, read the text" in " ".join(table.split())) == (preset is not Preset.NONE)


def test_the_onset_is_defined_under_every_table() -> None:
    assert "non-negative least-squares" in " ".join(power_table(stated(), width=80).split())


def test_in_ascii_nothing_else_is_left() -> None:
    assert power_table(stated(), width=80, ascii_only=True).isascii()


def test_nothing_kept_is_said() -> None:
    empty = conclude(PLAN, rows_of(PLAN, Paper().place()), [])
    assert "no power can be stated" in power_table(empty)


@pytest.mark.parametrize(
    ("quantity", "text"),
    [
        (measured(8.912, 0.1, "W"), "8.91 ± 0.20 W"),
        (measured(8.9811, 1e-7, "V"), "8.9811 ± < 0.0001 W"),
        (Quantity(0.5, "W"), "0.50000 ± < 1e-05 W"),
        (None, "–"),
    ],
)
def test_a_figure_shows_no_more_than_is_known(quantity: Quantity | None, text: str) -> None:
    assert figure(quantity, "W") == text


def test_every_question_has_its_words() -> None:
    asks = [Ask(Action.TURN, want) for want in ("full", "down", "up", "back", "leave")]
    asks += [Ask(Action.CONFIRM, "8"), Ask(Action.CONFIRM, "here")]
    asks += [Ask(Action.SWITCH_LOAD, 4.0), Ask(Action.SWITCH_CHANNEL, 2.0)]
    words = [asked(ask) for ask in asks]
    assert len(set(words)) == len(asks)
    assert all("silence" in asked(ask) for ask in asks[-2:])
