"""A second program on the server: plays a tone of 440 Hz into the loopback device until its standard input ends."""

import math
import sys

import jack
import numpy as np

client = jack.Client("player", no_start_server=True)
port = client.outports.register("out")
at = 0


def process(frames: int) -> None:
    """Play one period."""
    global at  # noqa: PLW0603 - the callback is a plain function, and this the only number it keeps
    port.get_array()[:] = 0.05 * np.sin(2.0 * math.pi * 440.0 / client.samplerate * (at + np.arange(frames)))
    at += frames


client.set_process_callback(process)
with client:
    client.connect(port, "loopback:playback_1")
    sys.stdout.write("playing\n")
    sys.stdout.flush()
    sys.stdin.read()
