"""A reading as it may come out of a recording, for the tests of what is made of readings."""

import pytest

from wattproof.core.quantity import measured
from wattproof.core.reading import Harmonic, Mains, MainsLine, Reading, ReadingSettings, Remark, State
from wattproof.core.signal import Span
from wattproof.report.source import Source


@pytest.fixture
def source() -> Source:
    return Source("tag 31.flac", rate_hz=48_000.0, frames=144_000, channels=1, sha256="5e" * 32)


@pytest.fixture
def sound_reading() -> Reading:
    """-6.02 dBFS, 20 V into 8 ohm, 1 % THD+N to the total, nearly all of it third harmonic."""
    return Reading(
        span=Span(24_000, 96_000, 48_000.0),
        channel=1,
        settings=ReadingSettings(full_scale_vrms=40.0, load_ohm=8.0),
        state=State.OK,
        fundamental_hz=measured(997.0, 2e-5, "Hz"),
        fundamental_fs=measured(0.499975, 1e-5, "1"),
        level_fs=measured(0.5, 1e-5, "1"),
        level_vrms=measured(20.0, 4e-4, "V"),
        power_w=measured(50.0, 2e-3, "W"),
        dc_fs=measured(-1.25e-4, 1e-6, "1"),
        peak_fs=0.5,
        crest_factor=measured(1.42, 1e-3, "1"),
        thdn=measured(0.01, 1e-5, "1"),
        thd=measured(0.0099995, 1e-5, "1"),
        noise=measured(1e-4, 1e-6, "1"),
        hum=measured(0.0, 1e-7, "1"),
        mains=Mains(50.02, (MainsLine(100.04, measured(2e-6, 1e-7, "1")),)),
        harmonics=(
            Harmonic(2, 1994.0, measured(1e-7, 1e-6, "1"), 0.5, Remark.NOT_SEEN),
            Harmonic(3, 2991.0, measured(0.0099995, 1e-6, "1"), 3.141592653589793),
            Harmonic(20, 19_940.0, measured(1e-5, 1e-6, "1"), -0.5, Remark.MAY_CONTAIN_MAINS),
        ),
    )
