"""The words of the tasks and of the guided power statement, made from data, ready for translation."""

from collections.abc import Mapping
from types import MappingProxyType

from wattproof.core.connection import Connection
from wattproof.core.notes import Kind, Note
from wattproof.core.wording import sentence
from wattproof.gui.tasks import Task
from wattproof.procedures.calibrate import METER
from wattproof.procedures.driving import HERE
from wattproof.procedures.power_switching import BACK, DOWN, FULL, LEAVE, UP
from wattproof.procedures.requests import Action, Ask

NAMES: Mapping[Task, str] = MappingProxyType({
    Task.WATCH: "Watch",
    Task.POWER: "Power statement",
    Task.CALIBRATE: "Calibrate",
    Task.RIG: "Rig",
    Task.PLANNER: "Attenuator planner",
    Task.DEVICES: "Devices",
    Task.FIRST_POWER_UP: "First power-up",
})  # fmt: skip
ABOUT: Mapping[Task, str] = MappingProxyType({
    Task.WATCH: "The live reading: turn, look, listen.",
    Task.POWER: "Watts at onset, 1 % and 10 % THD+N.",
    Task.CALIBRATE: "Volts, and the interface's own floor.",
    Task.RIG: "What is wired: load, attenuator, limits.",
    Task.PLANNER: "The resistors before the input.",
    Task.DEVICES: "Which interface to measure with.",
    Task.FIRST_POWER_UP: "Before a repaired amplifier is switched on.",
})  # fmt: skip
CHOOSE = "What to do"
CHOOSER_KEY = "M"
BACK_TO = "Back"

# --- setting up a statement
HOW = "How"
BY_HAND, BY_STEPS = "By hand", "By steps"
HOW_HELP = "By hand you turn the amplifier's own control; by steps the program raises its drive."
BY_HAND_ABOUT = (
    "You turn the volume control up, then down again; the trail draws itself and the tone is muted after 10 %."
)
BY_STEPS_ABOUT = "Leave the volume control where it is: the drive rises by itself, coarse, then fine around each point."
LOADS, CHANNELS, HOLD = "Loads", "Channels", "Hold each point"
SUPPLY, CLAIMED = "Supply", "Claimed power"
NOT_STATED = "not stated"
BOTH = "both"
MORE, FEWER = "More settings", "Fewer settings"
FIRST_POWER_UP = "First power-up of a repaired amplifier"
FIRST_POWER_UP_HEAD = "Before a repaired amplifier is switched on"
START, STOP, AGAIN = "Start the measurement", "Stop: silence", "Measure again"
MOMENTARY_ONLY = "no"

# --- while it runs
TABLE = "Power statement"
HELD, MOMENTARY = "held {seconds:g} s", "momentary"
NOT_YET = "…"
NONE = "–"
MUTED = "The tone is muted"
DONE = "Done: the tone is silent"
STOPPED = "Stopped: the tone is silent"
FAILED = "It broke off: the tone is silent"
WAITS_FOR_YOU = "It waits for you, in silence"
STARTING = "Starting from −60 dBFS"
LEFT = "{minutes}:{seconds:02d} left"
HEAT_LEFT = "{seconds:.0f} s until a part reaches its rating; this is no leave to touch it"
REFUSED = "{count} blocks refused"
BUSY = "A measurement is under way. Stop it first (Esc)."
CONDITIONS = "Conditions, each ticked off by itself; read the text before relying on any"
CLAIM_LINE = "claimed {watts:g} W"
WORDS_SHOWN = "What else was found"
POINT_POWER = "Power at {at}"
ONSET_WORDS = "the onset"

# --- what is asked
DONE_BUTTON, NOT_YET_BUTTON = "Done", "Not yet: stop"
CONFIRM_BUTTON = "Yes, start"
HERE_BUTTON = "I am here"
TURN_FOR_ME = "Let it be turned"
RETURN_KEY = "Return"
KNOB = "Volume control"
_ASKED = {
    FULL: "Set the amplifier's volume control to where it shall be measured: full up, if in doubt.",
    DOWN: "Turn the amplifier's volume control all the way down.",
    UP: "Now turn the volume control up, slowly and steadily.",
    BACK: "Now turn it down again, as steadily.",
    LEAVE: "Hands off: leave the control where it is.",
}
_BELOW = {
    FULL: "Nothing sounds yet.",
    DOWN: "Nothing sounds yet.",
    UP: "After 10 % THD+N the tone is muted by itself.",
    BACK: "The way down is compared with the way up.",
    LEAVE: "Each point is held by a little less drive.",
}
_SIMULATED = {FULL: "Turn it full up", DOWN: "Turn it down"}


def asked(ask: Ask) -> str:
    """Return what is asked of the person, in one sentence."""
    match ask:
        case Ask(action=Action.CONFIRM):
            return _confirmed(ask)
        case Ask(action=Action.CONNECT, want=want):
            return _PLUG.get(str(want), f"Connect {want}.")
        case Ask(action=Action.SWITCH_LOAD, want=want):
            return f"Switch the load to {want:g} Ω."
        case Ask(action=Action.SWITCH_CHANNEL, want=want):
            return f"Plug over to channel {want:g}."
        case _:
            return _ASKED.get(str(ask.want), f"Turn the volume control: {ask.want}.")


def _confirmed(ask: Ask) -> str:
    if ask.want == HERE:
        return "Parts are warm. Are you there?"
    if ask.want == METER:
        return f"What does the meter show at {ask.check.partition(';')[0]}?"
    return f"A dummy load of {ask.want} Ω is connected, and no loudspeaker?"


def asked_below(ask: Ask, limits: str) -> str:
    """Return the line below what is asked; `limits` are those in force, in words."""
    match ask:
        case Ask(action=Action.CONFIRM):
            return _confirmed_below(ask, limits)
        case Ask(action=Action.CONNECT, want=want, check=check):
            return f"{f'Output > input: {check}. ' if check else ''}{_PLUG_BELOW.get(str(want), '')}"
        case Ask(action=Action.SWITCH_LOAD):
            return "Nothing sounds. The load that was in is hot. Switch a valve amplifier off for it."
        case Ask(action=Action.SWITCH_CHANNEL):
            return "Nothing sounds."
        case _:
            return _BELOW.get(str(ask.want), "")


def _confirmed_below(ask: Ask, limits: str) -> str:
    if ask.want == HERE:
        return "Without an answer the tone is muted."
    if ask.want == METER:
        why = ask.check.partition(";")[2].strip()
        return f"AC volts{f'; {why}' if why else ''}."
    return f"{limits} Headphones are unplugged: other outputs may carry the tone."


def limits_in_force(drive: str, output: str) -> str:
    """Return the limits that a person confirms, in one sentence."""
    return f"Limits: drive {drive}{f', output {output}' if output else ', output not limited'}."


def answer_button(ask: Ask, *, does_itself: bool) -> str:
    """Return the words on the button that answers; `does_itself`: the bench carries it out."""
    match ask:
        case Ask(action=Action.CONFIRM, want=want) if want == METER:
            return "Read it" if does_itself else "That is what it shows"
        case Ask(action=Action.CONFIRM, want=want):
            return HERE_BUTTON if want == HERE else CONFIRM_BUTTON
        case Ask(action=Action.CONNECT) if does_itself:
            return "Plug it"
        case Ask(action=Action.SWITCH_LOAD, want=want) if does_itself:
            return f"Switch to {want:g} Ω"
        case Ask(action=Action.TURN, want=want) if does_itself:
            return _SIMULATED.get(str(want), DONE_BUTTON)
        case _:
            return DONE_BUTTON


def doing(note: Note) -> str:
    """Return what the procedure does now, as a sentence."""
    words = sentence(note)
    return f"{words[:1].upper()}{words[1:]}."


def time_left(seconds: float) -> str:
    """Return the time that a run still takes, about."""
    minutes, rest = divmod(round(seconds), 60)
    return LEFT.format(minutes=minutes, seconds=rest)


def row_title(load_ohm: float, channel: str, driven: int) -> str:
    """Return the head of one row of the statement."""
    both = " · all driven" if driven > 1 else ""
    return f"{load_ohm:.3g} Ω · {channel}{both}"


def held(seconds: float) -> str:
    """Return how a value came about."""
    return HELD.format(seconds=seconds) if seconds else MOMENTARY


_WARNS = (Kind.PROTECTION, Kind.HEAT_REACHED, Kind.NOBODY_HERE)


def warns(note: Note | None) -> bool:
    """Return whether a remark is a warning and not the ordinary course."""
    return note is not None and note.kind in _WARNS


_MUTES = (*_WARNS, Kind.PASSED, Kind.LIMIT_REACHED, Kind.DRIVE_LIMIT_REACHED, Kind.CONTROL_RESTS)


def mutes(note: Note) -> bool:
    """Return whether a remark says why the tone was muted."""
    return note.kind in _MUTES


# --- devices
LOOK_AGAIN = "Look again"
LOOKING = "Every device is opened for a moment at each usual rate, in silence. That takes some seconds."
NOTHING_CHOSEN = "nothing is chosen; choose a device from the list"
RATE = "Sampling rate"
SIMULATED_BENCH, SIMULATED_ABOUT = "Simulated bench", "an amplifier that nothing can harm"
SIMULATED_SHEET = (
    "<h2>Simulated bench</h2><p>A simulated interface, amplifier, load and attenuator: to learn on, and to check the "
    "program against an amplifier that is known.</p>"
)
NOT_TRIED = " (common practice; not tried on such a system)"
OPEN_DEVICE = "Measure with this"
OPENING = "Opening {name}"
RECONNECT = "Reconnect"

# --- the planner
PLAN = "Plan again"
PLANNER_ABOUT = (
    "R1 is two parts in series and R2 two in parallel, so that no single open or short puts the amplifier's output on "
    "the input."
)
READ_FIRST = "Read this first"

# --- calibration
CALIBRATE = "Start the calibration"
WITH_METER = "Meter for volts"
METER_SHOWS, METER_EMPTY = "The meter shows", "volts, AC"
CALIBRATE_ABOUT = (
    "Take the amplifier off first: outputs are joined straight to inputs, and a calibration sounds loud. Then it goes "
    "by itself, and tells at each step what to plug."
)
CALIBRATE_HEAD = "First the interface alone: its outputs into its own inputs."
CALIBRATED = "Calibrated"
STORED = "Stored in {path}"
CALIBRATING = "Calibrating"
NOTHING_STORED = "Stopped: nothing was stored, nothing was overwritten."
_PLUG = {
    Connection.DIRECT.value: "Amplifier off. Join output to input directly.",
    Connection.PAD.value: "Put the attenuator (20 to 30 dB) between.",
    Connection.AMPLIFIER.value: "Take the loop away, and wire the amplifier again.",
}
_PLUG_BELOW = {
    Connection.DIRECT.value: "Phantom power off, direct monitoring off; then leave the gain knobs as they are.",
    Connection.PAD.value: "Leave the load of the direct loop on the output.",
    Connection.AMPLIFIER.value: "Leave the gain knobs as they are: another setting voids the calibration.",
}

# --- the rig
STORED_RIGS = "Stored rigs"
STORE_RIG = "Store this rig"

# --- a figure opened
COVERAGE = "± is {t:.2f} times u = {u} (95 %, {dof} degrees of freedom)"
SHARE = "of the variance"
EXACT = "no source of uncertainty is known"
LIMITED_BY = "A limit, not a measurement: the {what} itself is what is seen."
AT_MOST = "≤"
LIMITED = {"interface": "interface-limited", "noise": "noise-limited"}
FLOOR = "the interface's own floor"
