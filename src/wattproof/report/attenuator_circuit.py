"""The circuit of a planned attenuator drawn in characters, for a terminal."""

from wattproof.dsp.attenuator import Plan
from wattproof.report.engineering import engineering, resistance


def circuit_text(plan: Plan) -> str:
    """Return the circuit, lines of at most 78 columns, with each part's value."""
    return _bridge(plan) if plan.wish.bridge_tied else _single(plan)


def _values(plan: Plan) -> tuple[str, str, str]:
    upper, lower = plan.leg.upper_ohm[0], plan.leg.lower_ohm[0]
    return resistance(upper), resistance(lower), engineering(plan.wish.load_ohm, "Ω")


def _single(plan: Plan) -> str:
    r1, r2, load = _values(plan)
    wire = f"--[ R1a {r1} ]--[ R1b {r1} ]--"
    gap = " " * len(wire)
    return "\n".join([
        " amplifier".ljust(17 + len(wire)) + "interface",
        f" out    o---+{wire}+-------+---o input",
        f"            |{gap}|       |",
        f"          [load]{gap[5:]}[R2a]   [R2b]",
        f"            |{gap}|       |",
        f" ground o---+{'-' * len(wire)}+-------+---o ground",
        "",
        f" load {load}; R2a, R2b {r2} each, in parallel",
    ])  # fmt: skip


def _bridge(plan: Plan) -> str:
    r1, r2, load = _values(plan)
    wire = f"--[ R1a {r1} ]--[ R1b {r1} ]--"
    gap = " " * len(wire)
    plus, minus = ("input 1", "input 2") if plan.wish.two_inputs else ("pin +", "pin -")
    return "\n".join([
        " amplifier".ljust(17 + len(wire)) + "interface",
        f" out + o----+{wire}+-------+---o {plus}",
        f"            |{gap}|       |",
        f"            |{gap[2:]}[R2a]   [R2b]",
        f"            |{gap}|       |",
        f"          [load]{gap[3:]}+-------+---o ground",
        f"            |{gap}|       |",
        f"            |{gap[2:]}[R2a]   [R2b]",
        f"            |{gap}|       |",
        f" out - o----+{wire}+-------+---o {minus}",
        "",
        f" load {load}; R2a, R2b {r2} each, in parallel, from each pin to ground",
        " ground is the interface's (the cable's shield) and goes to neither terminal",
    ])  # fmt: skip
