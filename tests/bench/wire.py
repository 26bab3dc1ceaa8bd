"""A device that ends politely: a server client named `wire` that gives back what it is given until its input ends."""

import sys

import jack

client = jack.Client("wire", no_start_server=True)
given = [client.inports.register(f"playback_{number}") for number in (1, 2)]
returned = [client.outports.register(f"capture_{number}") for number in (1, 2)]


def process(frames: int) -> None:  # noqa: ARG001 - the server passes it
    """Hand one period on."""
    for source, target in zip(given, returned, strict=True):
        target.get_array()[:] = source.get_array()


client.set_process_callback(process)
with client:
    sys.stdout.write("ready\n")
    sys.stdout.flush()
    sys.stdin.read()
