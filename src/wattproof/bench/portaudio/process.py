"""Starts the child, hears what it tells, and ends it: politely, then by SIGTERM, then by SIGKILL, never without end."""

import json
import os
import queue
import subprocess
import sys
import threading
import time
from pathlib import Path
from typing import IO, Any

from wattproof.core.errors import WrongUseError

MODULE = "wattproof.bench.portaudio.child"
TERM_S = 0.3  # after SIGTERM; a process that PortAudio holds does not hear it
KILL_S = 2.0  # SIGKILL needs no consent, only the kernel's time
NO_LIBRARY = "PortAudio is missing; install it (Debian: apt-get install libportaudio2) and pip install sounddevice"


class Child:
    """One child process. Any thread may call its methods."""

    def __init__(self, request: dict[str, object]) -> None:
        self._messages: queue.Queue[dict[str, Any] | None] = queue.Queue()
        self._ending = threading.Lock()
        self._process = subprocess.Popen(  # noqa: S603 - our own module under our own interpreter
            [sys.executable, "-m", MODULE, json.dumps(request)],
            stdin=subprocess.PIPE,
            stdout=subprocess.PIPE,
            stderr=subprocess.DEVNULL,
            env=_environment(),
            start_new_session=True,  # Ctrl-C and a closed terminal reach the parent; the child ramps down when it goes
            creationflags=getattr(subprocess, "CREATE_NO_WINDOW", 0),
        )
        assert self._process.stdout is not None  # noqa: S101 - it is a pipe; tells the type checker
        self._reader = threading.Thread(target=self._read, args=(self._process.stdout,), daemon=True)
        self._reader.start()

    @property
    def pid(self) -> int:
        """The child's process id."""
        return self._process.pid

    @property
    def gone(self) -> bool:
        """Whether the process has ended."""
        return self._process.poll() is not None

    def hear(self, timeout_s: float) -> dict[str, Any] | None:
        """Return the next message; None where none came in time or the child is gone."""
        try:
            message = self._messages.get(timeout=timeout_s) if timeout_s > 0 else self._messages.get_nowait()
        except queue.Empty:
            return None
        if message is None:
            self._messages.put(None)  # the end stays the end
        return message

    def end(self, polite_s: float) -> None:
        """Give the child polite_s to end by itself, then end it. Returns when it is gone, or past every deadline."""
        with self._ending:
            if self._process.stdin is not None and not self._process.stdin.closed:
                self._process.stdin.close()
            if not self._wait(polite_s):
                self._process.terminate()
                if not self._wait(TERM_S):
                    self._process.kill()
                    self._wait(KILL_S)
        self._reader.join(TERM_S)

    def _wait(self, timeout_s: float) -> bool:
        try:
            self._process.wait(timeout_s)
        except subprocess.TimeoutExpired:
            return False
        return True

    def _read(self, pipe: IO[bytes]) -> None:
        with pipe:
            for line in pipe:
                self._messages.put(json.loads(line))
        self._messages.put(None)


def ask(request: dict[str, object], deadline_s: float) -> dict[str, Any] | None:
    """Start a child for one answer and end it; None where none came within the deadline.

    Raises:
        WrongUseError: there is no PortAudio.
    """
    child = Child(request)
    started = time.monotonic()
    try:
        answer = child.hear(deadline_s)
    finally:
        child.end(max(0.0, min(1.0, deadline_s - (time.monotonic() - started))))
    if answer is not None:
        refuse_without_library(answer)
    return answer


def refuse_without_library(answer: dict[str, Any]) -> None:
    """Raise what the child told of a missing library.

    Raises:
        WrongUseError: there is no PortAudio.
    """
    if answer["event"] == "no library":
        raise WrongUseError(NO_LIBRARY)


def _environment() -> dict[str, str]:
    """Return the parent's environment with its import path, and one thread for numpy's linear algebra."""
    path = os.pathsep.join(place or str(Path.cwd()) for place in sys.path)
    ours = {"PYTHONPATH": path, "OPENBLAS_NUM_THREADS": "1", "PYTHONUTF8": "1"}
    return os.environ | ours | {"SD_ENABLE_ASIO": "1"}  # on Windows sounddevice then loads its library with ASIO
