"""From what a calibration has found to its record: floors of both converters, loops, scales."""

from collections.abc import Sequence

import attrs

from wattproof.core.calibration import Calibration, Floor, Scale
from wattproof.core.loopback import LevelPoint, Loop, NoiseSpectrum, Response
from wattproof.core.quantity import Quantity, measured
from wattproof.core.reading import Mains, MainsLine, Reading
from wattproof.dsp.loop import Densities
from wattproof.dsp.separation import averaged, separated, separated_noise
from wattproof.dsp.uncertainty import mean, named_scatter, ratio
from wattproof.procedures.calibrate import Findings, LevelStep
from wattproof.procedures.level_calibration import Meter, full_scale, meter_reading
from wattproof.procedures.wiring_check import Join

MEASURED = "measured"


@attrs.frozen
class Header:
    """What the record is bound to: the device, and the day."""

    device: str
    date: str  # ISO 8601


def conclude(
    findings: Findings, header: Header, meter: Meter | None = None, known: Calibration | None = None
) -> Calibration:
    """Return the record of a calibration.

    Scales come from the meter; without one those of `known` (what the bench itself declares) are kept.
    """
    loops = tuple(_loop(findings, join) for join in findings.joins)
    outs: list[Floor] = []
    ins: list[Floor] = []
    for loop in loops:
        for direct, padded in _pairs(findings):
            out, into = _floors(loop, direct, padded)
            outs.append(out)
            ins.append(into)
    scaled_in, scaled_out = _scales(findings, loops, header, meter)
    declared = known or Calibration()
    return Calibration(
        device=header.device,
        rate_hz=findings.rate_hz,
        inputs=scaled_in or declared.inputs,
        outputs=scaled_out or declared.outputs,
        out_floors=tuple(outs),
        in_floors=tuple(ins),
        response=loops[0].response if loops else Response(),
        date=header.date,
        sample_format=findings.format,
        loops=loops,
    )


def _pairs(findings: Findings) -> list[tuple[LevelStep, LevelStep]]:
    padded = {step.level_fs: step for step in findings.padded}
    return [(step, padded[step.level_fs]) for step in findings.direct if step.level_fs in padded]


def _loop(findings: Findings, join: Join) -> Loop:
    path = findings.paths[join.input]
    top = findings.direct[0]
    gain = _gain(top, join.input)
    pad = None
    pairs = _pairs(findings)
    if pairs:
        direct, padded = pairs[0]
        pad = ratio(
            named_scatter(_level(padded, join.input), "through the pad"),
            named_scatter(_level(direct, join.input), "direct"),
        )
    return Loop(
        output=join.output,
        input=join.input,
        latency_frames=path.delay_frames,
        inverted=path.inverted,
        gain=gain,
        frequency_hz=findings.plan.frequency_hz,
        pad=pad,
        response=Response(path.frequency_hz, path.gain),
        linearity=tuple(_departure(step, top, join.input) for step in findings.direct[1:]),
        noise=_noise(findings, join.input),
        crosstalk=_crosstalk(findings, join),
        mains=_mains(findings.silence[join.input]),
        clock_ppm=_clock(top, join.input, findings.plan.frequency_hz),
    )


def _level(step: LevelStep, socket: int) -> Quantity:
    return mean([reading.fundamental_fs for reading in step.readings[socket] if reading.fundamental_fs is not None])


def _gain(step: LevelStep, socket: int) -> Quantity:
    return _level(step, socket).scaled(1.0 / step.level_fs, "1")


def _departure(step: LevelStep, top: LevelStep, socket: int) -> LevelPoint:
    moved = ratio(named_scatter(_gain(step, socket), "here"), named_scatter(_gain(top, socket), "top"))
    return LevelPoint(step.level_fs, measured(moved.value - 1.0, moved.u, "1"))


def _noise(findings: Findings, socket: int) -> tuple[NoiseSpectrum, ...]:
    silent = findings.silence[socket]
    told = []
    if findings.quiet is not None and silent.noise is not None and silent.level_fs is not None:
        told.append(_spectrum(findings.quiet, socket, 0.0, silent.noise.scaled(silent.level_fs.value, "1")))
    if findings.loud is not None:
        top = findings.direct[0]
        told.append(_spectrum(findings.loud, socket, top.level_fs, _noise_fs(top.readings[socket])))
    return tuple(told)


def _spectrum(spectrum: Densities, socket: int, tone_fs: float, band_fs: Quantity) -> NoiseSpectrum:
    return NoiseSpectrum(tone_fs, spectrum.frequency_hz, spectrum.density_fs[socket - 1], band_fs)


def _noise_fs(readings: Sequence[Reading]) -> Quantity:
    """Return the noise of readings of one state, rms to full scale (their ratios are to the fundamental)."""
    return mean(
        [
            reading.noise.scaled(reading.fundamental_fs.value, "1")
            for reading in readings
            if reading.noise is not None and reading.fundamental_fs is not None
        ]
    )


def _crosstalk(findings: Findings, join: Join) -> Quantity | None:
    """Return what the other outputs leave at an input, the worst of them, to what they give at their own."""
    worst: Quantity | None = None
    for other in findings.joins:
        seen = findings.crosstalk.get(other.output)
        if other == join or seen is None:
            continue
        own = abs(seen.amplitudes[other.input - 1])
        here = measured(float(abs(seen.amplitudes[join.input - 1]) / own), float(seen.u[join.input - 1] / own), "1")
        worst = here if worst is None or here.value > worst.value else worst
    if worst is not None and worst.value < 3.0 * worst.u:
        return Quantity(worst.value + 2.0 * worst.u, "1", worst.parts, "noise")
    return worst


def _mains(silent: Reading) -> Mains:
    level = silent.level_fs.value if silent.level_fs is not None else 0.0
    lines = tuple(MainsLine(line.frequency_hz, line.ratio.scaled(level, "1")) for line in silent.mains.lines)
    return Mains(silent.mains.frequency_hz, lines)


def _clock(top: LevelStep, socket: int, played_hz: float) -> Quantity | None:
    told = [reading.fundamental_hz for reading in top.readings[socket] if reading.fundamental_hz is not None]
    if not told:
        return None
    found = mean(told)
    return measured((found.value / played_hz - 1.0) * 1e6, found.u / played_hz * 1e6, "ppm")


def _floors(loop: Loop, direct: LevelStep, padded: LevelStep) -> tuple[Floor, Floor]:
    """Return both converters' floors at one drive level."""
    here, there = direct.readings[loop.input], padded.readings[loop.input]
    pad = loop.pad.value if loop.pad is not None else 1.0
    lines = separated(averaged(here), averaged(there), pad)
    noise_out, noise_in = separated_noise(_noise_fs(here), _noise_fs(there), loop.gain.value, pad)
    out = Floor(
        loop.output,
        direct.level_fs,
        noise_out,
        tuple((own.order, own.out) for own in lines),
        tuple(own.out_phase_rad for own in lines),
    )
    into = Floor(
        loop.input,
        direct.level_fs * loop.gain.value,
        noise_in,
        tuple((own.order, own.into) for own in lines),
        tuple(own.into_phase_rad for own in lines),
    )
    return out, into


def _scales(
    findings: Findings, loops: Sequence[Loop], header: Header, meter: Meter | None
) -> tuple[tuple[Scale, ...], tuple[Scale, ...]]:
    """Return the scales of inputs and outputs that the meter gave."""
    if meter is None:
        return (), ()
    responses = {loop.input: loop.response for loop in loops}
    ins, outs = [], []
    for each in findings.compared:
        volts = meter_reading(meter, each.read_v)
        into = full_scale(each.reading, volts, meter, responses[each.join.input])
        ins.append(Scale(each.join.input, into, MEASURED, header.date))
        outs.append(Scale(each.join.output, volts.scaled(1.0 / each.level_fs, "V"), MEASURED, header.date))
    return tuple(ins), tuple(outs)
