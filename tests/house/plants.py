"""Violations of the import contracts, each of which must break one contract and no other."""

import attrs


@attrs.frozen
class Plant:
    """A line that is added to a module (made where it is not there), and the contract that it breaks."""

    contract: str
    module: str
    line: str

    def __str__(self) -> str:
        return f"{self.module}: {self.line}"


ROOMS = "rooms import one way"
BENCHES = "benches are siblings behind one protocol"
APP = "only app names a bench"
QT = "Qt lives in gui only"
PURE = "measuring is pure"
APART = "the simulated bench shares no code with the measurement"
TRUTH = "the simulator's truth is for tests"

# (a room, a room that it may not import): each step of the order, downwards, and each pair of siblings
_WRONG_WAYS = (
    ("core", "signals"),
    ("core", "dsp"),
    ("signals", "dsp"),
    ("dsp", "signals"),
    ("signals", "procedures"),
    ("dsp", "procedures"),
    ("procedures", "bench"),
    ("procedures", "store"),
    ("procedures", "report"),
    ("store", "report"),
    ("report", "store"),
    ("report", "bench"),
    ("store", "bench"),
    ("store", "runner"),
    ("report", "runner"),
    ("runner", "app"),
    ("cli", "gui"),
    ("gui", "cli"),
    ("cli", "__main__"),
    ("gui", "__main__"),
)
_BENCHES = ("simulated", "recording", "portaudio")


def _rooms() -> list[Plant]:
    planted = [Plant(ROOMS, f"{room}.planted", f"import wattproof.{other}") for room, other in _WRONG_WAYS]
    return [
        *planted,
        Plant(ROOMS, "app", "import wattproof.cli"),
        Plant(ROOMS, "bench", "import wattproof.store"),
        Plant(ROOMS, "bench", "import wattproof.report"),
        Plant(ROOMS, "bench", "import wattproof.runner"),
        Plant(ROOMS, "shed", '"""A new room that has no place yet."""'),
    ]


def _benches() -> list[Plant]:
    return [
        *(
            Plant(
                BENCHES,
                f"bench.{one}.planted" if one != "recording" else "bench.recording",
                f"import wattproof.bench.{other}",
            )
            for one in _BENCHES
            for other in _BENCHES
            if one != other
        ),
        Plant(BENCHES, "bench.protocol", "import wattproof.bench.recording"),
        Plant(BENCHES, "bench.network", '"""A new bench that has no place yet."""'),
    ]


def _qt() -> list[Plant]:
    rooms = ("__main__", "app", "bench", "runner", "store", "report", "procedures", "signals", "dsp", "core")
    return [
        *(
            Plant(QT, name if name in {"__main__", "app", "bench"} else f"{name}.planted", "from PySide6 import QtCore")
            for name in rooms
        ),
        Plant(QT, "cli.planted", "import shiboken6"),
    ]


PLANTS = (
    *_rooms(),
    *_benches(),
    *_qt(),
    *(
        Plant(APP, f"{room}.planted", f"import wattproof.bench.{bench}")
        for room in ("cli", "gui", "runner")
        for bench in _BENCHES
    ),
    Plant(APP, "__main__", "import wattproof.bench.simulated"),
    Plant(PURE, "core.planted", "import threading"),
    Plant(PURE, "signals.planted", "import soundfile"),
    Plant(PURE, "dsp.planted", "from os import path"),
    Plant(PURE, "procedures.planted", "import time"),
    *(Plant(APART, "bench.simulated.planted", f"import wattproof.{room}") for room in ("dsp", "signals", "procedures")),
    Plant(APART, "bench.protocol", "import wattproof.dsp"),
    Plant(TRUTH, "bench.simulated.planted", "from wattproof.bench.simulated import truth"),
)
