"""The table for people states every figure that the reading has, rounded to what is known of it."""

import attrs
import pytest

from wattproof.core.notes import Kind, note
from wattproof.core.quantity import measured
from wattproof.core.reading import Mains, Reading, ReadingSettings, Reference, State
from wattproof.report.reading_table import reading_table
from wattproof.report.source import Source


def line(table: str, name: str) -> str:
    """Return the words of the line that begins with a name, one space between them."""
    found = [text for text in table.splitlines() if text.strip().startswith(name)]
    assert len(found) == 1, f"{name} in {table}"
    return " ".join(found[0].split())


def test_the_head_says_which_file_which_band_and_what_ratios_are_taken_to(
    source: Source, sound_reading: Reading
) -> None:
    head = reading_table(source, (sound_reading,)).split("\n\n", maxsplit=1)[0]
    assert head.splitlines() == [
        "tag 31.flac",
        "48 kHz, 1 channel, 3.000 s",
        "Band 20 Hz to 20 kHz; ratios to the total in the band",
        "0 dBFS is 40 V rms; the load is 8 Ω",
        "± at 95 %, from the spread within this recording alone",
    ]


def test_the_reference_to_the_fundamental_is_said(source: Source, sound_reading: Reading) -> None:
    settings = ReadingSettings(10.0, 80_000.0, Reference.FUNDAMENTAL)
    table = reading_table(source, (attrs.evolve(sound_reading, settings=settings),))
    assert "Band 10 Hz to 80 kHz; ratios to the fundamental\n" in table
    assert "V rms" not in table


def test_each_figure_is_rounded_to_its_uncertainty_at_95_percent(source: Source, sound_reading: Reading) -> None:
    # 1.96 standard uncertainties, two digits of it (JCGM 100:2008, 7.2.6)
    table = reading_table(source, (sound_reading,))
    assert line(table, "Channel 1") == "Channel 1: ok, 0.500 s to 2.500 s"
    assert line(table, "THD+N") == "THD+N 1.0000 % ± 0.0020 −40.00 dB"
    assert line(table, "Noise") == "Noise 0.01000 % ± 0.00020 −80.00 dB"
    assert line(table, "Hum") == "Hum 0.000000 % ± 0.000020"
    assert line(table, "mains") == "mains 50.02 Hz 1 line"
    assert line(table, "SINAD") == "SINAD 40.000 dB ± 0.017"
    assert line(table, "Crest factor") == "Crest factor 1.4200 ± 0.0020"
    assert line(table, "Peak") == "Peak −6.02 dBFS"
    assert line(table, "DC") == "DC −0.01250 % FS ± 0.00020"


def test_hum_that_was_not_seen_is_no_figure(source: Source, sound_reading: Reading) -> None:
    quiet = attrs.evolve(sound_reading, hum=measured(0.0, 0.0, "1"), mains=Mains())
    assert line(reading_table(source, (quiet,)), "Hum") == "Hum none seen"


def test_a_figure_finer_than_six_digits_is_cut_and_its_uncertainty_bounded(
    source: Source, sound_reading: Reading
) -> None:
    table = reading_table(source, (sound_reading,))
    assert line(table, "Fundamental") == "Fundamental 997.000 Hz ± < 0.001 −6.02 dBFS"
    exact = attrs.evolve(sound_reading, power_w=measured(1.0 / 3.0, 0.0, "W"))
    assert line(reading_table(source, (exact,)), "Power") == "Power 0.333333 W"


def test_without_a_scale_the_level_stands_in_dbfs(source: Source, sound_reading: Reading) -> None:
    unscaled = attrs.evolve(sound_reading, level_vrms=None, power_w=None, settings=ReadingSettings())
    table = reading_table(source, (unscaled,))
    assert line(table, "Level") == "Level −6.02060 dBFS ± 0.00034"
    assert "Power" not in table


def test_harmonics_that_were_seen_are_listed_and_doubtful_ones_marked(source: Source, sound_reading: Reading) -> None:
    table = reading_table(source, (sound_reading,))
    assert line(table, "Harmonics") == "Harmonics seen, to the fundamental; * may contain mains"
    assert line(table, "H3") == "H3 1.00 % −40.0 dB H20* 0.00100 % −100.0 dB"
    assert "H2 " not in table


def test_a_state_other_than_ok_is_named_with_its_note_and_no_figure_is_invented(
    source: Source, sound_reading: Reading
) -> None:
    overload = note(Kind.OVERLOADED, percent=3.0, longest_frames=9, add_db=6.0)
    hot = Reading(
        span=sound_reading.span, channel=2, settings=ReadingSettings(), state=State.OVERLOAD, notes=(overload,)
    )
    block = reading_table(source, (sound_reading, hot)).split("\n\n")[2]
    assert block.splitlines() == [
        "Channel 2: overload, 0.500 s to 2.500 s",
        "  Note: 3 % of samples at full scale, up to 9 in a row; the interface is",
        "        overloaded, not the amplifier: add 6 dB of attenuation or turn the input",
        "        gain down",
    ]


@pytest.mark.parametrize("width", [60, 80, 100])
def test_no_line_is_wider_than_asked_for(source: Source, sound_reading: Reading, width: int) -> None:
    every = tuple(note(kind, db=-34.2, at_s=1.0, db_per_s=6.0) for kind in (Kind.CARRIER, Kind.LEVEL_MOVES))
    many = tuple(attrs.evolve(sound_reading.harmonics[2], order=order) for order in range(2, 24))
    table = reading_table(source, (attrs.evolve(sound_reading, notes=every, harmonics=many),), width=width)
    assert max(map(len, table.splitlines())) <= width
    cells = " ".join(table.split())
    assert all(f"H{order}* 0.00100 % −100.0 dB" in cells for order in range(2, 24))


def test_in_ascii_the_columns_still_stand_under_each_other(source: Source, sound_reading: Reading) -> None:
    table = reading_table(source, (sound_reading,), ascii_only=True)
    assert table.isascii()
    assert line(table, "THD+N") == "THD+N 1.0000 % +- 0.0020 -40.00 dB"
    rows = [text for text in table.splitlines() if text.strip().startswith(("THD+N", "THD ", "Noise"))]
    assert {row.index("+-") for row in rows} == {rows[0].index("+-")}
    assert {row.index("dB") for row in rows} == {rows[0].index("dB")}


def test_brackets_in_a_file_name_are_no_styling(source: Source, sound_reading: Reading) -> None:
    named = attrs.evolve(source, file="[bold]tag[/bold] :amplifier: \udcff.wav")
    table = reading_table(named, (sound_reading,), colour=True)
    assert "[bold]tag[/bold] :amplifier: \\xff.wav" in table


def test_colour_is_only_there_when_asked_for(source: Source, sound_reading: Reading) -> None:
    assert "\x1b[" not in reading_table(source, (sound_reading,))
    assert "\x1b[" in reading_table(source, (sound_reading,), colour=True)
