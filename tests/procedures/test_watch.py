"""A watch sounds what is wanted, reads without a hole, and cuts its blocks as long as the reader wants them."""

from collections.abc import Iterator
from itertools import pairwise

import attrs
import numpy as np
import pytest

from tests.procedures.fake_reader import FakeReader
from wattproof.core.calibration import Calibration, Scale
from wattproof.core.errors import StoppedError, WrongUseError
from wattproof.core.fields import fields_of
from wattproof.core.quantity import Quantity
from wattproof.core.reading import ReadingSettings
from wattproof.core.rig import Attenuator, Load, Rig, Wiring
from wattproof.core.signal import Capture, Tone
from wattproof.procedures.requests import Acquire, Play, Procedure, Shown, Wanted, Wishes
from wattproof.procedures.watch import Watch, reading_settings, watch

RATE_HZ = 48_000.0
OFF = Wishes(tone_on=False, frequency_hz=997.0, level_fs=0.1)
ON = Wishes(tone_on=True, frequency_hz=997.0, level_fs=0.1)
PLAN = Watch()


class Table:
    """Answers a watch as a runner would, with a tone whose level may move; `wishes` may be changed between steps."""

    def __init__(self, wishes: Wishes = ON, *, db_per_s: float = 0.0, outputs: tuple[int, ...] = (1, 2)) -> None:
        self.wishes = wishes
        self.db_per_s = db_per_s
        self.reader = FakeReader(RATE_HZ, (ReadingSettings(), ReadingSettings()))
        self.procedure: Procedure = watch(PLAN, self.reader, RATE_HZ, outputs)
        self.played: list[Tone] = []
        self.acquired: list[Acquire] = []
        self.starts: list[int] = []
        self._stands: int | None = None
        self._last = (0, 0)

    def shown(self, count: int) -> list[Shown]:
        """Drive the watch until it has shown so many readings."""
        return [record for _, record in zip(range(count), self._records(), strict=False)]

    def _records(self) -> Iterator[Shown]:
        item = next(self.procedure)
        while True:
            match item:
                case Wanted():
                    item = self.procedure.send(self.wishes)
                case Play(tone):
                    self.played.append(tone)
                    self._stands = self._last[1]
                    item = self.procedure.send(self._stands)
                case Acquire():
                    item = self.procedure.send(self._block(item))
                case Shown():
                    yield item
                    item = next(self.procedure)
                case _:
                    pytest.fail(f"a watch has no use for {item}")

    def _block(self, request: Acquire) -> Capture:
        self.acquired.append(request)
        start, end = self._last
        if self._stands is not None:
            first, self._stands = self._stands + round(request.settle_s * RATE_HZ), None
        else:
            first = end if request.hop is None else start + request.hop
        self._last = (first, first + request.frames)
        seconds = np.arange(first, first + request.frames) / RATE_HZ
        wave = 0.01 * 10.0 ** (self.db_per_s * seconds / 20.0) * np.sin(2.0 * np.pi * 997.0 * seconds)
        return Capture(np.stack([wave, wave], axis=1), RATE_HZ, first)


def test_the_tone_sounds_first_at_what_is_wanted_and_the_reader_starts_from_its_frequency() -> None:
    table = Table(ON)
    table.shown(3)
    assert table.played == [Tone(997.0, 0.1, (1, 2))]
    assert table.reader.restarts == [997.0]
    assert table.acquired[0].settle_s == PLAN.settle_s
    assert [request.settle_s for request in table.acquired[1:]] == [0.0] * (len(table.acquired) - 1)


def test_without_a_tone_silence_is_played_and_the_reader_waits_at_the_wanted_frequency() -> None:
    table = Table(OFF)
    table.shown(2)
    assert table.played == [Tone(997.0, 0.0, (1, 2))]
    assert table.reader.restarts == [997.0]


def test_without_an_output_the_reader_looks_for_whatever_tone_there_is() -> None:
    table = Table(OFF, outputs=())
    table.shown(2)
    assert table.reader.restarts == [None]


@pytest.mark.parametrize(
    "changed",
    [
        Wishes(tone_on=True, frequency_hz=60.0, level_fs=0.1),
        Wishes(tone_on=True, frequency_hz=997.0, level_fs=0.2),
        Wishes(tone_on=False, frequency_hz=997.0, level_fs=0.1),
    ],
    ids=["frequency", "level", "off"],
)
def test_a_changed_wish_is_played_and_settles_before_it_is_read(changed: Wishes) -> None:
    table = Table(ON)
    table.shown(3)
    before = len(table.acquired)
    table.wishes = changed
    table.shown(2)
    assert len(table.played) == 2
    assert table.played[1].level_fs == (changed.level_fs if changed.tone_on else 0.0)
    assert table.acquired[before].settle_s == PLAN.settle_s
    assert table.acquired[before].hop is None


def test_another_channel_only_changes_the_picture() -> None:
    table = Table(ON)
    table.shown(2)
    table.wishes = Wishes(tone_on=True, frequency_hz=997.0, level_fs=0.1, channel=2)
    shown = table.shown(2)[-1]
    assert shown.picture is not None
    assert shown.picture.reading.channel == 2
    assert len(table.played) == 1


def test_a_still_level_gives_at_least_twenty_readings_a_second_from_quarter_second_blocks() -> None:
    table = Table(ON)
    table.shown(60)
    ends = np.array([end for _, end in table.reader.spans[10:]])
    lengths = {end - first for first, end in table.reader.spans[10:]}
    assert lengths == {round(0.25 * RATE_HZ)}
    assert np.diff(ends).max() <= RATE_HZ / 20.0


def test_blocks_shorten_while_the_level_moves_and_no_reading_is_older_than_its_block() -> None:
    table = Table(ON, db_per_s=6.0)
    table.shown(20)
    spans = table.reader.spans[3:]
    assert {end - first for first, end in spans} == {round(0.05 * RATE_HZ)}
    steps = [later[1] - earlier[1] for earlier, later in pairwise(spans)]
    assert max(steps) <= RATE_HZ / 20.0


def test_every_frame_is_read_and_no_block_starts_before_the_last_one_when_lengths_change() -> None:
    table = Table(ON)
    for db_per_s in (0.0, 20.0, 0.0, 6.0, 0.0):
        table.db_per_s = db_per_s
        table.shown(12)
    spans = table.reader.spans
    for (first, end), (next_first, next_end) in pairwise(spans):
        assert first < next_first <= end
        assert next_end > end


def test_a_low_tone_gets_the_cycles_that_a_fit_needs() -> None:
    table = Table(Wishes(tone_on=True, frequency_hz=8.0, level_fs=0.1))
    table.shown(2)
    assert table.acquired[0].frames == round(3 / 8.0 * RATE_HZ)


def test_a_tone_far_too_low_is_not_waited_for() -> None:
    table = Table(Wishes(tone_on=True, frequency_hz=0.01, level_fs=0.1))
    table.shown(1)
    assert table.acquired[0].frames == RATE_HZ


def test_a_block_that_gives_no_reading_is_not_shown() -> None:
    table = Table(ON)
    table.reader.unfit_blocks = 1
    assert table.shown(2)[0].readings[0].span.first_frame > table.reader.spans[0][0]


def test_a_tone_that_the_limit_refuses_leaves_the_watch_reading_in_silence() -> None:
    procedure = watch(PLAN, FakeReader(RATE_HZ, ()), RATE_HZ)
    next(procedure)
    assert procedure.send(ON) == Play(Tone(997.0, 0.1, (1,)))
    assert procedure.throw(WrongUseError("above the limit")) == Play(Tone(997.0, 0.0, (1,)))
    assert isinstance(procedure.send(0), Acquire)


def test_a_stop_ends_it_where_it_stands() -> None:
    procedure = watch(PLAN, FakeReader(RATE_HZ, ()), RATE_HZ)
    next(procedure)
    with pytest.raises(StoppedError):
        procedure.throw(StoppedError(""))


def test_settings_are_volts_at_the_amplifier_and_power_in_the_measured_load() -> None:
    scales = tuple(Scale(socket, Quantity(2.0, "V"), "typed", "2026-01-01") for socket in (1, 2))
    load = Load(nominal_ohm=8.0, measured_ohm=8.07)
    rig = Rig(wirings=(Wiring(input=2, load=load, attenuator=Attenuator(ratio=10.0)),))
    unwired, wired = reading_settings(rig, Calibration(inputs=scales), 2)
    assert (unwired.full_scale_vrms, unwired.load_ohm) == (2.0, None)
    assert (wired.full_scale_vrms, wired.load_ohm) == (20.0, 8.07)


def test_an_input_of_unknown_scale_is_read_in_dbfs_only() -> None:
    assert reading_settings(Rig(), Calibration(), 1) == (ReadingSettings(),)


def test_every_field_of_the_plan_is_declared() -> None:
    names = {field.name for field in fields_of(Watch)}
    assert names == {field.name for field in attrs.fields(Watch)}


def test_a_plan_whose_shortest_block_is_the_longer_one_cannot_be_built() -> None:
    with pytest.raises(ValueError, match=r"shortest block, 0\.5 s, is longer than the longest, 0\.25 s"):
        Watch(shortest_s=0.5)
