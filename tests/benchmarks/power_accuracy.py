"""How near power by hand and by steps come to the truth, on random simulated amplifiers, hard and soft.

Run it as `python -m tests.benchmarks.power_accuracy [AMPLIFIERS] [SEED]`; 200 take half an hour. It prints one line for
each way of measuring: the errors of the voltage at 1 % and 10 % THD+N in dB, and how many lie within the bound that the
project sets itself, or else within twice their own uncertainty.
"""

import sys
from collections.abc import Iterator

import attrs
import numpy as np

from wattproof.app import make_measurement
from wattproof.bench.simulated import SimulatedBench
from wattproof.bench.simulated.characters import Character
from wattproof.bench.simulated.truth import Truth
from wattproof.core.units import DB_PER_RELATIVE, db
from wattproof.procedures.power_plan import HandPlan, PowerPlan, StepsPlan

POINTS = (("1 %", 0.01), ("10 %", 0.10))
STILL_NOISE = 10.0 ** (-70.0 / 20.0)  # residual noise up to which the bound of the steps holds


@attrs.frozen
class Way:
    """One way of measuring, and the bound in dB that the project sets itself for it."""

    name: str
    plan: PowerPlan
    hand_db_per_s: float
    bound_db: float


WAYS = (
    Way("by steps of 1 s", StepsPlan(hold_s=0.0, step_db=3.0), 6.0, 0.005),
    Way("by hand, 2 dB/s", HandPlan(hold_s=0.0, strokes=1), 2.0, 0.02),
    Way("by hand, 6 dB/s", HandPlan(hold_s=0.0, strokes=1), 6.0, 0.02),
    Way("by hand, 20 dB/s", HandPlan(hold_s=0.0, strokes=1), 20.0, 0.10),
)


@attrs.frozen
class Missed:
    """By how much one point is off, in dB, its standard uncertainty in dB, and whether noise is low enough."""

    amplifier: str
    at: str
    off_db: float
    u_db: float
    quiet: bool

    def kept(self, bound_db: float) -> bool:
        """Whether it lies within the bound, or within twice its own uncertainty."""
        return abs(self.off_db) <= max(bound_db if self.quiet else 0.0, 2.0 * self.u_db)

    def within(self, bound_db: float) -> bool:
        """Whether it lies within the bound itself."""
        return abs(self.off_db) <= bound_db


def random_amplifiers(count: int, seed: int) -> Iterator[Character]:
    """Yield amplifiers that pass 1 % THD+N only beyond the beginning of their clipping; one in two is soft."""
    dice = np.random.default_rng(seed)
    made = 0
    while made < count:
        soft = bool(made % 2)
        supply_v = float(dice.uniform(8.0, 30.0))
        character = Character(
            name=f"{'soft' if soft else 'hard'}-{seed}-{made}",
            label="drawn at random",
            bridge_tied=False,
            gain=3.0 * supply_v,  # full drive is 1 V: some 12 dB beyond clipping
            output_ohm=float(dice.uniform(0.02, 0.5)),
            supply_v=supply_v,
            supply_range_v=(5.0, 35.0),
            supply_share=1.0,
            drop_v=float(dice.uniform(0.3, 2.0)),
            rail_ohm=float(dice.uniform(0.1, 0.8)),
            bias_a=float(dice.choice([np.inf, dice.uniform(0.7, 1.0) * supply_v / 8.0])),
            knee=float(dice.uniform(0.10, 0.35) if soft else dice.uniform(0.001, 0.02)),
            second=float(dice.uniform(-1.0, 1.0) * 10.0 ** dice.uniform(-5.0, -2.3)),
            third=float(dice.uniform(-1.0, 1.0) * 10.0 ** dice.uniform(-5.0, -2.3)),
            crossover_v=float(dice.choice([0.0, dice.uniform(0.0, 1e-3) * supply_v])),
            crossover_width_v=0.1,
            noise_vrms=float(supply_v / np.sqrt(2.0) * 10.0 ** dice.uniform(-5.5, -3.5)),
            hum=((2, float(10.0 ** dice.uniform(-5.0, -3.5))),),
        )
        truth = Truth(character)
        if truth.at(2.0**0.5 * truth.onset_vrms)[1] < 0.008:
            made += 1
            yield character


def misses(character: Character, way: Way) -> list[Missed]:
    """Measure one amplifier one way and return how far each point is off."""
    bench = SimulatedBench(character, seed=len(character.name))
    bench.open()
    measurement = make_measurement(bench, way.plan, None, way.hand_db_per_s)
    try:
        row = measurement.run().statement.rows[0]
    finally:
        measurement.runner.close()
    truth, found = Truth(character), []
    for name, thdn in POINTS:
        true_vrms, point = truth.vrms_at_thdn(thdn), row.at(name)
        quiet = character.noise_vrms / true_vrms <= STILL_NOISE
        volts = None if point is None else point.voltage_vrms
        if volts is None:
            found.append(Missed(character.name, name, float("inf"), 0.0, quiet))
        else:
            u_db = DB_PER_RELATIVE * volts.u / volts.value
            found.append(Missed(character.name, name, db(volts.value / true_vrms), u_db, quiet))
    return found


def line(way: Way, found: list[Missed]) -> str:
    """Return the line of one way of measuring."""
    off = np.abs([each.off_db for each in found])
    within = sum(each.within(way.bound_db) for each in found)
    kept = sum(each.kept(way.bound_db) for each in found)
    worst = max(found, key=lambda each: abs(each.off_db))
    return (
        f"{way.name:18} {len(found):5} {np.median(off):8.4f} {np.quantile(off, 0.95):8.4f} {off.max():8.4f}"
        f"   {way.bound_db:5.3f} {within:5} {kept:5}   {worst.amplifier} {worst.at}"
    )


def main(count: int, seed: int) -> None:
    """Print the table."""
    amplifiers = list(random_amplifiers(count, seed))
    print(f"{count} amplifiers, seed {seed}; |error| of the voltage in dB")  # noqa: T201 - a script's output
    print(f"{'':18} {'n':>5} {'median':>8} {'95 %':>8} {'worst':>8}   bound within kept   worst one")  # noqa: T201 - likewise
    for way in WAYS:
        found = [missed for amplifier in amplifiers for missed in misses(amplifier, way)]
        print(line(way, found), flush=True)  # noqa: T201 - likewise


if __name__ == "__main__":
    main(int(sys.argv[1]) if len(sys.argv) > 1 else 200, int(sys.argv[2]) if len(sys.argv) > 2 else 1)
