"""What a sound file's own structure says of it: its kind, how much it promises, and where it contradicts itself."""

import attrs


@attrs.frozen
class Container:
    """What was found in a file before decoding it.

    `kind` is a short name ("WAV", "FLAC", …; empty where it is none that is known here). `promised_frames` is what the
    header says of the length; `promised_bytes` and `there_bytes` compare the samples promised with what follows the
    header (0 where it does not tell). `faults` are contradictions, in words.
    """

    kind: str = ""
    promised_frames: int | None = None
    promised_bytes: int = 0
    there_bytes: int = 0
    faults: tuple[str, ...] = ()
