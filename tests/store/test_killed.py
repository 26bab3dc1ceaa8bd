"""kill -9 at any moment loses at most the block in flight, and the file opens as it is."""

import json
import os
import subprocess
import sys
from pathlib import Path

from tests.house.sources import ROOT

KILLS = 100


def test_a_hundred_kills_at_random_moments_lose_no_reading_that_was_kept(tmp_path: Path) -> None:
    env = {**os.environ, "PYTHONPATH": os.pathsep.join([str(ROOT), str(ROOT / "src")]), "OPENBLAS_NUM_THREADS": "1"}
    done = subprocess.run(
        [sys.executable, "-m", "tests.store.killed", tmp_path, str(KILLS)],
        cwd=ROOT,
        env=env,
        capture_output=True,
        text=True,
        check=True,
    )
    kills = [json.loads(line) for line in done.stdout.splitlines()]
    assert len(kills) == KILLS
    assert [kill for kill in kills if kill["wrong"]] == []
    assert [kill for kill in kills if kill["captured"] != kill["readings"]] == []  # never one without the other
    assert [kill for kill in kills if not kill["said"] <= kill["readings"] <= kill["said"] + 1] == []
    assert sum(kill["readings"] > 0 for kill in kills) > KILLS / 2  # it was killed while it wrote
