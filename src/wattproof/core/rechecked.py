"""What the check of a session found: readings made again, what differs, and what is not as it was written."""

import attrs


@attrs.frozen
class Difference:
    """A reading that is not reproduced: its run and number, and what differs."""

    run: int
    number: int
    why: str


@attrs.frozen
class Rechecked:
    """What the check of one session found. `expected` is the hash it was compared with, empty where none was given.

    `reproduced` of `readings` were made again within the tolerances; `let_go` have no capture by choice of their run
    and `unread` state no figure. `largest` is the largest difference of a figure, in units of its uncertainty.
    """

    path: str
    head: str
    expected: str
    readings: int
    reproduced: int
    let_go: int
    unread: int
    largest: float
    faults: tuple[str, ...]
    differences: tuple[Difference, ...]

    @property
    def sound(self) -> bool:
        """Whether nothing at all differs."""
        return not self.faults and not self.differences
