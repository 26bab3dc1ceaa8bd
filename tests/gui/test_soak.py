"""A thousand frames leave memory and reference counts as they were."""

import gc
import resource
import sys
from pathlib import Path
from typing import TYPE_CHECKING

import pytest

from tests.gui.conftest import Frames
from tests.gui.fake_runner import FakeRunner

if TYPE_CHECKING:
    from wattproof.gui.window import Window

pytestmark = pytest.mark.display

WARM_UP, SOAK = 200, 1000
MOST_REFERENCES = 300  # below one in three frames: a leak of one reference per frame would be a thousand
MOST_GROWTH_MB = 4.0  # one picture of the window is 8 MB, a leaked array per frame 10 kB x 1000; measured 0.0-0.6


def resident_mb() -> float:
    pages = int(Path("/proc/self/statm").read_text(encoding="ascii").split()[1])
    return pages * resource.getpagesize() / 1e6


def test_memory_and_reference_counts_stay_flat(window: "Window", runner: FakeRunner, frames: Frames) -> None:
    def soak(count: int) -> None:
        for index in range(count):
            if index % 20 == 0:
                window.turn_knob(1.0 if index % 400 < 200 else -1.0)
            frames(1)

    soak(WARM_UP)
    gc.collect()
    singletons = (None, True, False)
    before, memory = [sys.getrefcount(one) for one in singletons], resident_mb()
    soak(SOAK)
    gc.collect()
    after, grown = [sys.getrefcount(one) for one in singletons], resident_mb() - memory
    for one, count, first in zip(singletons, after, before, strict=True):
        assert abs(count - first) < MOST_REFERENCES, f"{one}: {first} became {count}"
    assert grown < MOST_GROWTH_MB
    assert runner.blocks == WARM_UP + SOAK
