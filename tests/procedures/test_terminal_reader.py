"""The live reader at the terminals: what it reads is brought to volts, the picture's reading too."""

import numpy as np

from tests.procedures.fake_reader import FakeReader
from tests.procedures.test_absolute import CALIBRATION, RIG
from wattproof.core.reading import ReadingSettings
from wattproof.core.signal import Capture
from wattproof.procedures.terminal_reader import TerminalReader

RATE_HZ = 48_000.0


def test_readings_and_picture_come_in_volts() -> None:
    inner = FakeReader(RATE_HZ, (ReadingSettings(), ReadingSettings()))
    reader = TerminalReader(inner, lambda: RIG, CALIBRATION)
    samples = np.stack([0.5 * np.sin(0.13 * np.arange(4_800)), np.zeros(4_800)], axis=1)
    readings, picture = reader.take(Capture(samples, RATE_HZ), 1)
    assert picture is not None
    assert picture.reading == readings[0]
    assert readings[0].level_vrms is not None
    assert readings[1].level_vrms is None  # no channel of the rig
    reader.restart(997.0)
    assert inner.restarts == [997.0]
    assert reader.next_frames == inner.next_frames
