"""import-linter on one folder, as a person runs it, and which contracts it finds broken."""

import os
import re
import shutil
import subprocess
import sysconfig
from pathlib import Path

from tests.house.sources import ROOT


def broken_contracts(folder: Path) -> tuple[set[str], str]:
    """Return the names of the broken contracts and the report, of the package below a folder with a pyproject.toml.

    The package is looked for in the folder itself first, then in the project's src.
    """
    linter = shutil.which("lint-imports", path=sysconfig.get_path("scripts"))
    assert linter, "lint-imports is not installed beside this Python; install the project with its [test] extra"
    done = subprocess.run(
        [linter, "--no-cache"],
        cwd=folder,
        env={**os.environ, "PYTHONPATH": str(ROOT / "src"), "COLUMNS": "200", "NO_COLOR": "1"},
        capture_output=True,
        text=True,
        check=False,
    )
    report = re.sub(r"\x1b\[[0-9;]*m", "", done.stdout + done.stderr)  # some versions colour their text into a pipe too
    summary = re.search(r"Contracts: \d+ kept, (\d+) broken", report)
    assert summary, f"no contract was checked:\n{report}"
    broken = set(re.findall(r"^(.+) BROKEN(?: \(.+\))?$", report, flags=re.MULTILINE))
    assert len(broken) == int(summary[1]), report
    assert bool(broken) == bool(done.returncode), report
    return broken, report
