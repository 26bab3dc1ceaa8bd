"""Whether a loop is plugged as asked: each output into its own input, once, the right way round, and nowhere else."""

import math
from collections.abc import Mapping, Sequence

import attrs

from wattproof.core.errors import WrongUseError
from wattproof.core.units import db

HEARD = 10.0 ** (-40.0 / 20.0)  # of what was played: a loop through a pad of 30 dB is still heard
ALONE = 10.0 ** (-40.0 / 20.0)  # of the loudest input: what is louder is a second way, not crosstalk
ECHO = 0.01  # −40 dB: a direct loop gives back nothing later
LEAST_PAD_DB, MOST_PAD_DB = 10.0, 45.0


@attrs.frozen
class Join:
    """One cable that is asked for: from an output to an input, both counted from 1."""

    output: int
    input: int


def check_joins(joins: Sequence[Join], heard: Mapping[int, Sequence[float]], level_fs: float) -> None:
    """Accept what each output alone gave at all inputs, as levels to full scale, while it sounded at level_fs.

    Raises:
        WrongUseError: no signal, the wrong input, channels swapped, or a second way from output to input.
    """
    partners = {join.output: join.input for join in joins}
    loudest = {output: _loudest(levels, level_fs) for output, levels in heard.items()}
    crossed = [output for output, at in loudest.items() if at is not None and at != partners[output]]
    if len(crossed) > 1 and {loudest[output] for output in crossed} == {partners[output] for output in crossed}:
        outputs = " and ".join(str(output) for output in sorted(crossed))
        raise WrongUseError(
            f"outputs {outputs} come back at each other's inputs: the channels are swapped; swap two plugs"
        )
    for join in joins:
        at = loudest[join.output]
        if at is None:
            raise WrongUseError(
                f"no signal from output {join.output} at any input: a cable is missing, or a gain is turned down; join "
                f"output {join.output} to input {join.input}"
            )
        if at != join.input:
            raise WrongUseError(
                f"output {join.output} comes back at input {at}: the wrong input; plug its cable into input "
                f"{join.input}"
            )
        _check_alone(join, heard[join.output])


def check_path(join: Join, *, inverted: bool, echo: float) -> None:
    """Accept a direct loop's polarity, and that nothing comes a second time.

    Raises:
        WrongUseError: the loop turns the sign, or the input goes back to the output.
    """
    if echo > ECHO:
        raise WrongUseError(
            f"input {join.input} goes back to output {join.output} (a second arrival, {db(echo):.0f} dB): monitoring "
            "is on; turn direct monitoring off in the interface's mixer"
        )
    if inverted:
        raise WrongUseError(
            f"the loop from output {join.output} to input {join.input} turns the polarity: a balanced cable with "
            "crossed wires; use another cable"
        )


def check_pad(join: Join, pad: float) -> None:
    """Accept the gain through the pad over the direct gain.

    Raises:
        WrongUseError: it is not 10 to 45 dB.
    """
    loss_db = -db(pad) if pad > 0.0 else math.inf
    if loss_db < LEAST_PAD_DB:
        raise WrongUseError(
            f"the loop from output {join.output} to input {join.input} lost {loss_db:.1f} dB by the pad: it is not "
            "in the way; plug a pad of 20 to 30 dB between"
        )
    if loss_db > MOST_PAD_DB:
        raise WrongUseError(
            f"the loop from output {join.output} to input {join.input} lost {loss_db:.0f} dB by the pad: a cable is "
            "missing or the pad is open; a pad of 20 to 30 dB is wanted"
        )


def _loudest(levels: Sequence[float], level_fs: float) -> int | None:
    top = max(levels)
    return levels.index(top) + 1 if top >= HEARD * level_fs else None


def _check_alone(join: Join, levels: Sequence[float]) -> None:
    own = levels[join.input - 1]
    for socket, level in enumerate(levels, 1):
        if socket != join.input and level > ALONE * own:
            raise WrongUseError(
                f"output {join.output} comes back at input {socket} too ({db(level / own):.0f} dB): monitoring is on "
                "or a cable feeds both; turn direct monitoring off, or join one output to one input"
            )
