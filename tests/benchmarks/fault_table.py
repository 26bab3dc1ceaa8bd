"""Prints the fault table from runs against the real server: what happened, what was seen, when, what was kept.

python -m tests.benchmarks.fault_table
"""

import sys
import tempfile
import time
from pathlib import Path

from tests.bench.audio_server import DEVICE
from tests.bench.faults import BUSY, FAULTS, Fault, Seen, Table, in_place_of_sounddevice
from wattproof.app import open_bench
from wattproof.core.errors import WrongUseError

HEAD = "| what happened | what the person saw | after | tone silent | kept | closed in | went on |"


def seen_of(fault: Fault, folder: Path) -> Seen:
    """Let one fault happen on a server of its own."""
    if fault.change:
        with in_place_of_sounddevice(folder / "changed", fault.change):
            table = Table(folder, fault.device)
            table.__enter__()
    else:
        table = Table(folder, fault.device, with_wire=fault.device != DEVICE)
        table.__enter__()
    try:
        return table.see(fault.happens, fault.mend)
    finally:
        table.__exit__()


def refused(folder: Path) -> tuple[str, float]:
    """What is said of a busy device, and after how long."""
    started = time.monotonic()
    try:
        with in_place_of_sounddevice(folder / "changed", BUSY), Table(folder):
            return "nothing", 0.0
    except WrongUseError as error:
        return str(error), time.monotonic() - started


def other_rate(folder: Path) -> tuple[str, str]:
    """What is said of a rate that changed underneath, when connecting again; and whether the new rate goes on."""
    with Table(folder) as table:
        table.pump(lambda: table.kept() >= 3)
        table.server.kill()
        table.pump(lambda: table.ended() is not None)
        table.serve_anew(48_000)
        try:
            table.runner.reconnect()
        except WrongUseError as error:
            said = str(error)
        table.events.clear()
        table.runner.reconnect(lambda: open_bench(f"{DEVICE} rate=48000"))
        return said, "yes" if table.pump(lambda: table.kept() >= 3) else "no"


def main() -> None:
    """Run all and print the table."""
    lines = [HEAD, "|---|---|---|---|---|---|---|"]
    for fault in FAULTS:
        with tempfile.TemporaryDirectory() as folder:
            seen = seen_of(fault, Path(folder))
        told = "yes" if seen.silent else "NO"
        lines.append(
            f"| {fault.name} | {seen.sentence} | {seen.after_s:.2f} s | {told} | {seen.kept} readings | "
            f"{seen.closes_s:.2f} s | {'yes' if seen.goes_on else 'NO'} |"
        )
        sys.stdout.write(lines[-1] + "\n")
        sys.stdout.flush()
    with tempfile.TemporaryDirectory() as folder:
        said, after_s = refused(Path(folder))
    lines.append(f"| device busy when opened | {said} | {after_s:.2f} s | never sounded | | | |")
    with tempfile.TemporaryDirectory() as folder:
        said, went_on = other_rate(Path(folder))
    lines.append(
        f"| server back at another rate | on connecting again: {said} | | yes | all | | {went_on}, at 48 kHz |"
    )
    sys.stdout.write("\n".join(["", *lines]) + "\n")


if __name__ == "__main__":
    main()
