"""What can be done in the window, in the order of a bench day: the one list that the column's head opens. Pure."""

from enum import StrEnum


class Task(StrEnum):
    """What the column is for right now."""

    WATCH = "watch"
    POWER = "power"
    CALIBRATE = "calibrate"
    RIG = "rig"
    PLANNER = "planner"
    DEVICES = "devices"
    FIRST_POWER_UP = "first power-up"


def tasks_for(*, plays: bool) -> tuple[Task, ...]:
    """Return what a bench allows; a recording, which has no output, is only watched."""
    if plays:
        return tuple(Task)
    return tuple(task for task in Task if task not in (Task.POWER, Task.CALIBRATE))
