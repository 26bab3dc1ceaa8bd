"""From a reading in full-scale units to one in volts and watts at the amplifier's terminals, with every budget.

Used by the live watch and by every procedure alike. What is the interface's own is said to be so: a quantity within its
reach becomes a limit (`Quantity.limited_by`) and never the amplifier's number.
"""

import math
from collections.abc import Sequence
from typing import Any

import attrs

from wattproof.core.calibration import Calibration
from wattproof.core.loopback import Response
from wattproof.core.quantity import STATISTICS, Part, Quantity
from wattproof.core.reading import Harmonic, Reading, Reference, Remark, State
from wattproof.core.rig import Load, Rig, Wiring
from wattproof.dsp.attenuation import attenuation, cable_factor
from wattproof.dsp.correction import in_reach, levelled, limit, relative, without_own_noise
from wattproof.dsp.interface_floor import Levels, OwnLine, own_lines, own_noise
from wattproof.dsp.intervals import arcsine, rectangular
from wattproof.dsp.load import power
from wattproof.dsp.sources import BAND_EDGES, FLOOR, FLOOR_NOISE, INTERFACE, NOISE, RESPONSE
from wattproof.dsp.uncertainty import combined, product

REFERENCE_HZ = 1_000.0  # level calibrations are carried to it
_DROWNED = 0.5  # of the rest: where limits make up more of a sum than this, the sum is a limit


def absolute(reading: Reading, rig: Rig, calibration: Calibration, drive_fs: float | None = None) -> Reading:
    """Return the reading in V and W, corrected, each quantity with its budget; as it was where nothing is known.

    `drive_fs` is the level of the tone that was played, to full scale, where it is known. What the rig does not wire
    stays as it was read, and so does a reading whose state is not ok.
    """
    wiring = next((wiring for wiring in rig.wirings if wiring.input == reading.channel), None)
    if wiring is None:
        return reading
    return _Conversion(reading, wiring, calibration, drive_fs).made()


@attrs.frozen(eq=False)
class _Conversion:
    reading: Reading
    wiring: Wiring
    calibration: Calibration
    drive_fs: float | None

    def made(self) -> Reading:
        reading = self.reading
        volts = self._volts(reading.level_fs)
        fundamental_hz = reading.fundamental_hz.value if reading.fundamental_hz else REFERENCE_HZ
        watts = None if volts is None else power(volts, self._load, self.wiring.name, fundamental_hz)
        scaled = attrs.evolve(reading, level_vrms=volts, power_w=watts)
        if reading.state is not State.OK or reading.fundamental_fs is None or not reading.fundamental_fs.value:
            return scaled
        return attrs.evolve(scaled, **self._distortion(reading.fundamental_fs.value))

    @property
    def _load(self) -> Load:
        """The rig's load, or where the reading was made with another one that was switched in, that as nominal."""
        load, read_with = self.wiring.load, self.reading.settings.load_ohm
        if read_with is None or math.isclose(read_with, load.ohm, rel_tol=1e-9):
            return load
        return Load(nominal_ohm=read_with, rated_w=load.rated_w, tolerance=load.tolerance)

    def _volts(self, level_fs: Quantity | None) -> Quantity | None:
        """Return volts at the terminals: level · V per full scale · attenuator, less the input's response."""
        scale = self.calibration.input_vrms(self.wiring.input)
        if scale is None or level_fs is None:
            return None
        frequency_hz = self.reading.fundamental_hz.value if self.reading.fundamental_hz else REFERENCE_HZ
        ratio = attenuation(self.wiring.attenuator, self.wiring.name, bridge_tied=self.wiring.bridge_tied)
        ratio = ratio.scaled(cable_factor(self.wiring.attenuator, frequency_hz), "1")
        volts = product(product(level_fs, scale, "V"), ratio, "V")
        return levelled(volts, self._response, frequency_hz, REFERENCE_HZ, self.wiring.input)

    @property
    def _response(self) -> Response:
        loop = self.calibration.loop(self.wiring.input)
        return self.calibration.response if loop is None else loop.response

    def _distortion(self, fundamental_fs: float) -> dict[str, Any]:
        """Return harmonics, THD, hum, noise and THD+N with the interface taken out as far as is honest."""
        reading = self.reading
        levels = Levels(fundamental_fs, self.drive_fs)
        own = own_lines(self.calibration, self.wiring, levels)
        harmonics = tuple(self._harmonic(harmonic, own.get(harmonic.order)) for harmonic in reading.harmonics)
        to_fundamental = self._over_fundamental(fundamental_fs)
        thd = self._thd(own, to_fundamental)
        noise = self._noise(levels, to_fundamental)
        hum = None if reading.hum is None else self._hum(reading.hum.scaled(to_fundamental, "1"), fundamental_fs)
        found: dict[str, Any] = {"harmonics": harmonics}
        thdn = _summed([quantity for quantity in (thd, hum, noise) if quantity is not None])
        back = 1.0 / to_fundamental
        named = {"thd": thd, "noise": noise, "hum": hum, "thdn": thdn}
        found.update({name: None if it is None else it.scaled(back, "1") for name, it in named.items()})
        if reading.thdn is None:
            found["thdn"] = None
        return found

    def _over_fundamental(self, fundamental_fs: float) -> float:
        """Return the factor from a ratio to the reading's reference to one to the fundamental."""
        if self.reading.settings.reference is Reference.FUNDAMENTAL or self.reading.level_fs is None:
            return 1.0
        return self.reading.level_fs.value / fundamental_fs

    def _harmonic(self, harmonic: Harmonic, own: OwnLine | None) -> Harmonic:
        ratio = levelled(
            harmonic.ratio,
            self._response,
            harmonic.frequency_hz,
            harmonic.frequency_hz / harmonic.order,
            self.wiring.input,
        )
        stated = self._stated(ratio, harmonic, 0.0 if own is None else own.ratio)
        return Harmonic(harmonic.order, harmonic.frequency_hz, stated, harmonic.phase_rad, harmonic.remark)

    def _stated(self, ratio: Quantity, harmonic: Harmonic, added: float) -> Quantity:
        """Return a harmonic as a limit where the noise or the interface may be all of it, else with what that adds."""
        if harmonic.remark is Remark.NOT_SEEN:
            return limit(ratio, added, INTERFACE if added > ratio.u else NOISE)
        if added == 0.0:
            return ratio
        if in_reach(ratio, added):
            return limit(ratio, added)
        return Quantity(ratio.value, "1", (*ratio.parts, Part(self._floor_of(harmonic.order), arcsine(added))))

    def _floor_of(self, order: int) -> str:
        return f"{FLOOR} H{order} out {self.wiring.output} in {self.wiring.input}"

    def _thd(self, own: dict[int, OwnLine], to_fundamental: float) -> Quantity | None:
        """Return THD to the fundamental, each harmonic levelled, with what the interface may have added or taken."""
        seen = self.reading.thd
        if seen is None:
            return None
        square, slope = seen.value**2 * to_fundamental**2, 0.0
        for harmonic in self.reading.harmonics:
            bend = relative(self._response, harmonic.frequency_hz, harmonic.frequency_hz / harmonic.order)
            part = harmonic.ratio.value**2 / bend.gain**2
            if harmonic.remark is not Remark.NOT_SEEN:
                square += part - harmonic.ratio.value**2
                slope -= part * bend.half_log
        value = math.sqrt(max(square, 0.0))
        parts = [attrs.evolve(part, u=part.u * to_fundamental) for part in seen.parts]
        thd = Quantity(value, "1", tuple(parts))
        added = math.sqrt(math.fsum(line.ratio**2 for line in own.values()))
        if value == 0.0 or in_reach(thd, added):
            return limit(thd, added, INTERFACE if added > thd.u else NOISE)
        if slope:
            parts.append(Part(f"{RESPONSE} in {self.wiring.input}", rectangular(1.0) * slope / value))
        for harmonic in self.reading.harmonics:
            if harmonic.order in own and harmonic.remark is not Remark.NOT_SEEN:
                share = harmonic.ratio.value / value
                parts.append(Part(self._floor_of(harmonic.order), share * arcsine(own[harmonic.order].ratio)))
        return Quantity(value, "1", tuple(parts))

    def _noise(self, levels: Levels, to_fundamental: float) -> Quantity | None:
        seen = self.reading.noise
        if seen is None:
            return None
        noise = seen.scaled(to_fundamental, "1")
        low, high = self.reading.settings.band_hz
        # half a bin of doubt at either edge of the band, in power (two edges, each rectangular)
        edges = noise.value * rectangular(0.5 / (self.reading.span.seconds * (high - low))) * math.sqrt(0.5)
        noise = attrs.evolve(noise, parts=(*noise.parts, Part(BAND_EDGES, edges)))
        own = own_noise(self.calibration, self.wiring, levels)
        return noise if own is None else without_own_noise(noise, own.scaled(1.0 / levels.input_fs, "1"))

    def _hum(self, hum: Quantity, fundamental_fs: float) -> Quantity:
        loop = self.calibration.loop(self.wiring.input)
        if loop is None or not loop.mains.lines:
            return hum
        added = math.sqrt(math.fsum(line.ratio.value**2 for line in loop.mains.lines)) / fundamental_fs
        if in_reach(hum, added):
            return limit(hum, added)
        part = Part(f"{FLOOR} hum in {self.wiring.input}", arcsine(added))
        return attrs.evolve(hum, parts=(*hum.parts, part))


def _summed(parts: Sequence[Quantity]) -> Quantity | None:
    """Return the root of the sum of squares: THD+N from its parts, all to the fundamental.

    A part that is a limit lies anywhere from nothing to it (rectangular in power). Where limits make up more than half
    of what is known, the sum is a limit too.
    """
    if not parts:
        return None
    known = [part for part in parts if part.limited_by is None]
    limits = [part for part in parts if part.limited_by is not None]
    sure = math.fsum(part.value**2 for part in known)
    open_square = math.fsum(part.value**2 for part in limits)
    if limits and open_square > _DROWNED * sure:
        u = _root_sum(known, math.sqrt(sure)).u if sure else 0.0
        by = limits[0].limited_by
        return Quantity(math.sqrt(sure + open_square) + 2.0 * u, "1", (Part(STATISTICS, u),) if u else (), by)
    value = math.sqrt(sure + open_square / 2.0)
    if value == 0.0:
        return Quantity(0.0, "1", parts[0].parts)
    summed = _root_sum(known, value)
    if not limits:
        return summed
    return attrs.evolve(
        summed, parts=(*summed.parts, Part(f"{FLOOR_NOISE} limit", rectangular(open_square / 2.0) / (2.0 * value)))
    )


def _root_sum(parts: Sequence[Quantity], value: float) -> Quantity:
    """Return √Σx² as `value`; the parts' own scatter is independent, what they share adds with its sign."""
    told = [
        attrs.evolve(
            part,
            parts=tuple(
                attrs.evolve(each, source=f"{STATISTICS} {index}") if each.source == STATISTICS else each
                for each in part.parts
            ),
        )
        for index, part in enumerate(parts)
    ]
    whole = combined(value, "1", [(part.value / value, part) for part in told])
    scatter = [part for part in whole.parts if part.source.startswith(STATISTICS)]
    rest = tuple(part for part in whole.parts if not part.source.startswith(STATISTICS))
    merged = Quantity(0.0, "1", tuple(scatter))
    return attrs.evolve(whole, parts=(Part(STATISTICS, merged.u, merged.dof), *rest) if scatter else rest)
