"""Options take numbers as people write them, and refuse everything else with what to give instead."""

from collections.abc import Callable

import click
import pytest

from wattproof.cli.read_values import amount, band, channel

CTX = click.Context(click.Command("read"))
PARAM = click.Option(["--any"])


@pytest.mark.parametrize(("text", "number"), [("8", 8.0), ("0.5", 0.5), (".5", 0.5), ("1e3", 1000.0), ("+4.", 4.0)])
def test_an_amount_is_a_number_as_people_write_it(text: str, number: float) -> None:
    assert amount("ohm", "--load 8", 1e-3, 1e6)(CTX, PARAM, text) == number


@pytest.mark.parametrize(
    "text", ["0", "-1", "1e-4", "2e6", "nan", "inf", "1e999", "", " 8", "8 ohm", "0x8", "1_0", "٣", "8,5", "\udcff"]
)
def test_anything_else_is_no_amount(text: str) -> None:
    with pytest.raises(click.BadParameter, match=r"is no number of ohm from 0\.001 to 1e\+06; give --load 8"):
        amount("ohm", "--load 8", 1e-3, 1e6)(CTX, PARAM, text)


def test_both_bounds_of_an_amount_belong_to_it() -> None:
    seconds = amount("s", "--start 1", 0.0, 2.0)
    assert [seconds(CTX, PARAM, text) for text in ("0", "2")] == [0.0, 2.0]
    for text in ("-0.1", "2.1"):
        with pytest.raises(click.BadParameter, match="from 0 to 2; give --start 1"):
            seconds(CTX, PARAM, text)


@pytest.mark.parametrize(
    ("text", "edges"),
    [
        ("20-20000", (20.0, 20_000.0)),
        ("0-1e3", (0.0, 1000.0)),
        ("1e-2-2e4", (0.01, 20_000.0)),
        ("22.5-22.6", (22.5, 22.6)),
    ],
)
def test_a_band_is_two_numbers_with_a_dash(text: str, edges: tuple[float, float]) -> None:
    assert band(CTX, PARAM, text) == edges


@pytest.mark.parametrize(
    "text", ["20", "20-", "-20000", "-20-20000", "20--20000", "nan-20000", "20-inf", "20-1e999", "a-b", "", "20-30-40"]
)
def test_a_band_that_is_none_is_refused(text: str) -> None:
    with pytest.raises(click.BadParameter, match="is no band in Hz; give LO-HI"):
        band(CTX, PARAM, text)


@pytest.mark.parametrize("text", ["20000-20", "20-20"])
def test_a_reversed_or_empty_band_is_refused(text: str) -> None:
    with pytest.raises(click.BadParameter, match="reversed or empty; give the lower edge first"):
        band(CTX, PARAM, text)


def test_channels_count_from_one_or_are_all() -> None:
    assert [channel(CTX, PARAM, text) for text in ("all", "1", "12", "02")] == [None, 1, 12, 2]


@pytest.mark.parametrize("text", ["0", "-1", "1.0", "left", "", "99999999999", "²"])
def test_anything_else_is_no_channel(text: str) -> None:
    with pytest.raises(click.BadParameter, match="they count from 1"):
        channel(CTX, PARAM, text)


@pytest.mark.parametrize("convert", [amount("s", "1", 0.0, 9.0), band])
def test_an_option_that_was_not_given_stays_open(convert: Callable[..., object]) -> None:
    assert convert(CTX, PARAM, None) is None


def test_a_very_long_value_is_cut_in_the_message() -> None:
    with pytest.raises(click.BadParameter) as refused:
        band(CTX, PARAM, "x" * 100_000)
    assert len(refused.value.message) < 200
