"""A real audio server without a sound card, for tests: jackd on its dummy clock, whose loopback client is the device.

Works as root without systemd, dbus, /dev/snd or real-time rights (Debian: apt-get install jackd2 libportaudio2). What
is played on the device "loopback" comes back bit for bit.
"""

import ctypes.util
import os
import secrets
import shutil
import subprocess
import sys
import time
from pathlib import Path
from types import TracebackType
from typing import Self

APT_LINE = "apt-get install jackd2 libportaudio2"
START_LIMIT_S = 20.0
STOP_LIMIT_S = 1.5  # a server may wait 5 s and more for a client that went without a word: it is killed then
DEVICE = "JACK/loopback"


def missing() -> str:
    """Return why there can be no server here, with the apt line; empty where there can."""
    lacking = [name for name in ("jackd", "jack_lsp") if shutil.which(name) is None]
    if sys.platform == "linux" and ctypes.util.find_library("portaudio") is None:
        lacking.append("libportaudio.so.2")
    return f"{', '.join(lacking)} missing: {APT_LINE}" if lacking else ""


class AudioServer:
    """One server under a name of its own: a name that was killed is barred for a while.

    `synchronous`: a late client holds the clock and no frame is lost; otherwise it really loses one period.
    """

    def __init__(
        self, folder: Path, rate_hz: int = 96_000, period: int = 1_024, channels: int = 2, *, synchronous: bool = True
    ) -> None:
        self.name = f"wattproof-{secrets.token_hex(4)}"
        self.environment = {"JACK_DEFAULT_SERVER": self.name, "JACK_NO_START_SERVER": "1"}
        self.rate_hz = rate_hz
        self.period = period
        device = ["-d", "dummy", "-r", str(rate_hz), "-p", str(period), "-C", str(channels), "-P", str(channels)]
        mode = ["-S"] if synchronous else []
        self._command = ["jackd", "-r", *mode, "-n", self.name, "-L", str(channels), *device]
        self._log = folder / f"{self.name}.log"
        self._process: subprocess.Popen[bytes] | None = None

    def __enter__(self) -> Self:
        self._start()
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        self.stop()

    @property
    def pid(self) -> int:
        """The server's process."""
        assert self._process is not None
        return self._process.pid

    def kill(self) -> None:
        """End the server with SIGKILL."""
        assert self._process is not None
        self._process.kill()
        self._process.wait(STOP_LIMIT_S)

    def stop(self) -> None:
        """End the server, and give back what a killed one still holds: there is room for 8 names on a machine."""
        assert self._process is not None
        self._end()
        if self._process.returncode != 0:
            self._start()  # the same name again takes the place over, and a polite end frees it
            self._end()
        for left in Path("/dev/shm").glob(f"jack_sem.*_{self.name}_*"):  # noqa: S108 - where the server puts them
            left.unlink(missing_ok=True)

    def _start(self) -> None:
        bare = {key: value for key, value in os.environ.items() if key not in {"DISPLAY", "DBUS_SESSION_BUS_ADDRESS"}}
        with self._log.open("wb") as log:
            self._process = subprocess.Popen(
                self._command, stdin=subprocess.DEVNULL, stdout=log, stderr=log, env=bare, start_new_session=True
            )
        deadline = time.monotonic() + START_LIMIT_S
        while "loopback:playback_1" not in self._ports():
            if self._process.poll() is not None or time.monotonic() > deadline:
                self._end()
                raise RuntimeError(f"jackd did not start:\n{self._log.read_text(errors='replace')}")
            time.sleep(0.05)

    def _end(self) -> None:
        assert self._process is not None
        self._process.terminate()
        try:
            self._process.wait(STOP_LIMIT_S)
        except subprocess.TimeoutExpired:
            self.kill()

    def _ports(self) -> str:
        ports = subprocess.run(
            ["jack_lsp"], env=os.environ | self.environment, capture_output=True, text=True, timeout=10, check=False
        )
        return ports.stdout
