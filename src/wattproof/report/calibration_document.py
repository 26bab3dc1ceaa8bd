r"""A calibration record as JSON for programs, and as lines for people.

    {"wattproof": "calibration", "version": 1, "device", "rate_hz", "date", "sample_format", "file",
     "scales": [{"direction": "in" | "out", "socket", "full_scale_vrms": Q, "origin", "date"}],
     "loops": [{"output", "input", "latency_frames", "inverted", "gain": Q, "pad": Q | null, "clock_ppm": Q | null,
       "crosstalk": Q | null, "response": {"frequency_hz": [..], "gain_db": [..], "phase_deg": [..]},
       "linearity": [{"level_dbfs", "departure_db", "u_db"}],
       "noise": [{"tone_dbfs" | null, "band_fs": Q, "frequency_hz": [..], "density_fs": [..]}],
       "mains": {"frequency_hz", "lines": [{"frequency_hz", "level_fs": Q}]}}],
     "floors": [{"direction", "socket", "level_dbfs", "noise_fs": Q,
       "harmonics": [{"order", "ratio": Q, "phase_deg"}]}]}

Q is {"value", "u", "unit", "limited_by", "parts": [{"source", "u", "dof"}]}: u the standard uncertainty, dof null where
infinite, limited_by null for a measurement. Gains of a response are to that at the loop's own frequency.
"""

import math
from collections.abc import Iterator

import numpy as np

from wattproof.core.calibration import Calibration, Floor, Scale
from wattproof.core.loopback import Loop, NoiseSpectrum
from wattproof.core.quantity import Quantity
from wattproof.core.rounding import stated
from wattproof.core.units import DB_PER_RELATIVE, db
from wattproof.report.reading_document import Document

VERSION = 1
SHOWN_ORDERS = range(2, 6)
_SHOWN_HZ = (10.0, 20.0, 100.0, 1_000.0, 10_000.0, 20_000.0, 40_000.0)


def quantity_document(quantity: Quantity | None) -> Document | None:
    """Return a quantity with its whole budget."""
    if quantity is None:
        return None
    parts = [
        {"source": part.source, "u": part.u, "dof": part.dof if math.isfinite(part.dof) else None}
        for part in quantity.parts
    ]
    return {
        "value": quantity.value,
        "u": quantity.u,
        "unit": quantity.unit,
        "limited_by": quantity.limited_by,
        "parts": parts,
    }


def calibration_document(calibration: Calibration, file: str = "") -> Document:
    """Return the document of a calibration record; `file` is where it is stored."""
    return {
        "wattproof": "calibration",
        "version": VERSION,
        "device": calibration.device,
        "rate_hz": calibration.rate_hz,
        "date": calibration.date,
        "sample_format": calibration.sample_format,
        "file": file,
        "scales": [
            *(_scale("in", scale) for scale in calibration.inputs),
            *(_scale("out", scale) for scale in calibration.outputs),
        ],
        "loops": [_loop(loop) for loop in calibration.loops],
        "floors": [
            *(_floor("out", floor) for floor in calibration.out_floors),
            *(_floor("in", floor) for floor in calibration.in_floors),
        ],
    }


def _scale(direction: str, scale: Scale) -> Document:
    return {
        "direction": direction,
        "socket": scale.socket,
        "full_scale_vrms": quantity_document(scale.full_scale_vrms),
        "origin": scale.origin,
        "date": scale.date,
    }


def _loop(loop: Loop) -> Document:
    response = loop.response
    middle = response.gain[_nearest(loop, loop.frequency_hz)] if response.gain.size else 1.0
    relative = response.gain / middle
    return {
        "output": loop.output,
        "input": loop.input,
        "latency_frames": loop.latency_frames,
        "inverted": loop.inverted,
        "gain": quantity_document(loop.gain),
        "pad": quantity_document(loop.pad),
        "clock_ppm": quantity_document(loop.clock_ppm),
        "crosstalk": quantity_document(loop.crosstalk),
        "response": {
            "frequency_hz": response.frequency_hz.tolist(),
            "gain_db": (20.0 * np.log10(np.abs(relative))).tolist(),
            "phase_deg": np.rad2deg(np.angle(relative)).tolist(),
        },
        "linearity": [
            {
                "level_dbfs": db(point.level_fs),
                "departure_db": DB_PER_RELATIVE * point.departure.value,
                "u_db": DB_PER_RELATIVE * point.departure.u,
            }
            for point in loop.linearity
        ],
        "noise": [_noise(spectrum) for spectrum in loop.noise],
        "mains": {
            "frequency_hz": loop.mains.frequency_hz,
            "lines": [
                {"frequency_hz": line.frequency_hz, "level_fs": quantity_document(line.ratio)}
                for line in loop.mains.lines
            ],
        },
    }


def _nearest(loop: Loop, frequency_hz: float) -> int:
    return int(np.argmin(np.abs(np.log(loop.response.frequency_hz / frequency_hz))))


def _noise(spectrum: NoiseSpectrum) -> Document:
    return {
        "tone_dbfs": db(spectrum.tone_fs) if spectrum.tone_fs else None,
        "band_fs": quantity_document(spectrum.band_fs),
        "frequency_hz": spectrum.frequency_hz.tolist(),
        "density_fs": spectrum.density_fs.tolist(),
    }


def _floor(direction: str, floor: Floor) -> Document:
    phases = floor.phases_rad or (0.0,) * len(floor.harmonics)
    return {
        "direction": direction,
        "socket": floor.socket,
        "level_dbfs": db(floor.level_fs),
        "noise_fs": quantity_document(floor.noise_fs),
        "harmonics": [
            {"order": order, "ratio": quantity_document(ratio), "phase_deg": math.degrees(phase)}
            for (order, ratio), phase in zip(floor.harmonics, phases, strict=True)
        ],
    }


def calibration_lines(calibration: Calibration) -> Iterator[str]:
    """Yield the record in lines for a person."""
    rate = "" if calibration.rate_hz is None else f", {calibration.rate_hz / 1e3:g} kHz"
    yield f"Calibration of {calibration.device}{rate}, {calibration.sample_format}, {calibration.date}"
    if not calibration.inputs:
        yield "No level calibration: levels stay in dBFS. Compare with a meter: --meter"
    for direction, scales in (("Output", calibration.outputs), ("Input", calibration.inputs)):
        for scale in scales:
            yield f"{direction} {scale.socket}: full scale is {stated(scale.full_scale_vrms)} rms, {scale.origin}"
    for loop in calibration.loops:
        yield ""
        yield from _loop_lines(loop)
    for name, floors in (("Converter-out", calibration.out_floors), ("Converter-in", calibration.in_floors)):
        for floor in floors:
            yield _floor_line(name, floor)


def _loop_lines(loop: Loop) -> Iterator[str]:
    yield f"Output {loop.output} to input {loop.input}"
    yield f"  delay {loop.latency_frames:.2f} frames; gain {db(loop.gain.value):+.3f} dB; polarity kept"
    if loop.pad is not None:
        yield f"  pad {-db(loop.pad.value):.2f} dB"
    if loop.clock_ppm is not None:
        yield f"  the output's clock is {stated(loop.clock_ppm)} faster than the input's"
    if loop.response.gain.size:
        middle = abs(loop.response.gain[_nearest(loop, loop.frequency_hz)])
        shown = [hz for hz in _SHOWN_HZ if hz <= loop.response.frequency_hz[-1]]
        told = (f"{hz:g} Hz {db(abs(loop.response.gain[_nearest(loop, hz)]) / middle):+.3f} dB" for hz in shown)
        yield f"  response {', '.join(told)}"
    if loop.linearity:
        worst = max(loop.linearity, key=lambda point: abs(point.departure.value))
        departure_db = DB_PER_RELATIVE * worst.departure.value
        yield f"  level: largest departure {departure_db:+.5f} dB at {db(worst.level_fs):.0f} dBFS"
    for spectrum in loop.noise:
        when = f"with a tone of {db(spectrum.tone_fs):.0f} dBFS" if spectrum.tone_fs else "in silence"
        yield f"  noise {db(spectrum.band_fs.value):.1f} dBFS {when}"
    if loop.crosstalk is not None:
        sign = "no more than " if loop.crosstalk.limited_by else ""
        yield f"  crosstalk {sign}{db(loop.crosstalk.value):.1f} dB"
    hum = ", ".join(f"{line.frequency_hz:.0f} Hz {db(line.ratio.value):.0f} dBFS" for line in loop.mains.lines)
    yield f"  mains {hum or 'not seen'}"


def _floor_line(name: str, floor: Floor) -> str:
    told = []
    for order, ratio in floor.harmonics:
        if order in SHOWN_ORDERS:
            upper = ratio.value + 2.0 * ratio.u
            seen = ratio.value > 3.0 * ratio.u
            told.append(f"H{order} {db(ratio.value):.1f} dB" if seen else f"H{order} below {db(upper):.0f} dB")
    noise = f"noise {db(floor.noise_fs.value):.1f} dBFS" if floor.noise_fs.value else "noise not told apart"
    return f"{name} {floor.socket} at {db(floor.level_fs):.0f} dBFS: {noise}, {', '.join(told)}"
