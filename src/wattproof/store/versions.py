"""What wrote a session: program and libraries by their versions, so that a difference can be traced to one of them."""

import platform
import sqlite3
from collections.abc import Mapping
from functools import cache
from importlib import metadata
from types import MappingProxyType

import soundfile

_COUNTED = ("wattproof", "numpy", "scipy", "attrs", "cattrs", "soundfile")


@cache
def versions() -> Mapping[str, str]:
    """Return names and versions of what the numbers depend on."""
    found = {name: _version(name) for name in _COUNTED}
    python = {"python": platform.python_version(), "platform": platform.platform()}
    return MappingProxyType(
        {**found, **python, "sqlite": sqlite3.sqlite_version, "libsndfile": soundfile.__libsndfile_version__}
    )


def _version(name: str) -> str:
    try:
        return metadata.version(name)
    except metadata.PackageNotFoundError:
        return "not installed"
