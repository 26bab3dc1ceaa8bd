"""Noise and hum at rest: the JSON document that programs rely on, and the page for people.

The contract, version 1. Readers ignore keys that they don't know; `version` rises only when a key changes its meaning
or goes. The document is ASCII and holds no NaN and no infinity.

    {"wattproof": "idle", "version": 1, "settings": {..}, "rig": {..}, "ending", "why",
     "channels": [{"channel": 1, "load_ohm": x, "band_hz": [lo, hi], "terminated": "seen" | "not" | "stated",
       "unweighted_vrms": Q, "noise_vrms": Q, "hum_vrms": Q, "a_weighted_vrms": Q, "quasi_peak_v": Q,
       "quasi_peak_highest_v": x,
       "levels": {"unweighted" | "a_weighted" | "quasi_peak":
         {"dbv": x, "below_output_db": x | null, "below_1w_db": x, "u_db": x}},
       "mains": {"frequency_hz": x | null, "lines": [{"frequency_hz": x, "level_vrms": Q}]},
       "density": [{"frequency_hz": x, "v_per_rthz": Q}], "dc_v": Q | null, "dc_origin": "read" | "typed" | null}],
     "notes": [sentences]}

Q is {"value", "u", "unit", "limited_by"} with u the standard uncertainty in the same unit; `limited_by` is null for a
measurement, else it names what makes the value a limit that the truth does not exceed. `unweighted_vrms` holds hum and
noise, `noise_vrms` noise alone. `a_weighted_vrms` is by IEC 61672-1 in the band, `quasi_peak_v` by ITU-R BS.468-4 with
its quasi-peak meter: the mean of the needle; `quasi_peak_highest_v` its highest swing, the interface's noise included.
`below_output_db` is to `output_vrms` of the settings. Densities are in twelfths of an octave, lines left out.
"""

from wattproof.core.notes import Kind
from wattproof.core.quantity import Quantity
from wattproof.core.units import DB_PER_RELATIVE, db
from wattproof.procedures.idle import IdleChannel, IdleResult
from wattproof.report.quantities import Document, Frame, cell, envelope, q
from wattproof.report.sheet import Grid, Sheet

_TERMINATED = {Kind.TERMINATED_SEEN: "seen", Kind.NOT_TERMINATED: "not", Kind.TERMINATED_STATED: "stated"}
_SHOWN_HZ = (20.0, 100.0, 1_000.0, 10_000.0, 20_000.0)
_SHOWN_LINES = 6


def idle_document(result: IdleResult, frame: Frame) -> Document:
    """Return the document of one run of `idle`."""
    notes = [*result.said, *(each for channel in result.channels for each in channel.notes)]
    return envelope(frame, {"channels": [_channel(result, each) for each in result.channels]}, notes)


def _channel(result: IdleResult, channel: IdleChannel) -> Document:
    plan = result.plan
    weighted = {
        "unweighted": channel.unweighted_vrms,
        "a_weighted": channel.a_weighted_vrms,
        "quasi_peak": channel.quasi_peak_v,
    }
    return {
        "channel": channel.row.channel,
        "load_ohm": channel.row.load.ohm,
        "band_hz": [plan.low_hz, plan.high_hz],
        "terminated": next((_TERMINATED[each.kind] for each in channel.notes if each.kind in _TERMINATED), "stated"),
        "unweighted_vrms": q(channel.unweighted_vrms),
        "noise_vrms": q(channel.noise_vrms),
        "hum_vrms": q(channel.hum_vrms),
        "a_weighted_vrms": q(channel.a_weighted_vrms),
        "quasi_peak_v": q(channel.quasi_peak_v),
        "quasi_peak_highest_v": channel.quasi_peak_highest_v,
        "levels": {name: _levels(result, channel, level) for name, level in weighted.items()},
        "mains": {
            "frequency_hz": channel.mains_hz,
            "lines": [{"frequency_hz": each.frequency_hz, "level_vrms": q(each.level_vrms)} for each in channel.lines],
        },
        "density": [{"frequency_hz": hz, "v_per_rthz": q(density)} for hz, density in channel.density],
        "dc_v": q(channel.dc_v),
        "dc_origin": channel.dc_origin or None,
    }


def _levels(result: IdleResult, channel: IdleChannel, level: Quantity) -> Document:
    output = result.plan.output_vrms
    dbv = db(level.value) if level.value > 0.0 else None
    return {
        "dbv": dbv,
        "below_output_db": None if output is None or dbv is None else db(output) - dbv,
        "below_1w_db": None if dbv is None else db(channel.one_watt_vrms) - dbv,
        "u_db": None if dbv is None else DB_PER_RELATIVE * level.u / level.value,
    }


def idle_sheet(result: IdleResult) -> Sheet:
    """Return the page of one run of `idle`."""
    plan = result.plan
    notes = (*result.said, *(each for channel in result.channels for each in channel.notes))
    head = f"Input terminated, nothing playing; band {plan.low_hz:g} Hz to {plan.high_hz:g} Hz; ± at 95 %"
    grids = []
    for channel in result.channels:
        grids.append(_noise_grid(result, channel))
        grids.append(_lines_grid(channel))
        grids.append(_density_grid(channel))
    return Sheet("Noise and hum at rest", head, tuple(grids), notes)


def _noise_grid(result: IdleResult, channel: IdleChannel) -> Grid:
    rows = []
    named = (
        ("unweighted, with hum", channel.unweighted_vrms),
        ("A-weighted (IEC 61672-1)", channel.a_weighted_vrms),
        ("ITU-R BS.468-4, quasi-peak", channel.quasi_peak_v),
        ("hum", channel.hum_vrms),
        ("noise without hum", channel.noise_vrms),
    )
    for name, level in named:
        told = _levels(result, channel, level)
        rows.append((name, cell(level), _db(told["dbv"]), _db(told["below_output_db"]), _db(told["below_1w_db"])))
    rows.append(("DC offset", cell(channel.dc_v), "–", "–", "–"))
    columns = ("", "V", "dBV", "below output, dB", "below 1 W, dB")
    return Grid(f"Channel {channel.row.channel}, {channel.row.load.ohm:.4g} Ω", columns, tuple(rows))


def _lines_grid(channel: IdleChannel) -> Grid:
    loudest = sorted(channel.lines, key=lambda line: -line.level_vrms.value)[:_SHOWN_LINES]
    rows = tuple((f"{each.frequency_hz:.2f} Hz", cell(each.level_vrms)) for each in loudest)
    found = "none seen" if channel.mains_hz is None else f"{channel.mains_hz:.3f} Hz, found by itself"
    return Grid(f"Mains lines: {found}", ("Line", "V"), rows)


def _density_grid(channel: IdleChannel) -> Grid:
    nearest = [_nearest(channel, hz) for hz in _SHOWN_HZ] if channel.density else []
    rows = tuple((f"{hz:.5g} Hz", f"{1e9 * density.value:.4g} nV/√Hz") for hz, density in dict(nearest).items())
    return Grid("Noise density", ("At", "Density"), rows)


def _db(level: object) -> str:
    return f"{level:.2f}" if isinstance(level, float) else "–"


def _nearest(channel: IdleChannel, wanted_hz: float) -> tuple[float, Quantity]:
    return min(channel.density, key=lambda pair: abs(pair[0] / wanted_hz - 1.0))
