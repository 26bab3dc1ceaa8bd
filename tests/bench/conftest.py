"""A real audio server for the tests that are marked `server`, and only for them."""

from collections.abc import Iterator
from pathlib import Path

import pytest

from tests.bench.audio_server import AudioServer, missing


@pytest.fixture
def audio_server(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Iterator[AudioServer]:
    """A synchronous server at 96 kHz, in the environment for whatever the test starts."""
    lacking = missing()
    if lacking:
        pytest.skip(lacking)
    with AudioServer(tmp_path) as server:
        for name, value in server.environment.items():
            monkeypatch.setenv(name, value)
        yield server
