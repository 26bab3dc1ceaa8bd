"""What a person must know before building and connecting an attenuator, each figure with what it rests on."""

from collections.abc import Iterator

import attrs

from wattproof.core.units import db
from wattproof.dsp.attenuator import Plan
from wattproof.dsp.attenuator_bridge import common_mode, rejection
from wattproof.dsp.attenuator_faults import faults
from wattproof.dsp.attenuator_noise import noise
from wattproof.dsp.attenuator_wish import BRIDGE_TOLERANCE, Wish
from wattproof.dsp.intervals import budget
from wattproof.report.engineering import engineering

COMPUTED = "computed"
PRACTICE = "common practice, no source"
STATED = "as stated"
NOT_READ = "IEC 61140, unverified, read the text"
_TOUCH_VRMS = 50.0  # the upper limit of extra-low voltage, AC; NOT_READ
_TOUCH_DC_V = 120.0  # likewise, ripple-free DC
_INPUT_SHARE = 0.5  # of the ratio's variance


@attrs.frozen
class Caution:
    """One sentence, and what its figures rest on; an empty basis where it has none."""

    text: str
    basis: str = ""


def warnings(plan: Plan) -> tuple[Caution, ...]:
    """Return what can hurt a person, the amplifier or the interface, the nearest danger first."""
    return (*_output(plan), *_before_connecting(), *_heat_and_mains(plan), *_doubts(plan))


def assumptions(plan: Plan) -> tuple[Caution, ...]:
    """Return what was taken where nothing was stated, and what was stated."""
    return tuple(_assumptions(plan))


def verdict(plan: Plan) -> Caution:
    """Return in one sentence what any single failed part does."""
    every = faults(plan)
    bad = [f"{fault.part} {fault.kind.value}" for fault in every if not fault.harmless]
    if bad:
        return Caution(f"A single failed part exceeds a limit: {', '.join(bad)}. Don't build this.", COMPUTED)
    worst = max(every, key=lambda fault: fault.pin_v)
    return Caution(
        f"No single part, open or short, puts the amplifier's output on the input: at worst {worst.part} "
        f"{worst.kind.value} brings {engineering(worst.pin_v, 'V')} peak to it; its limit is "
        f"{engineering(worst.limit_v, 'V')}.",
        COMPUTED,
    )


def _output(plan: Plan) -> Iterator[Caution]:
    wish = plan.wish
    if not wish.bridge_tied:
        yield Caution(
            "This plan is for a single-ended output: one terminal is the amplifier's ground. Make sure of it before "
            "you connect; where neither terminal is ground, joining one to the interface can destroy the amplifier: "
            "plan with --bridge."
        )
    else:
        yield Caution(
            "Bridge-tied: neither output terminal is ground. Both sit near half the supply, some "
            f"{engineering(wish.rail / 2.0, 'V')}. Joining one to the ground of an interface or an oscilloscope can "
            "destroy the amplifier. Each terminal goes through its own R1 to its own pin; never a lone R2 across the "
            "pair, or all of that voltage arrives.",
            COMPUTED,
        )
    if wish.two_inputs:
        yield Caution(
            "Two inputs: subtract them only after their gains were matched by measurement, with both taps on one "
            "point. Rejection is then as good as that match, and no better."
        )
    yield Caution("Switch phantom power off before you connect, and keep it off: it would feed the attenuator.")


def _before_connecting() -> Iterator[Caution]:
    yield Caution(
        "Before you connect, with everything switched on, put 1 kΩ between the amplifier's common and the interface's "
        "ground and measure across it, AC and DC. Above 0.5 V, stop: find out why first.",
        PRACTICE,
    )
    yield Caution(
        "A mains-powered computer earths the interface. A chassis tied to the mains must never be connected. The drive "
        "cable already joins the amplifier's ground to the interface's."
    )


def _heat_and_mains(plan: Plan) -> Iterator[Caution]:
    yield Caution(
        f"The load takes {engineering(plan.wish.power_w, 'W')} and gets hot enough to burn skin and bench. Mount it on "
        "metal, away from what burns; don't touch it during a test or soon after.",
        STATED,
    )
    yield Caution(
        "Mains-powered equipment opened on a bench can kill, also when unplugged. That work is for licensed practice "
        "and local rules."
    )
    if plan.wish.full_vrms > _TOUCH_VRMS or plan.wish.rail > _TOUCH_DC_V:
        yield Caution(
            f"The output reaches {engineering(plan.wish.full_vrms, 'V')} rms and {engineering(plan.wish.rail, 'V')} "
            f"peak: above {_TOUCH_VRMS:g} V AC or {_TOUCH_DC_V:g} V DC a touch can kill. Cover every terminal.",
            NOT_READ,
        )


def _doubts(plan: Plan) -> Iterator[Caution]:
    wish = plan.wish
    if wish.rail_v is None:
        yield Caution(
            f"The output's highest voltage against ground is not stated. All that is said of faults holds up to "
            f"{engineering(wish.rail, 'V')}, the least that the power needs; the real one is higher. Give --rail.",
            COMPUTED,
        )
    if wish.bridge_tied and wish.part_tolerance > BRIDGE_TOLERANCE:
        kept = rejection(plan)
        yield Caution(
            f"Parts of {100.0 * wish.part_tolerance:g} % keep out only {db(kept.worst):.0f} dB of what both terminals "
            f"share in the worst case, {db(kept.standard):.0f} dB by standard uncertainty. Use 0.1 % or measured "
            "parts.",
            COMPUTED,
        )
    if wish.bridge_tied and common_mode(plan).stuck_v > wish.pin_limit_v:
        yield Caution("With one half at its rail a pin exceeds its limit.", COMPUTED)
    first = budget(plan.ratio())[0]
    if first.source == "input impedance" and first.share > _INPUT_SHARE:
        yield Caution(
            f"The input impedance, known to {100.0 * wish.input_tolerance:g} %, is {100.0 * first.share:.0f} % of the "
            "ratio's variance. Measure the ratio on the finished attenuator, connected.",
            COMPUTED,
        )
    if noise(plan).share > 1.0:
        yield Caution("The attenuator's thermal noise is above the interface's own.", COMPUTED)


def _assumptions(plan: Plan) -> Iterator[Caution]:
    wish = plan.wish
    if wish.rail_v is None:
        yield Caution(f"Rail {engineering(wish.rail, 'V')}: the least that the power needs", COMPUTED)
    else:
        yield Caution(f"Rail {engineering(wish.rail, 'V')}", STATED)
    yield Caution(f"Parts of {100.0 * wish.part_tolerance:g} %", _basis(wish, "tolerance"))
    yield Caution(
        f"Input impedance {engineering(wish.input_ohm, 'Ω')} to within {100.0 * wish.input_tolerance:g} %",
        _basis(wish, "input_tolerance"),
    )
    yield Caution(
        f"Cable {wish.cable_pf:g} pF from each pin to ground, of some 100 pF a metre", _basis(wish, "cable_pf")
    )
    limit = "the input's limit is as stated" if wish.input_limit_v is not None else "taken is the peak of full scale"
    yield Caution(
        f"A pin stands {engineering(wish.pin_limit_v, 'V')} peak: {limit}",
        STATED if wish.input_limit_v is not None else COMPUTED,
    )
    yield Caution(f"A pin's own protection stands {wish.input_limit_ma:g} mA", _basis(wish, "input_limit_ma"))
    if wish.interface_noise_vrms is None:
        yield Caution("The interface's noise is taken as 110 dB below full scale", PRACTICE)
    if wish.bridge_tied:
        hum = engineering(wish.common_mode_vrms, "V")
        yield Caution(f"Both terminals share {hum} rms of hum", _basis(wish, "common_mode_vrms"))
    yield Caution("Ratings in W and V are those of film resistors as commonly sold; the data sheet decides", PRACTICE)
    if wish.clamp_pf is not None:
        yield Caution("The clamp is reckoned as one abrupt silicon junction, 0.7 V", PRACTICE)


def _basis(wish: Wish, name: str) -> str:
    """Return what a setting rests on: the person who stated it, or what is usual."""
    return PRACTICE if getattr(wish, name) == getattr(attrs.fields(Wish), name).default else STATED
