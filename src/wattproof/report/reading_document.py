r"""Readings of recordings as the JSON document that programs rely on.

The contract, version 1. Readers ignore keys that they don't know; `version` rises only when a key changes its meaning
or goes. The document is ASCII and holds no NaN and no infinity: what can't be honest, or can't be expressed (the level
of exact silence in dB), is null.

One file:

    {"wattproof": "reading", "version": 1,
     "source": {"file", "rate_hz", "frames", "channels", "sha256"},
     "settings": {"band_hz": [lo, hi], "reference": "total" | "fundamental", "full_scale_vrms", "load_ohm"},
     "readings": [one per channel]}

`source` describes the whole file, `settings` what was used: the band ends at half the rate where the default one would
reach further. Bytes of a file name that are no text appear as `\xNN`.

One reading: `channel` from 1; `start_s` and `seconds` of the stretch that was read; `state` one of "ok", "overload",
"no tone", "unsteady", "too short"; `notes`, sentences; then the figures, Q being {"value", "u", "unit"} with u the
standard uncertainty in the same unit:

    fundamental_hz Q, fundamental_dbfs Q     the fundamental alone; 0 dBFS is a full-scale sine (AES17)
    level_dbfs Q, level_vrms Q, power_w Q    the total in the band; volts and watts where the scale and load are stated
    dc_fs Q, peak_dbfs x, crest_factor Q
    thdn Q, thd Q, noise Q, hum Q            plain ratios to the chosen reference; thdn² = thd² + hum² + noise²
    sinad_db Q
    mains {"frequency_hz", "lines": [{"frequency_hz", "ratio": Q}]}
    harmonics [{"order", "frequency_hz", "ratio": Q, "phase_deg", "remark": null | "not seen" | "may contain mains"}]

`ratio` is to the fundamental, without a tone to the total in the band. `thd` counts every harmonic inside the band and
is null where there is none. `phase_deg` is φk in sin θ + Σ ak·sin(kθ + φk).

Several files: {"wattproof": "readings", "version": 1, "files": [the object above, or {"source": {"file"}, "error"}]} in
the order given. A single file that can't be read: {"wattproof": "reading", "version": 1, "source": {"file"}, "error"}.
"""

import json
import math
from collections.abc import Sequence

from wattproof.core.quantity import Quantity
from wattproof.core.reading import Harmonic, Mains, Reading, ReadingSettings
from wattproof.core.units import db
from wattproof.core.wording import sentence
from wattproof.report.characters import encodable, printable
from wattproof.report.decibels import in_db
from wattproof.report.source import Source

VERSION = 1

Document = dict[str, object]


def file_document(source: Source, readings: Sequence[Reading]) -> Document:
    """Return the document of one recording, from at least one reading; all share their settings."""
    return {
        "wattproof": "reading",
        "version": VERSION,
        "source": {
            "file": encodable(source.file),
            "rate_hz": _plain(source.rate_hz),
            "frames": source.frames,
            "channels": source.channels,
            "sha256": source.sha256,
        },
        "settings": _settings(readings[0].settings),
        "readings": [reading_entry(reading) for reading in readings],
    }


def refusal_document(file: str, why: str) -> Document:
    """Return the document of a single recording that could not be read."""
    return {"wattproof": "reading", "version": VERSION, "source": {"file": encodable(file)}, "error": printable(why)}


def files_document(documents: Sequence[Document]) -> Document:
    """Return the document of several recordings, each as `file_document` or `refusal_document` made it, in order."""
    files = [_refusal_among_files(document) if "error" in document else document for document in documents]
    return {"wattproof": "readings", "version": VERSION, "files": files}


def json_text(document: Document) -> str:
    """Return the document as indented ASCII.

    Raises:
        ValueError: a number in it is NaN or infinite.
    """
    return json.dumps(document, ensure_ascii=True, allow_nan=False, indent=1)


def reading_entry(reading: Reading) -> Document:
    """Return the entry of one channel, as the contract in this module's docstring has it."""
    return {
        "channel": reading.channel,
        "start_s": reading.span.start_s,
        "seconds": reading.span.seconds,
        "state": reading.state.value,
        "notes": [sentence(note) for note in reading.notes],
        "fundamental_hz": _q(reading.fundamental_hz),
        "fundamental_dbfs": _q(in_db(reading.fundamental_fs, "dBFS")),
        "level_dbfs": _q(in_db(reading.level_fs, "dBFS")),
        "level_vrms": _q(reading.level_vrms),
        "power_w": _q(reading.power_w),
        "dc_fs": _q(reading.dc_fs),
        "peak_dbfs": db(reading.peak_fs) if reading.peak_fs else None,
        "crest_factor": _q(reading.crest_factor),
        "thdn": _q(reading.thdn),
        "thd": _q(reading.thd),
        "sinad_db": _q(in_db(reading.sinad, "dB")),
        "noise": _q(reading.noise),
        "hum": _q(reading.hum),
        "mains": _mains(reading.mains),
        "harmonics": [_harmonic(harmonic) for harmonic in reading.harmonics],
    }


def _refusal_among_files(document: Document) -> Document:
    return {"source": document["source"], "error": document["error"]}


def _settings(settings: ReadingSettings) -> Document:
    return {
        "band_hz": list(settings.band_hz),
        "reference": settings.reference.value,
        "full_scale_vrms": settings.full_scale_vrms,
        "load_ohm": settings.load_ohm,
    }


def _mains(mains: Mains) -> Document:
    lines = [{"frequency_hz": line.frequency_hz, "ratio": _q(line.ratio)} for line in mains.lines]
    return {"frequency_hz": mains.frequency_hz, "lines": lines}


def _harmonic(harmonic: Harmonic) -> Document:
    return {
        "order": harmonic.order,
        "frequency_hz": harmonic.frequency_hz,
        "ratio": _q(harmonic.ratio),
        "phase_deg": math.degrees(harmonic.phase_rad),
        "remark": None if harmonic.remark is None else harmonic.remark.value,
    }


def _q(quantity: Quantity | None) -> Document | None:
    return None if quantity is None else {"value": quantity.value, "u": quantity.u, "unit": quantity.unit}


def _plain(number: float) -> float:
    """Return a whole number as an int, so that 48000 is not written 48000.0."""
    return int(number) if float(number).is_integer() else number
