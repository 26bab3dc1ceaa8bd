"""The look at a device: driven with answers that the test makes, each with a fault that it knows."""

import math

import numpy as np
import pytest

from wattproof.core.notes import Kind
from wattproof.core.signal import Capture, Samples, Sweep, Tone
from wattproof.core.wording import sentence
from wattproof.procedures.preflight import Findings, PreflightPlan, Verdict, conclude, preflight
from wattproof.procedures.requests import Acquire, Play
from wattproof.procedures.wiring_check import Join
from wattproof.signals.sweep import sweep_samples

RATE_HZ = 48_000
DELAY = 700
PLAN = PreflightPlan()


class Device:
    """What an interface gives back of what it plays: late, noisy, and with the fault of the case."""

    def __init__(  # noqa: PLR0913 - one parameter per fault
        self,
        *,
        noise_fs: float = 1e-5,
        gain: float = 0.5,
        ppm: float = 0.0,
        ends_at_hz: float = RATE_HZ,
        echo: float = 0.0,
        hum_fs: float = 0.0,
        bits: int = 24,
    ) -> None:
        self.noise_fs, self.gain, self.ppm, self.ends_at_hz = noise_fs, gain, ppm, ends_at_hz
        self.echo, self.hum_fs, self.bits = echo, hum_fs, bits
        self.playing: Tone | None = None
        self._rng = np.random.default_rng(8)

    def answer(self, request: Acquire) -> Capture:
        frames = request.frames
        at = np.arange(frames) / RATE_HZ
        heard = np.zeros(frames)
        tone = self.playing
        if isinstance(tone, Sweep):
            played = sweep_samples(tone, RATE_HZ)
            heard[DELAY : DELAY + played.size] += self.gain * played
            later = DELAY + 4_000
            heard[later : later + played.size] += self.gain * self.echo * played[: frames - later]
        elif tone is not None and tone.level_fs and tone.frequency_hz < self.ends_at_hz:
            heard = self.gain * tone.level_fs * np.sin(2 * np.pi * tone.frequency_hz * (1 + self.ppm * 1e-6) * at)
        heard += self.noise_fs / math.sqrt(2.0) * self._rng.standard_normal(frames)
        heard += self.hum_fs * np.sin(2 * np.pi * 50.0 * at)
        codes = np.rint(heard * 2.0 ** (self.bits - 1)) / 2.0 ** (self.bits - 1)
        silent: Samples = np.zeros(frames)
        return Capture(np.stack([codes, silent], axis=1), float(RATE_HZ))


def looked_at(device: Device) -> Verdict:
    findings = Findings(float(RATE_HZ))
    procedure = preflight(PLAN, (Join(1, 1),), float(RATE_HZ), findings)
    item = next(procedure)
    try:
        while True:
            if isinstance(item, Play):
                device.playing = item.tone
                assert item.tone.level_fs <= PLAN.level_fs
                item = procedure.send(0)
            else:
                assert isinstance(item, Acquire)
                item = procedure.send(device.answer(item))
    except StopIteration:
        assert device.playing is not None
        assert device.playing.level_fs == 0.0  # it leaves silence behind
        return conclude(findings)


def kinds(verdict: Verdict) -> tuple[set[Kind], set[Kind]]:
    return {one.kind for one in verdict.warnings}, {one.kind for one in verdict.facts}


def test_a_sound_device_is_told_with_its_figures() -> None:
    verdict = looked_at(Device())
    warnings, facts = kinds(verdict)
    assert warnings == {Kind.INPUT_ZEROS}  # of the second input, which gives digital silence
    assert facts == {Kind.NOISE_FLOOR, Kind.WORD_LENGTH, Kind.ROUND_TRIP, Kind.RATE_HONEST, Kind.ONE_CLOCK}
    said = {one.kind: dict(one.values) for one in verdict.facts}
    assert said[Kind.ROUND_TRIP]["frames"] == DELAY
    assert said[Kind.WORD_LENGTH]["what"] == "24 bit"
    # rms of noise_fs to a full-scale sine is −100 dB by its making; 24,000 samples scatter by 0.5 % of it
    assert said[Kind.NOISE_FLOOR]["db"] == pytest.approx(-100.0, rel=0.0, abs=0.2)


@pytest.mark.parametrize(
    ("device", "kind", "words"),
    [
        (Device(ends_at_hz=22_050.0), Kind.RESAMPLED, "does not come back"),
        (Device(ppm=20.0), Kind.TWO_CLOCKS, "+20.0 ppm"),
        (Device(ppm=-1.0), Kind.TWO_CLOCKS, "−1.0 ppm"),
        (Device(echo=0.3), Kind.MONITORING, "−10 dB"),
        (Device(hum_fs=0.01), Kind.SOMETHING_PLAYS, "50 Hz"),
        (Device(noise_fs=0.01), Kind.SOMETHING_PLAYS, "not silent: −40"),
        (Device(gain=0.0), Kind.NOTHING_BACK, "nothing of output 1 came back at input 1"),
        (Device(bits=16, noise_fs=1e-4), Kind.BITS_IDLE, "lowest 8 of 24 bits"),
    ],
    ids=lambda value: value.value if isinstance(value, Kind) else "",
)
def test_each_fault_is_said(device: Device, kind: Kind, words: str) -> None:
    verdict = looked_at(device)
    said = [sentence(one) for one in verdict.warnings if one.kind is kind]
    assert len(said) == 1
    assert words in said[0]


def test_where_nothing_comes_back_the_rest_is_left_out() -> None:
    _, facts = kinds(looked_at(Device(gain=0.0)))
    assert not facts & {Kind.ROUND_TRIP, Kind.RATE_HONEST, Kind.ONE_CLOCK}


def test_a_permission_that_was_refused_gives_zeros_everywhere() -> None:
    device = Device(noise_fs=0.0, gain=0.0)
    verdict = looked_at(device)
    assert [one.kind for one in verdict.warnings] == [Kind.INPUT_ZEROS, Kind.INPUT_ZEROS, Kind.NOTHING_BACK]
    assert "permission" in sentence(verdict.warnings[0])


def test_a_digital_way_is_no_refused_permission() -> None:
    warnings, facts = kinds(looked_at(Device(noise_fs=0.0, bits=30)))
    assert Kind.DIGITAL in facts
    assert warnings == {Kind.INPUT_ZEROS}  # of the second input
