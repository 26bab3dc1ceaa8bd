"""A second program on the server: records what the loopback device gives until its standard input ends.

python recorder.py FILE: prints `recording`, later writes FILE as float32, shape (frames, 2).
"""

import sys
from pathlib import Path

import jack
import numpy as np

SECONDS = 60

client = jack.Client("recorder", no_start_server=True)
ports = [client.inports.register(f"in_{number}") for number in (1, 2)]
record = np.zeros((SECONDS * client.samplerate, 2), dtype=np.float32)
written = 0


def process(frames: int) -> None:
    """Copy one period."""
    global written  # noqa: PLW0603 - the callback is a plain function, and this the only number it keeps
    count = min(frames, len(record) - written)
    for channel, port in enumerate(ports):
        record[written : written + count, channel] = port.get_array()[:count]
    written += count


client.set_process_callback(process)
with client:
    for number, port in enumerate(ports, start=1):
        client.connect(f"loopback:capture_{number}", port)
    sys.stdout.write("recording\n")
    sys.stdout.flush()
    sys.stdin.read()
    taken = written
np.save(Path(sys.argv[1]), record[:taken])
