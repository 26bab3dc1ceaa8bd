"""One measured session for the tests of reports and commands: the simulated bench, two loads, read by steps."""

import struct
import zlib
from pathlib import Path

from wattproof.app import make_measurement
from wattproof.bench.simulated import SimulatedBench
from wattproof.core.device import DeviceUnderTest
from wattproof.procedures.power_plan import StepsPlan
from wattproof.runner.keeping import SessionKeeper
from wattproof.store.session_file import SessionFile


def _chunk(name: bytes, content: bytes) -> bytes:
    return struct.pack(">I", len(content)) + name + content + struct.pack(">I", zlib.crc32(name + content))


# One grey pixel (PNG, ISO/IEC 15948)
PIXEL = (
    b"\x89PNG\r\n\x1a\n"
    + _chunk(b"IHDR", struct.pack(">IIBBBBB", 1, 1, 8, 0, 0, 0, 0))
    + _chunk(b"IDAT", zlib.compress(b"\x00\x80"))
    + _chunk(b"IEND", b"")
)


def measured_session(path: Path) -> str:
    """Measure the simulated bench into a session and return its hash."""
    plan = StepsPlan(
        hold_s=0.3, loads="8,4", step_db=3.0, read_s=0.3, rise_db_per_s=60.0, claimed_w=50.0, supply_v=15.0
    )
    bench = SimulatedBench(rate_hz=48_000.0)
    bench.open()
    try:
        with SessionFile(path) as session:
            session.describe(
                DeviceUnderTest(name="Kestrel <30> & co", serial="0042", claim="2 × 50 W", tested_by="J. M.")
            )
            session.add_photo(PIXEL, "front.png")
            session.note("output stage renewed")
            keeper = SessionKeeper(session)
            measurement = make_measurement(bench, plan, keeper=keeper.keep)
            keeper.begin(measurement, bench)
            measurement.run(keeper.see)
            keeper.finish()
            return session.head
    finally:
        bench.close()
