"""Volts per full scale from a person's meter: at which frequency, how sure, and what a wrong reading looks like."""

import math

import attrs

from wattproof.core import checks
from wattproof.core.errors import WrongUseError
from wattproof.core.fields import declared
from wattproof.core.loopback import Response
from wattproof.core.quantity import Part, Quantity
from wattproof.core.reading import Reading, State
from wattproof.dsp.correction import levelled
from wattproof.dsp.intervals import rectangular, resolution
from wattproof.dsp.sources import LEVEL, SCATTER
from wattproof.dsp.uncertainty import named_scatter, ratio

MAINS_HZ = (50.0, 60.0)
CLEAR_HZ = 7.0  # from every multiple of the mains, so that hum beats slowly with nothing
WANTED_HZ = 1_000.0
INSIDE = 1.25  # how far inside the meter's stated band its accuracy is trusted: common practice, no source
CLEANEST_THDN = 1e-3  # an average-responding meter is then wrong by a thirtieth of a per cent at most
SINE_ONLY = 1.0 / 3.0  # of the third harmonic, the strongest, moves the mean of a rectified sine (closed form)
SCALES_VRMS = (0.05, 60.0)  # V rms of full scale of what is called an audio interface: common practice, no source
_SLIP = 3.0  # a reading this far off what another output gave is a slip
_THOUSAND = (500.0, 2000.0)  # and this far one of the unit


@attrs.frozen(kw_only=True)
class Meter:
    """What the meter's data sheet says of AC volts in the range that is used."""

    name: str = declared("meter", label="Meter", help="make and serial number, as the record shall name it")
    percent: float = declared(
        1.0, label="Accuracy", unit="% of reading", minimum=0.0, maximum=20.0, help="from the data sheet, AC volts"
    )
    digits: float = declared(3.0, label="Digits", minimum=0.0, maximum=1000.0, help="the + digits of the data sheet")
    step_v: float = declared(
        0.001, label="Last digit", unit="V", minimum=1e-9, maximum=10.0, help="one step of the last digit in this range"
    )
    range_v: float | None = declared(
        None, label="Range", unit="V", help="end of the range that is used", validator=checks.positive
    )
    true_rms: bool = declared(default=True, label="True rms", help="else it is average-responding, for sines only")
    burden_ohm: float = declared(
        1e7, label="Burden", unit="Ω", minimum=1e3, maximum=1e12, help="the meter's own input resistance"
    )
    low_hz: float = declared(45.0, label="From", unit="Hz", minimum=1.0, maximum=1e6, help="band of the accuracy")
    high_hz: float = declared(400.0, label="To", unit="Hz", minimum=1.0, maximum=1e7, help="band of the accuracy")

    def __attrs_post_init__(self) -> None:
        if self.low_hz >= self.high_hz:
            raise ValueError(f"the meter's band {self.low_hz:g}-{self.high_hz:g} Hz is reversed or empty; look it up")

    def limits_v(self, read_v: float) -> float:
        """Return how far the reading may be off by the data sheet, in V."""
        return self.percent / 100.0 * read_v + self.digits * self.step_v


@attrs.frozen
class Proposal:
    """The frequency at which to compare, in Hz, and why."""

    frequency_hz: float
    why: str


def propose(meter: Meter) -> Proposal:
    """Return the frequency nearest to 1 kHz that lies inside the meter's band and clear of mains multiples.

    Raises:
        WrongUseError: the band holds none.
    """
    low, high = meter.low_hz * INSIDE, meter.high_hz / INSIDE
    if low > high:
        low, high = meter.low_hz, meter.high_hz
    candidates = [
        float(hz) for hz in range(math.ceil(low), math.floor(min(high, 20_000.0)) + 1) if _clear(hz) >= CLEAR_HZ
    ]
    if not candidates:
        raise WrongUseError(
            f"the meter's band {meter.low_hz:g}-{meter.high_hz:g} Hz holds no frequency {CLEAR_HZ:g} Hz clear of the "
            "mains; use another meter"
        )
    best = min(candidates, key=lambda hz: (abs(math.log(hz / WANTED_HZ)), -_clear(hz)))
    at = "near 1 kHz" if abs(best - WANTED_HZ) < 20.0 else "as near to 1 kHz as that allows"
    return Proposal(
        best,
        f"{best:g} Hz: inside the meter's band of {meter.low_hz:g} to {meter.high_hz:g} Hz, {_clear(best):g} Hz from "
        f"the nearest multiple of 50 and 60 Hz, so that hum does not beat with it, and {at}; the measured response "
        "carries it to 1 kHz",
    )


def _clear(frequency_hz: float) -> float:
    return min(abs(frequency_hz - mains * max(1, round(frequency_hz / mains))) for mains in MAINS_HZ)


def meter_reading(meter: Meter, read_v: float, expected_v: float | None = None) -> Quantity:
    """Return what a meter showed as a Quantity: its limits are rectangular (GUM 4.3.7), its last digit too.

    Raises:
        WrongUseError: no voltage, beyond the range, or so far from what was expected that the unit must be wrong.
    """
    if not (math.isfinite(read_v) and read_v > 0.0):
        raise WrongUseError(f"meter reading {read_v:g} V: give the AC voltage that the meter shows, above zero, in V")
    if expected_v is not None and not 1.0 / _SLIP < read_v / expected_v < _SLIP:
        raise WrongUseError(_slip(read_v, expected_v))
    if meter.range_v is not None and read_v > meter.range_v:
        hint = f"it looks like mV; give volts, {read_v / 1e3:g}" if read_v <= 1e3 * meter.range_v else "give V"
        raise WrongUseError(f"meter reading {read_v:g} V is beyond its range of {meter.range_v:g} V: {hint}")
    u = math.hypot(rectangular(meter.limits_v(read_v)), resolution(meter.step_v))
    return Quantity(read_v, "V", (Part(f"{LEVEL} {meter.name}", u),))


def _slip(read_v: float, expected_v: float) -> str:
    said = f"meter reading {read_v:g} V where about {expected_v:.3g} V is expected"
    if _THOUSAND[0] < read_v / expected_v < _THOUSAND[1]:
        return f"{said}: it looks like mV; give volts, {read_v / 1e3:g}"
    return f"{said}: look at the range, the unit and AC mode, and give what it shows in V"


def full_scale(
    reading: Reading, volts: Quantity, meter: Meter, response: Response | None = None, source_ohm: float = 0.0
) -> Quantity:
    """Return V rms of a full-scale sine at the socket whose level was read while the meter showed `volts`.

    The level is carried to 1 kHz by the response. An average-responding meter is wrong by a third of the harmonics at
    most; `source_ohm` is what the meter loads where it stood at an output and that output's own voltage is wanted.

    Raises:
        WrongUseError: the reading is not ok, or the sine is not clean enough for a meter.
    """
    if reading.state is not State.OK or reading.level_fs is None or reading.fundamental_hz is None:
        raise WrongUseError(f"the tone could not be read ({reading.state}); look at the wiring and compare again")
    thdn = reading.thdn
    if thdn is not None and thdn.value > CLEANEST_THDN:
        raise WrongUseError(
            f"the sine has {thdn.value * 100.0:.2g} % THD+N and a level calibration needs less than 0.1 %; use the "
            "interface's own sine, never a class-D or clipped output"
        )
    level = named_scatter(reading.level_fs, f"{LEVEL}{SCATTER}")
    level = attrs.evolve(
        level, parts=tuple(attrs.evolve(p, source=f"{LEVEL}{SCATTER} {reading.channel}") for p in level.parts)
    )
    scale = ratio(volts, level, "V")
    if not SCALES_VRMS[0] <= scale.value <= SCALES_VRMS[1]:
        raise WrongUseError(_implausible(volts.value, scale.value))
    if response is not None:
        # the scale rises where the input lets less through: the reciprocal of a level
        scale = levelled(scale, _reciprocal(response), reading.fundamental_hz.value, WANTED_HZ, reading.channel)
    parts = list(scale.parts)
    if not meter.true_rms:
        worst = SINE_ONLY * (0.0 if reading.thd is None else reading.thd.value)
        parts.append(Part(f"{LEVEL} waveform", scale.value * rectangular(worst)))
    if source_ohm:
        parts.append(Part(f"{LEVEL} burden", scale.value * rectangular(source_ohm / meter.burden_ohm)))
    return attrs.evolve(scale, parts=tuple(parts))


def _reciprocal(response: Response) -> Response:
    return Response(response.frequency_hz, 1.0 / response.gain) if response.frequency_hz.size else response


def _implausible(read_v: float, scale_v: float) -> str:
    said = f"meter reading {read_v:g} V makes full scale {scale_v:.4g} V rms, which no audio interface has"
    if scale_v > SCALES_VRMS[1] and SCALES_VRMS[0] <= scale_v / 1e3 <= SCALES_VRMS[1]:
        return f"{said}: it looks like mV; give volts, {read_v / 1e3:g}"
    return f"{said}: look at the unit, the range and the gain, and give what the meter shows in V"
