"""A runner that behaves without a bench: synthetic readings of a sine through a soft, then a hard clipper."""

import math
from typing import Any

import attrs
import numpy as np

from wattproof.bench.protocol import Control, Identity
from wattproof.core.calibration import Calibration, Scale
from wattproof.core.errors import WrongUseError
from wattproof.core.notes import Kind, Note, note
from wattproof.core.picture import Picture
from wattproof.core.quantity import Quantity, measured
from wattproof.core.reading import Harmonic, Mains, MainsLine, Reading, ReadingSettings, Remark, State
from wattproof.core.rig import Attenuator, Limits, Load, Rig, Wiring
from wattproof.core.signal import Capture, Samples, Span, Tone
from wattproof.procedures.requests import Shown, Wishes
from wattproof.runner.limits import DriveLimit
from wattproof.runner.screen import ReadingsTaken, Screen

RATE_HZ = 96_000.0
FULL_OUT_VRMS = 2.0
FULL_IN_VRMS = 24.0
MOST_GAIN = 40.0
RAIL_PEAK_V = 13.5
_POINTS = 2048  # of the synthetic two periods
_ORDERS = 20


class FakeBench:
    """A bench with a knob, a load switch and a supply, that captures nothing by itself."""

    def __init__(self) -> None:
        self.identity = Identity("simulated bench, class-d-bridge", RATE_HZ, 2, 2, real=False)
        volts = Quantity(FULL_OUT_VRMS, "V")
        self.calibration = Calibration(
            device="fake",
            rate_hz=RATE_HZ,
            outputs=(Scale(1, volts, "declared by the simulator", "2026-01-01"),),
            inputs=(Scale(1, Quantity(FULL_IN_VRMS, "V"), "declared by the simulator", "2026-01-01"),),
        )
        self.settings = {
            "knob": Control("knob", "Knob", "%", 0.0, 100.0, 45.0, "how far the volume is turned up"),
            "load": Control("load", "Load switch", "Ω", 4.0, 1e6, 8.0, "which load is connected", (8.0, 4.0, 1e6)),
            "supply": Control("supply", "Supply", "V", 8.0, 24.0, 15.0, "the amplifier's supply voltage"),
        }
        self.next_frame = 0

    @property
    def controls(self) -> tuple[Control, ...]:
        return tuple(self.settings.values())

    def turn(self, name: str, value: float) -> None:
        control = self.settings[name]
        if not control.minimum <= value <= control.maximum:
            raise WrongUseError(f"{control.label} is {value:g}; it must lie within its range")
        self.settings[name] = attrs.evolve(control, value=value)

    def open(self) -> None:
        """Nothing to open."""

    def close(self) -> None:
        """Nothing to close."""

    def play(self, tone: Tone) -> int:
        return self.next_frame

    def capture(self, first_frame: int, frames: int, stop: object) -> Capture:
        return Capture(np.zeros((frames, 2)), RATE_HZ, first_frame)

    def mute(self) -> None:
        """Nothing sounds."""

    def release(self) -> None:
        """Nothing was muted."""


class FakeRunner:
    """Tells the screen synthetic readings: a sine through a soft, then hard clipper, computed in closed steps."""

    def __init__(self) -> None:
        self.screen = Screen()
        self.bench = FakeBench()
        self.calibration = self.bench.calibration
        wiring = Wiring(load=Load(rated_w=50.0), attenuator=Attenuator(13.3), bridge_tied=True)
        self.rig = Rig("bench", (wiring,), Limits(drive_vrms=1.0))
        self.wishes = Wishes(tone_on=True, frequency_hz=997.0, level_fs=0.25)
        self.limit = DriveLimit(self.rig, self.calibration)
        self.running = True
        self.mutes = 0
        self.stops = 0
        self.blocks = 0
        self.moving_db_per_s = 0.0
        self.state: State | None = None
        self._rng = np.random.default_rng(1)

    def wish(
        self,
        *,
        tone_on: bool | None = None,
        frequency_hz: float | None = None,
        level_fs: float | None = None,
        channel: int | None = None,
    ) -> None:
        before = self.wishes
        wanted = Wishes(
            before.tone_on if tone_on is None else tone_on,
            before.frequency_hz if frequency_hz is None else frequency_hz,
            before.level_fs if level_fs is None else level_fs,
            before.channel if channel is None else channel,
        )
        volts = wanted.level_fs * FULL_OUT_VRMS
        if volts > self.rig.limits.drive_vrms * (1 + 1e-9):
            limit = self.rig.limits.drive_vrms
            raise WrongUseError(
                f"drive {volts:.3g} V is above your limit of {limit:.3g} V; lower it or raise the limit"
            )
        self.wishes = wanted

    def mute(self) -> None:
        self.mutes += 1
        self.wishes = attrs.evolve(self.wishes, tone_on=False)

    def set_drive_limit_vrms(self, value: float) -> None:
        self.rig = attrs.evolve(self.rig, limits=attrs.evolve(self.rig.limits, drive_vrms=value))

    def set_drive_limit_fs(self, value: float) -> None:
        self.limit.set_fs(value)

    def stop(self, deadline_s: float = 2.0) -> None:
        self.stops += 1

    def begin(self) -> None:
        self.running = True

    def kept(self) -> int:
        return 0

    def step(self) -> None:
        """Read one block and tell the screen."""
        self.blocks += 1
        reading, picture = self.read()
        shown = (reading,)
        self.screen.tell(ReadingsTaken(shown))
        self.screen.show(Shown(shown, picture))

    def read(self) -> tuple[Reading, Picture]:
        """Return a reading and its picture for the controls as they stand."""
        ohm = self.bench.settings["load"].value
        settings = ReadingSettings(full_scale_vrms=FULL_IN_VRMS, load_ohm=ohm)
        span = Span(self.blocks * 4800, 4800, RATE_HZ)
        peak_v = self._peak_v()
        if self.state is not None or not self.wishes.tone_on:
            state = self.state or State.NO_TONE
            overload = note(Kind.OVERLOADED, percent=1.3, longest_frames=9.0, add_db=6.0)
            notes = (overload,) if state is State.OVERLOAD else ()
            reading = Reading(
                span=span,
                channel=1,
                settings=settings,
                state=state,
                peak_fs=1.0 if state is State.OVERLOAD else 0.002,
                notes=notes,
            )
            return reading, self._picture(reading, np.zeros(_POINTS), np.zeros(_POINTS))
        output = self._shape(peak_v)
        lines = np.fft.rfft(output) / (_POINTS / 2)
        fundamental = abs(lines[2])
        theta = 2 * math.pi * np.arange(_POINTS) / (_POINTS / 2)
        residual = output - fundamental * np.sin(theta) + self._rng.normal(0, 5e-4, _POINTS)
        residual += 2e-4 * np.sin(theta / 10 + self.blocks)
        reading = self._reading(span, settings, fundamental, lines)
        return reading, self._picture(reading, residual / fundamental, output / fundamental)

    def _peak_v(self) -> float:
        turned = self.bench.settings["knob"].value / 100
        return self.wishes.level_fs * FULL_OUT_VRMS * math.sqrt(2) * MOST_GAIN * turned**2

    def _shape(self, peak_v: float) -> Samples:
        theta = 2 * math.pi * np.arange(_POINTS) / (_POINTS / 2)
        rail = RAIL_PEAK_V * self.bench.settings["supply"].value / 15.0
        smooth = peak_v * np.sin(theta)
        smooth = smooth + 2e-5 * smooth**2 - 3e-7 * smooth**3 - 2e-5 * peak_v**2 / 2
        return np.asarray(np.clip(smooth, -rail, rail))

    def _reading(
        self,
        span: Span,
        settings: ReadingSettings,
        fundamental_v: float,
        lines: np.ndarray[Any, np.dtype[np.complex128]],
    ) -> Reading:
        hertz = self.wishes.frequency_hz
        ratios = {k: abs(lines[2 * k]) / fundamental_v for k in range(2, _ORDERS + 1) if k * hertz <= 20e3}
        noise = 6e-4 / fundamental_v * math.sqrt(2)
        hum = 2.5e-4 / fundamental_v * math.sqrt(2)
        harmonics = tuple(
            Harmonic(
                order,
                order * hertz,
                measured(ratio, ratio * 0.001 + 1e-7, "1"),
                float(np.angle(lines[2 * order]) + math.pi / 2),
                Remark.NOT_SEEN if ratio < noise * 0.01 else None,
            )
            for order, ratio in ratios.items()
        )
        thd = math.sqrt(sum(ratio**2 for ratio in ratios.values()))
        thdn = math.sqrt(thd**2 + noise**2 + hum**2)
        vrms = fundamental_v / math.sqrt(2) * math.sqrt(1 + thdn**2)
        moves: tuple[Note, ...] = (note(Kind.LEVEL_MOVES),) if self.moving_db_per_s else ()
        return Reading(
            span=span,
            channel=1,
            settings=settings,
            state=State.OK,
            notes=moves,
            moving_db_per_s=self.moving_db_per_s,
            fundamental_hz=measured(hertz, 2e-4, "Hz"),
            fundamental_fs=measured(fundamental_v / math.sqrt(2) / FULL_IN_VRMS, 1e-7, "1"),
            level_fs=measured(vrms / FULL_IN_VRMS, 1e-7, "1"),
            level_vrms=measured(vrms, vrms * 2e-4, "V"),
            power_w=None
            if settings.load_ohm is None
            else measured(vrms**2 / settings.load_ohm, 4e-4 * vrms**2 / settings.load_ohm, "W"),
            peak_fs=min(0.98, vrms * math.sqrt(2) / (FULL_IN_VRMS * math.sqrt(2)) * 1.02),
            thdn=measured(thdn, thdn * 0.006, "1", 900.0),
            thd=measured(thd, thd * 0.001, "1"),
            noise=measured(noise, noise * 0.01, "1"),
            hum=measured(hum, hum * 0.01, "1"),
            mains=Mains(
                50.0,
                (MainsLine(50.0, measured(hum * 0.5, 1e-7, "1")), MainsLine(100.0, measured(hum * 0.85, 1e-7, "1"))),
            ),
            harmonics=harmonics,
        )

    def _picture(
        self,
        reading: Reading,
        residual: Samples,
        output: Samples,
    ) -> Picture:
        hertz = np.geomspace(20, 20e3, 900)
        level = 10 ** ((-118 + 6 * np.exp(-(np.log(hertz / 60) ** 2))) / 20)
        noise = level * (1 + 0.5 * self._rng.random(900))
        return Picture(reading, np.arange(_POINTS) * 2.0 / _POINTS, residual, output, hertz, noise, 5.9, "Hann")
