"""`wattproof devices`: what interfaces there are, at which rates they open, and which way to them is to be trusted."""

import click

from wattproof.app import list_devices
from wattproof.cli.errors import OK
from wattproof.report.device_document import device_document, device_lines
from wattproof.report.reading_document import json_text


@click.command(epilog="Exit status: 0 listed; 2 no sound library, or a sound system that does not answer.")
@click.option("--json", "as_json", is_flag=True, help="Print one JSON document, for programs.")
def devices(*, as_json: bool) -> int:
    """List the audio devices that can be measured with.

    Every device is opened for a moment at each usual rate, in silence, to see whether it really does.
    """
    found = list_devices()
    click.echo(json_text(device_document(found)) if as_json else "\n".join(device_lines(found)))
    return OK
