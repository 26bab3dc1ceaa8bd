"""A circuit of resistors solved by its node equations: a second way to every voltage that a planner states."""

import math

import numpy as np

GROUND = "ground"
Resistor = tuple[str, str, float]  # node, node, Ω


def voltages(resistors: list[Resistor], fixed: dict[str, float]) -> dict[str, float]:
    """Return the voltage of every node against ground; `fixed` are the nodes that a source holds."""
    known = {GROUND: 0.0, **fixed}
    nodes = sorted({node for first, second, _ in resistors for node in (first, second)} - known.keys())
    place = {node: k for k, node in enumerate(nodes)}
    conductances = np.zeros((len(nodes), len(nodes)))
    currents = np.zeros(len(nodes))
    for first, second, ohm in resistors:
        if math.isinf(ohm):
            continue
        g = 1.0 / ohm
        for here, there in ((first, second), (second, first)):
            if here not in place:
                continue
            conductances[place[here], place[here]] += g
            if there in place:
                conductances[place[here], place[there]] -= g
            else:
                currents[place[here]] += g * known[there]
    solved = np.linalg.solve(conductances, currents)
    return known | {node: float(solved[k]) for node, k in place.items()}
