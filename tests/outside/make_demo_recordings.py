"""Makes the recordings of demo_recordings/ from closed forms, and the table of what reading them must say.

    python tests/outside/make_demo_recordings.py demo_recordings

writes the FLAC files and prints the table. Nothing of wattproof is used: the truth of each recording is a sum of sines
and seeded noise, and its figures follow from the amplitudes alone.
"""

import math
import sys
from collections.abc import Callable, Iterator
from pathlib import Path

import attrs
import numpy as np
import soundfile
from numpy.typing import NDArray

Samples = NDArray[np.float64]

BAND_HZ = (20.0, 20_000.0)  # the band of a default reading (AES17-2015: 20 Hz to 20 kHz)
MAINS_HZ = 49.98  # mains is rarely exactly at its nominal 50 Hz
FULL_SCALE_PEAK = 1.0  # 0 dBFS is a sine whose peak is full scale (AES17)
NONE: dict[int, float] = {}


def from_db(level_db: float) -> float:
    """Return the amplitude ratio of a level in dB."""
    return float(10.0 ** (level_db / 20.0))


def clipped(order: int, angle_deg: float) -> float:
    """Return b_n of a sine clipped symmetrically from angle_deg on, over b_1.

    Fourier integral of min(A·sin x, 1) over a quarter period, A = 1/sin(angle):
    b_1 = (2A/π)(θ + sin θ cos θ), b_n = (2A/nπ)[sin((n−1)θ)/(n−1) + sin((n+1)θ)/(n+1)] for odd n, 0 for even n.
    """
    return _odd(order, math.radians(angle_deg), lambda x: x + math.sin(x) * math.cos(x), 1.0)


def dead_zone(order: int, share: float) -> float:
    """Return b_n of a sine through a dead zone of `share` of its peak, over b_1: what crossover distortion looks like.

    Fourier integral of max(sin x − d, 0), α = asin d: b_1 = 1 − (2/π)(α + sin α cos α),
    b_n = −(2/nπ)[sin((n−1)α)/(n−1) + sin((n+1)α)/(n+1)] for odd n, 0 for even n.
    """
    return _odd(order, math.asin(share), lambda x: math.pi / 2 - x - math.sin(x) * math.cos(x), -1.0)


def _odd(order: int, angle: float, first: Callable[[float], float], sign: float) -> float:
    if order % 2 == 0:
        return 0.0
    beside = math.sin((order - 1) * angle) / (order - 1) + math.sin((order + 1) * angle) / (order + 1)
    return sign * beside / order / first(angle)


@attrs.frozen
class Channel:
    """What one channel holds. Ratios of harmonics and of `extra` are to the fundamental, of hum to full scale.

    `level_fs` is the fundamental's, of a full-scale sine (0: no tone); `hum` and `noise_fs` likewise, the noise as it
    reads in the band. `extra` is (frequency in Hz, ratio) of a line that belongs to nothing.
    """

    level_fs: float
    noise_fs: float
    harmonics: dict[int, float] = attrs.field(factory=lambda: NONE)
    hum: dict[int, float] = attrs.field(factory=lambda: NONE)
    extra: tuple[float, float] | None = None
    state: str = "ok"
    notes: tuple[str, ...] = ()


@attrs.frozen
class Recording:
    """One file: `sounding_s` is when the tone sounds (None: all along)."""

    name: str
    rate_hz: int
    bits: int
    seconds: float
    channels: tuple[Channel, ...]
    tone_hz: float = 997.0
    sounding_s: tuple[float, float] | None = None


RECORDINGS = (
    Recording(
        "01-tag-31-healthy.flac",
        48_000,
        24,
        3.0,
        (
            Channel(from_db(-10.0), from_db(-100.0), {2: 1e-4, 3: -4e-5, 5: 1e-5}),
            Channel(from_db(-10.2), from_db(-99.0), {2: 1.3e-4, 3: -5e-5, 5: 1e-5}),
        ),
    ),
    Recording(
        "02-tag-12-crossover.flac",
        48_000,
        24,
        3.0,
        (Channel(from_db(-20.0), from_db(-96.0), {n: dead_zone(n, 0.05) for n in range(3, 25, 2)}),),
    ),
    Recording(
        "03-tag-07-clipping.flac",
        48_000,
        24,
        3.0,
        (Channel(from_db(-6.0), from_db(-94.0), {n: clipped(n, 60.0) for n in range(3, 25, 2)}),),
    ),
    Recording(
        "04-tag-19-hum.flac",
        48_000,
        24,
        3.0,
        (
            Channel(
                from_db(-16.0),
                from_db(-92.0),
                {2: 3e-4, 3: 1e-4},
                {1: from_db(-74.0), 2: from_db(-62.0), 3: from_db(-80.0), 4: from_db(-72.0), 6: from_db(-79.0)},
            ),
        ),
    ),
    Recording(
        "05-tag-23-recorded-too-hot.flac",
        44_100,
        16,
        2.0,
        (
            Channel(from_db(1.5), from_db(-86.0), {2: 1e-4}, state="overload", notes=("the interface is overloaded",)),
            Channel(from_db(-8.0), from_db(-86.0), {2: 3e-4}),
        ),
    ),
    Recording(
        "06-tag-04-late-start.flac",
        48_000,
        16,
        4.0,
        (
            Channel(
                from_db(-12.0),
                from_db(-84.0),
                {2: 2e-3, 3: 7e-4},
                notes=("the tone starts at", "the tone ends at"),
            ),
        ),
        sounding_s=(1.2, 3.1),
    ),
    Recording(
        "07-tag-15-silent.flac",
        44_100,
        16,
        3.0,
        (
            Channel(
                0.0,
                from_db(-72.0),
                hum={1: from_db(-70.0), 2: from_db(-66.0), 3: from_db(-74.0), 5: from_db(-80.0)},
                state="no tone",
                notes=("no tone",),
            ),
        ),
    ),
    Recording(
        "08-tag-27-oscillating.flac",
        96_000,
        24,
        2.0,
        (
            Channel(
                from_db(-12.0),
                from_db(-98.0),
                {2: 5e-4, 3: 2e-4},
                extra=(31_400.0, from_db(-34.0)),
                notes=("oscillation or carrier",),
            ),
        ),
    ),
)


def samples_of(recording: Recording, seed: int) -> NDArray[np.int32]:
    """Return the recording's samples, shape (frames, channels), as integers of 32 bits, the unused low ones zero."""
    frames = round(recording.rate_hz * recording.seconds)
    random = np.random.default_rng(seed)
    columns = [_quantized(_analogue(recording, channel, frames, random), recording, random)
               for channel in recording.channels]  # fmt: skip
    return np.asarray(np.column_stack(columns), dtype=np.int32)


def _analogue(recording: Recording, channel: Channel, frames: int, random: np.random.Generator) -> Samples:
    time_s = np.arange(frames) / recording.rate_hz
    tone = channel.level_fs * _sine(recording.tone_hz * time_s + 0.137)
    for order, ratio in channel.harmonics.items():
        tone += channel.level_fs * ratio * _sine(order * (recording.tone_hz * time_s + 0.137))
    if channel.extra is not None:
        tone += channel.level_fs * channel.extra[1] * _sine(channel.extra[0] * time_s)
    if recording.sounding_s is not None:
        tone *= (time_s >= recording.sounding_s[0]) & (time_s < recording.sounding_s[1])
    for order, level_fs in channel.hum.items():
        tone += level_fs * _sine(order * MAINS_HZ * time_s + 0.21 * order)
    return FULL_SCALE_PEAK * tone + _noise_sd(recording, channel) * random.standard_normal(frames)


def _sine(cycles: Samples) -> Samples:
    return np.asarray(np.sin(2.0 * np.pi * (cycles % 1.0)), dtype=np.float64)


def _noise_sd(recording: Recording, channel: Channel) -> float:
    """Return the sd of white noise over the whole width which, with the dither's, reads noise_fs in the band."""
    whole = channel.noise_fs / math.sqrt(2.0) * math.sqrt(recording.rate_hz / 2 / (BAND_HZ[1] - BAND_HZ[0]))
    step = 2.0 ** (1 - recording.bits)
    return math.sqrt(whole**2 - step**2 / 4)  # TPDF dither and rounding: variances step²/6 and step²/12


def _quantized(samples: Samples, recording: Recording, random: np.random.Generator) -> NDArray[np.int32]:
    """Round to the recording's bits with TPDF dither, and clip as a converter does."""
    top = 2 ** (recording.bits - 1)
    dither = random.random(samples.size) - random.random(samples.size)
    whole = np.clip(np.rint(samples * top + dither), -top, top - 1)
    return np.asarray(whole * 2.0 ** (32 - recording.bits), dtype=np.int32)


def table_rows() -> Iterator[str]:
    """Yield the table of what reading the recordings must say, as Markdown, from the closed forms."""
    heads = ("file", "channel", "state", "tone, Hz", "level, dBFS", "THD+N, %", "THD, %", "noise, %", "hum, %")
    yield f"| {' | '.join((*heads, 'mains, Hz', 'notes'))} |"
    yield "|" + " --- |" * 11
    for recording in RECORDINGS:
        for number, channel in enumerate(recording.channels, 1):
            cells = _figures(recording, channel)
            notes = "; ".join(channel.notes) or "none"
            yield f"| {recording.name} | {number} | {channel.state} | {' | '.join(cells)} | {notes} |"


def _figures(recording: Recording, channel: Channel) -> list[str]:
    """Return tone, level, THD+N, THD, noise, hum and mains with their tolerances; "-" where nothing may be said.

    Ratios are to the total in the band. The tolerance of ratios is 1 % of them: seeded noise strays by
    1/(2√(B·T)) = 0.2 to 0.3 % (one sd), the lines far less.
    """
    if channel.state == "overload":
        return ["-"] * 7
    in_band = [r for n, r in channel.harmonics.items() if n * recording.tone_hz <= BAND_HZ[1]]
    thd = channel.level_fs * math.hypot(*in_band)
    hum = math.hypot(*channel.hum.values())
    total = math.hypot(channel.level_fs, thd, hum, channel.noise_fs)
    level = f"{20.0 * math.log10(total):.3f} ± 0.010"
    noise = _percent(channel.noise_fs / total)
    mains = [_percent(hum / total), f"{MAINS_HZ:.2f} ± 0.02"] if channel.hum else ["below noise", "-"]
    if channel.level_fs == 0.0:
        return ["-", level, "-", "-", noise, *mains]
    thdn = _percent(math.hypot(thd, hum, channel.noise_fs) / total)
    return [f"{recording.tone_hz:.3f} ± 0.002", level, thdn, _percent(thd / total), noise, *mains]


def _percent(ratio: float) -> str:
    places = max(0, 3 - math.floor(math.log10(100.0 * ratio)))
    return f"{100.0 * ratio:.{places}f} ± {ratio:.{places}f}"


def write(folder: Path) -> None:
    """Write all recordings into a folder."""
    for seed, recording in enumerate(RECORDINGS, 31):
        subtype = f"PCM_{recording.bits}"
        soundfile.write(folder / recording.name, samples_of(recording, seed), recording.rate_hz, subtype=subtype)


if __name__ == "__main__":
    write(Path(sys.argv[1]))
    sys.stdout.reconfigure(encoding="utf-8")  # type: ignore[union-attr] # a text stream, as a program of its own has
    sys.stdout.write("\n".join(table_rows()) + "\n")
