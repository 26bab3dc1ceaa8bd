"""The resistors that a planner chooses from are those that are sold."""

import itertools

import pytest
from hypothesis import given
from hypothesis import strategies as st

from wattproof.dsp.eseries import LEAST_OHM, MOST_OHM, Series, at_most, between, mantissas, values

# IEC 60063:2015
E24 = "10 11 12 13 15 16 18 20 22 24 27 30 33 36 39 43 47 51 56 62 68 75 82 91"
E96 = """100 102 105 107 110 113 115 118 121 124 127 130 133 137 140 143 147 150 154 158 162 165 169 174 178 182 187 191
196 200 205 210 215 221 226 232 237 243 249 255 261 267 274 280 287 294 301 309 316 324 332 340 348 357 365 374 383 392
402 412 422 432 442 453 464 475 487 499 511 523 536 549 562 576 590 604 619 634 649 665 681 698 715 732 750 768 787 806
825 845 866 887 909 931 953 976"""


def test_e24_is_the_table_of_the_standard() -> None:
    assert [round(10 * mantissa) for mantissa in mantissas(Series.E24)] == [int(value) for value in E24.split()]


def test_e96_is_the_table_of_the_standard() -> None:
    assert [round(100 * mantissa) for mantissa in mantissas(Series.E96)] == [int(value) for value in E96.split()]


@pytest.mark.parametrize("series", Series)
def test_the_values_ascend_over_seven_decades(series: Series) -> None:
    every = values(series)
    assert len(every) == 7 * len(mantissas(series)) + 1
    assert (every[0], every[-1]) == (LEAST_OHM, MOST_OHM)
    assert all(low < high for low, high in itertools.pairwise(every))


def test_a_value_is_written_as_it_is_printed_on_the_reel() -> None:
    assert [f"{ohm!r}" for ohm in between(Series.E96, 2740.0, 2870.0)] == ["2740.0", "2800.0", "2870.0"]
    assert between(Series.E24, 8.0, 9.0) == (8.2,)
    assert between(Series.E24, 8.3, 9.0) == ()


@given(st.sampled_from(Series), st.floats(LEAST_OHM, MOST_OHM))
def test_the_nearest_value_below_is_no_more_than_a_step_away(series: Series, ohm: float) -> None:
    found = at_most(series, ohm)
    assert found is not None
    assert found in values(series)
    assert found <= ohm < found * 1.16  # the widest step of E24 is from 13 to 15, 15.4 %


def test_below_the_series_there_is_no_value() -> None:
    assert at_most(Series.E96, 0.99) is None
