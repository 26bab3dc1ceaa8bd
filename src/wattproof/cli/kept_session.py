"""What `wattproof measure … --session FILE` adds to a measurement: each reading is kept with its raw capture."""

import sys
from collections.abc import Iterator, Mapping
from contextlib import contextmanager
from pathlib import Path
from typing import Any

import attrs
import click

from wattproof.cli.errors import complain
from wattproof.core.device import DeviceUnderTest
from wattproof.core.errors import WrongUseError
from wattproof.runner.keeping import SessionKeeper
from wattproof.store.session_file import SessionFile
from wattproof.store.session_values import Keeping

_DEVICE = {"device": "name", "serial": "serial", "claim": "claim", "tested_by": "tested_by"}


@contextmanager
def kept_session(given: Mapping[str, Any]) -> Iterator[SessionKeeper | None]:
    """Open the session that was asked for, and close it whatever happens; None where none was asked for.

    Raises:
        WrongUseError: the file cannot be opened, or a device is described without one.
    """
    described = {field: given[option] for option, field in _DEVICE.items() if given.get(option) is not None}
    if given["session"] is None:
        if described:
            raise WrongUseError("what is tested is kept in a session; add --session FILE")
        yield None
        return
    session = SessionFile(Path(given["session"]))
    try:
        if described:
            session.describe(attrs.evolve(session.device() or DeviceUnderTest(), **described))
        keeper = SessionKeeper(session, Keeping(given.get("keep", Keeping.ALL)))
        try:
            yield keeper
        finally:
            keeper.finish()
        if keeper.trouble:
            complain(keeper.trouble)
    finally:
        head = session.head
        session.close()
    if sys.stderr is not None:
        megabytes = session.size_bytes / 1e6
        click.echo(f"kept in {session.path} ({megabytes:.1f} MB); its hash is {head}", err=True)
