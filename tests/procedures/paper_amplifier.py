"""An amplifier on paper: answers a procedure's requests with readings computed in closed form, in no time."""

import math
from collections.abc import Callable

import attrs
import numpy as np

from wattproof.core.calibration import Calibration, Scale
from wattproof.core.picture import Picture
from wattproof.core.quantity import Quantity, measured
from wattproof.core.reading import Reading, ReadingSettings, State
from wattproof.core.rig import Attenuator, Load, Rig, Wiring
from wattproof.core.signal import Capture
from wattproof.procedures.power_rows import Place
from wattproof.procedures.requests import (
    Acquire,
    Ask,
    Kept,
    Play,
    Procedure,
    Progress,
    Prompt,
    Said,
    Shown,
    Wanted,
    Wishes,
)

RATE_HZ = 1000.0  # frames are counted and hold nothing: one a millisecond
FULL_SCALE_VRMS = 2.0


@attrs.define
class Paper:
    """A hard clipper of voltage gain `gain` that clips at `clip_vrms` into 8 Ω, with noise and two channels.

    `output_ohm` lets the level depend on the load. `deaf_from_fs`: from this drive on it is silent, as a protection
    that tripped; `here` is what a person would have said. The volume control stands at `knob_db` and is turned by
    `knob_db_per_s` when a prompt says so, no further than `knob_top_db`; at `dead_at_db` on its way the output dies.
    """

    gain: float = 30.0
    clip_vrms: float = 10.0
    noise_vrms: float = 1e-3
    output_ohm: float = 0.08
    load_ohm: float = 8.0
    deaf_from_fs: float = math.inf
    knob_db: float = 0.0
    knob_db_per_s: float = 6.0
    knob_top_db: float = 0.0
    dead_at_db: float = math.inf
    level_fs: float = 0.0
    outputs: tuple[int, ...] = ()
    here: int = 0
    answers_here: bool = True
    answer: str = "yes"
    played: list[float] = attrs.field(factory=list)
    asked: list[tuple[Ask, float]] = attrs.field(factory=list)  # with the level that sounded meanwhile
    prompts: list[Ask] = attrs.field(factory=list)
    records: list[Kept | Said] = attrs.field(factory=list)
    progress: list[Progress] = attrs.field(factory=list)
    spells_s: list[float] = attrs.field(factory=list)  # how long each level stood before the next was played
    now: int = 0
    _since: int = 0
    _turning: float = 0.0

    def place(self, *, rated_w: float | None = 100.0, limit_fs: float = 0.5) -> Place:
        load = Load(nominal_ohm=8.0, rated_w=rated_w)
        attenuator = Attenuator(ratio=20.0, rated_vrms=100.0)
        wirings = tuple(Wiring(name, n, n, load, attenuator) for n, name in ((1, "left"), (2, "right")))
        scales = tuple(Scale(n, Quantity(FULL_SCALE_VRMS, "V"), "typed", "2026-01-01") for n in (1, 2))
        calibration = Calibration(device="paper", rate_hz=RATE_HZ, inputs=scales, outputs=scales)
        return Place(
            RATE_HZ, 2, Rig("paper", wirings), calibration, {1: limit_fs, 2: limit_fs}, self.new_reader, real=False
        )

    def new_reader(self, rate_hz: float, settings: tuple[ReadingSettings, ...]) -> "PaperReader":
        return PaperReader(self, settings)

    def run(self, procedure: Procedure, until: Callable[["Paper"], bool] = lambda _: False) -> None:
        """Answer a procedure until it ends, or until a condition holds."""
        item = next(procedure)
        while not until(self):
            try:
                item = procedure.send(self._answer(item))
            except StopIteration:
                return

    def _answer(self, item: object) -> int | str | Capture | Wishes | None:
        match item:
            case Play(tone):
                self.level_fs, self.outputs = tone.level_fs, tone.outputs
                self.spells_s.append((self.now - self._since) / RATE_HZ)
                self._since = self.now
                self.played.append(tone.level_fs)
                return self.now
            case Acquire(frames=frames, hop=hop, settle_s=settle_s):
                self.now += round(settle_s * RATE_HZ)
                self._turn(frames / RATE_HZ if hop is None else max(hop, 1) / RATE_HZ)
                first = self.now if hop is None else self.now - frames + max(hop, 1)
                self.now = first + frames
                return Capture(np.zeros((frames, 2)), RATE_HZ, first)
            case Ask() as ask:
                self.asked.append((ask, self.level_fs))
                if ask.want == "down":
                    self.knob_db = -45.0
                if ask.action == "switch_load":
                    self.load_ohm = float(ask.want)
                return self.answer
            case Wanted():
                return Wishes(tone_on=False, frequency_hz=997.0, level_fs=0.0, here=self.here)
        self._note(item)
        return None

    def _note(self, item: object) -> None:
        match item:
            case Kept() | Said():
                self.records.append(item)
            case Progress():
                self.progress.append(item)
            case Prompt(ask):
                self.prompts.append(ask)
                self.here += self.answers_here and ask.want == "here"
                self._turning = {"up": 1.0, "back": -1.0}.get(str(ask.want), 0.0) * self.knob_db_per_s
            case Shown():
                pass
            case _:
                raise AssertionError(item)

    def _turn(self, seconds: float) -> None:
        self.knob_db = min(self.knob_db + self._turning * seconds, self.knob_top_db)

    def delivered(self, level_fs: float) -> tuple[float, float, float]:
        """Return (total V rms, THD, noise ratio) at a drive: a sine clipped hard, in closed form."""
        share = self.load_ohm / (self.load_ohm + self.output_ohm)
        wanted = level_fs * FULL_SCALE_VRMS * self.gain * share * 10.0 ** (self.knob_db / 20.0)
        if level_fs >= self.deaf_from_fs or self.knob_db >= self.dead_at_db:
            wanted = 0.0
        height = wanted / self.clip_vrms
        if height <= 1.0:
            total = math.hypot(wanted, self.noise_vrms)
            return total, 0.0, self.noise_vrms / total
        theta = math.asin(1.0 / height)
        square = 2.0 / math.pi * (height**2 * (theta / 2 - math.sin(2 * theta) / 4) + math.pi / 2 - theta)
        first = 2.0 * height / math.pi * (theta + math.sin(theta) * math.cos(theta))
        volts = self.clip_vrms * math.sqrt(2.0 * square)
        total = math.hypot(volts, self.noise_vrms)
        return total, math.sqrt(max(2.0 * square - first**2, 0.0)) * self.clip_vrms / total, self.noise_vrms / total


class PaperReader:
    """Reads what the paper amplifier delivers at the moment; channels that are not driven have no tone."""

    def __init__(self, paper: Paper, settings: tuple[ReadingSettings, ...]) -> None:
        self._paper, self._settings = paper, settings
        self.next_frames = 250

    def restart(self, frequency_hz: float | None) -> None:
        return

    def take(self, capture: Capture, picture_channel: int | None) -> tuple[tuple[Reading, ...], Picture | None]:
        return tuple(self._read(capture, channel) for channel in (1, 2)), None

    def _read(self, capture: Capture, channel: int) -> Reading:
        settings = self._settings[channel - 1]
        total, thd, noise = self._paper.delivered(self._paper.level_fs)
        silent = channel not in self._paper.outputs or total < 2.0 * self._paper.noise_vrms
        if silent:
            return Reading(span=capture.span, channel=channel, settings=settings, state=State.NO_TONE)
        thdn = math.hypot(thd, noise)
        full_scale = settings.full_scale_vrms or 1.0

        def ratio(value: float) -> Quantity:
            return measured(value, 1e-4 * value, "1")

        return Reading(
            span=capture.span,
            channel=channel,
            settings=settings,
            state=State.OK,
            fundamental_hz=measured(997.0, 1e-6, "Hz"),
            fundamental_fs=ratio(total / full_scale),
            level_fs=ratio(total / full_scale).scaled(1.0, "1"),
            level_vrms=measured(total, 1e-6 * total, "V"),
            power_w=measured(total**2 / (settings.load_ohm or 8.0), 2e-6 * total, "W"),
            crest_factor=measured(min(math.sqrt(2.0), self._paper.clip_vrms * math.sqrt(2.0) / total), 1e-4, "1"),
            thdn=ratio(thdn),
            thd=ratio(thd),
            noise=ratio(noise),
            hum=ratio(0.0),
        )
