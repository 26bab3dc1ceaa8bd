"""Every word that the window shows, in one place and made from data, ready for translation."""

from wattproof.core import wording
from wattproof.core.notes import Kind, Note

TITLE = "wattproof"
_FIXED_SPACE = "\u00a0"  # keeps a number and its unit on one line

# --- the reading
THDN = "THD+N"
POWER = "Power"
LEVEL = "Level"
FREQUENCY = "Frequency"
WITHHELD = "withheld"
PLUS_MINUS = "± is the random part at 95 %"

# --- plots
TRAIL = "Trail of this stroke"
TRAIL_BY_POWER = "THD+N against output power"
TRAIL_BY_VOLTS = "THD+N against output voltage"
TRAIL_BY_FULL_SCALE = "THD+N against captured level"
TRAIL_EMPTY = "Start the tone and turn the amplifier up: your hand draws the line."
NOW = "now"
RESIDUAL = "What the amplifier adds"
RESIDUAL_ABOUT = "residual over two periods, output ghosted"
RESIDUAL_SCALE = "per cent of the tone's peak"
SPECTRUM = "Harmonic spectrum"
SPECTRUM_ABOUT = "dB to the tone"
HUM = "hum"

# --- stations
TONE_OUT = "Tone out"
AMPLIFIER = "Amplifier"
LOAD = "Load"
ATTENUATOR = "Attenuator"
CAPTURE = "Capture"
SILENT = "silent"
OPEN_LOAD = "open"
NO_LOAD = "nothing connected"
NO_POWER = "needs the load and the input's scale"
RECORDED = "recorded"
RECORDED_PAGE = (
    "This is a recording, played as if it were live. What was wired, and how it was driven, is not known of it."
)
RECORDED_DETAIL = "the tone is in the recording"
UNKNOWN = "not known"
OVERLOADED = "overloaded"
BRIDGE_TIED = "bridge-tied"
SINGLE_ENDED = "one side on ground"
NOTHING_CAPTURED = "nothing yet"
OUTPUT_UNKNOWN = "above the capture's range"
OPENS = "Return opens the settings of this station."

# --- settings
START = "Start the tone"
STOP = "Stop the tone"
SPACE_BAR = "space bar"
DRIVE = "Drive"
DRIVE_LIMIT = "Drive limit"
CHANNEL = "Channel"
LIMIT_HELP = "More drive is refused before it sounds. Only you raise the limit."
LIMIT_IN_DBFS = "The output's voltage is not known yet, so drive and limit are in dBFS."
TURN_REAL = "Turn the amplifier's own knob slowly: every reading adds to the trail."
TURN_SIMULATED = "Mouse wheel over the amplifier, arrow keys, or the slider."
NEW_STROKE = "New stroke"
PICK_OFF = "Pick-off"
LOAD_NOMINAL = "Load"
LOAD_MEASURED = "Measured at its terminals"
LOAD_RATING = "Rating as mounted"
DIVIDES = "Divides by"
INPUT_SCALE = "Full scale"
RATE = "Sampling rate"
ROOM = "Room above the peak"
CAUTION = "Caution"
CAUTION_MAINS = (
    "Mains can kill. Work inside an amplifier that is fed from the mains belongs to licensed practice; follow your "
    "local codes."
)
CAUTION_BRIDGE = (
    "Bridge-tied outputs are both driven: no terminal is ground. Never tie one to the ground of an interface, a scope "
    "or a chassis."
)
CAUTION_HOT = (
    "A dummy load gets hot enough to burn skin and bench. Mount it on metal, keep it clear, let it cool before you "
    "touch it."
)
CAUTION_ATTENUATOR = (
    "The full output voltage stands on the attenuator's input terminals. Bridge-tied outputs need a pick-off with two "
    "equal arms: no terminal is ground."
)
CAPTURE_ADVICE = (
    "Keep the peaks below full scale with a little room. If the capture is overloaded, add attenuation or turn the "
    "input gain down, and read again."
)
THEMES = {"system": "Theme: as the system", "light": "Theme: light", "dark": "Theme: dark"}
KEYS = "space: tone   ↑ ↓: knob   1–5: stations   M: what to do   B: budget   N: new stroke   T: theme"
KEYS_RECORDED = "1–5: stations   M: what to do   B: budget   N: new stroke   T: theme"
KEYS_REAL = "space: tone   1–5: stations   M: what to do   B: budget   N: new stroke   T: theme"

# --- what comes next
NEXT_START = "Start the tone, then turn the amplifier up slowly."
NEXT_CHECK = "Turn the amplifier up, or check the cables."
NEXT_UNLOAD = "Make room at the input before you go on."
NEXT_BACK = "Past 10 %: turn back, and let the load cool."

# --- states
WAITING = "Waiting for the first reading"
WAITING_DETAIL = "The bench is starting."
STALE = "Nothing comes from the bench"
STALE_DETAIL = "The last reading is too old to be shown."
NO_TONE_OFF = "The tone is off"
NO_TONE_OFF_DETAIL = "Press the space bar to start it."
NO_TONE_RECORDED = "No tone here"
NO_TONE_RECORDED_DETAIL = "This part of the recording is silent or holds something else."
NO_TONE_ON = "The tone does not come back"
NO_TONE_ON_DETAIL = "Check the cables, the channel and the amplifier's volume."
OVERLOAD = "The interface is overloaded, not the amplifier"
UNSTEADY = "The level jumped inside the block"
UNSTEADY_DETAIL = "Hold it still for a moment, or turn more slowly."
TOO_SHORT = "Too few periods to read"
TOO_SHORT_DETAIL = "Raise the frequency, or give it a longer block."
GAP = "Frames were lost"
GAP_DETAIL = "The block with the hole is never averaged in. If it goes on, close other programs or use a longer buffer."
ENDED = "The run has ended and the tone is silent"
FAILED = "Stopped: the tone is silent"
FAILED_DETAIL = "The program met an error of its own; its message stands in the terminal."

# --- what the residual is made of
CLIPPING = "Clipping"
CLIPPING_DETAIL = "The waveform's tips are cut off"
CLIPPING_BEGINS = "Clipping begins"
CLIPPING_BEGINS_DETAIL = "The tips touch a limit"
CROSSOVER = "A kink at the zero crossing"
CROSSOVER_DETAIL = "Crossover: it weighs most at low level"
EVEN = "Mostly the 2nd harmonic"
EVEN_DETAIL = "Both halves of the wave bend unequally"
ODD = "Mostly the 3rd harmonic"
ODD_DETAIL = "Both halves of the wave bend alike"
HARMONICS = "Mostly harmonics"
NOISE = "Mostly noise"
HUM_TITLE = "Mostly hum"
MIXED = "A mixture"
NO_RESIDUAL = "Nothing left over the tone"


def ordinal(order: int) -> str:
    """Return a harmonic's order in words: 2nd, 3rd, 4th and so on."""
    if order % 100 in (11, 12, 13):
        return f"{order}th"
    return f"{order}{ {1: 'st', 2: 'nd', 3: 'rd'}.get(order % 10, 'th') }"


def shares(harmonics: float, hum: float, noise: float) -> str:
    """Return what the residual's power is made of, the largest first; shares are plain ratios."""
    named = (("harmonics", harmonics), ("hum", hum), ("noise", noise))
    seen = sorted(((share, name) for name, share in named if share >= 0.005), reverse=True)
    return ", ".join(f"{name} {100 * share:.0f} %".replace(" ", _FIXED_SPACE) for share, name in seen)


def of_power(parts: str) -> str:
    """Return the sentence on the residual's parts."""
    return f"Of its power: {parts}."


def power_into(load: str) -> str:
    """Return the label of the power figure."""
    return f"{POWER} into {load}"


def band(low_hz: float, high_hz: float) -> str:
    """Return the measuring band in words."""
    high = f"{high_hz / 1000:g} kHz" if high_hz >= 1000 else f"{high_hz:g} Hz"
    return f"{low_hz:g} Hz–{high}"


def of_what(reference: str, band: str) -> str:
    """Return what the ratio is taken to, and in which band."""
    whole = {"total": "of the total", "fundamental": "of the fundamental"}[reference]
    return f"{whole}, {band}"


def plus_minus(number: str, unit: str) -> str:
    """Return an uncertainty in words, "" for none."""
    return f"± {number} {unit}" if number else ""


def moving(db_per_s: float) -> str:
    """Return the remark that short blocks are used because the level moves."""
    return f"The level moves at {abs(db_per_s):.0f} dB/s: read in shorter blocks."


def channel(number: int) -> str:
    """Return the name of a channel that has none of its own."""
    return f"{CHANNEL.lower()} {number}"


def output_of(number: int) -> str:
    """Return the label of the tone's station."""
    return f"{TONE_OUT} · output {number}"


def input_of(number: int) -> str:
    """Return the label of the capture's station."""
    return f"{CAPTURE} · input {number}"


def limit(volts: str) -> str:
    """Return the drive limit in words."""
    return f"limit {volts}"


def gain(ratio: float, in_db: str) -> str:
    """Return a voltage gain in words."""
    return f"× {ratio:.3g} · {in_db}"


def control(label: str, setting: str) -> str:
    """Return one of the bench's controls with its setting."""
    return f"{label.lower()} {setting}"


def of_rating(watts: str, rating: str) -> str:
    """Return the power beside what the load is rated for."""
    return f"{watts} of {rating}"


def above_rating(rating: str) -> str:
    """Return the warning that the load takes more than it is rated for."""
    return f"above its {rating} rating"


def of_full_scale(per_cent: float) -> str:
    """Return how far the capture is driven."""
    return f"{per_cent:.0f} % of full scale" if per_cent >= 1 else f"{per_cent:.2g} % of full scale"


def room(in_db: str) -> str:
    """Return how much room is left above the peak."""
    return f"{in_db} of room"


def overload_way_out(add_db: float | None) -> str:
    """Return what to do against an overloaded capture; `add_db` is None where it is not known how much."""
    much = f"{add_db:.0f}{_FIXED_SPACE}dB of " if add_db else ""
    return f"Add {much}attenuation or turn the input gain down. The trail so far is kept."


def claim(per_cent: int) -> str:
    """Return the name of a line on the trail."""
    return f"{per_cent} %"


def trail_about(axis: str, load: str, channel: str, before: str) -> str:
    """Return the line beside the trail's title."""
    return " · ".join(part for part in (axis, load, channel, before) if part)


def spectrum_about(bandwidth_hz: float, window: str) -> str:
    """Return the line beside the spectrum's title."""
    return f"noise per {bandwidth_hz:.2g} Hz, window {window.partition(',')[0]}"


def next_line(per_cent: int) -> str:
    """Return the encouragement to turn on to the next line of the trail."""
    return f"Keep turning slowly: {per_cent} % is next."


def earlier(load_ohm: float | None, hertz: float) -> str:
    """Return the name of the stroke before, by what it was drawn with."""
    load = "" if load_ohm is None else f"{load_ohm:.3g} Ω, "
    return f"grey: before, {load}{hertz:.4g} Hz"


def hum_line(frequency: str) -> str:
    """Return the name of a hum line."""
    return f"{HUM} {frequency}"


def footer(name: str, rate_hz: float, kept: int | None, refused: int) -> str:
    """Return the line at the window's foot; `kept` is None while only watching."""
    stored = "watching, nothing stored" if kept is None else f"{kept} readings kept, in memory only"
    left_out = f" · {refused} blocks refused" if refused else ""
    return f"{name} · {rate_hz / 1000:g} kHz · {stored}{left_out} · {PLUS_MINUS}"


def spoken(label: str, figure: str, below: str) -> str:
    """Return a figure for a screen reader."""
    return f"{label}: {figure}. {below}".strip()


def tone_changed(why: str) -> str:
    """Return the notice that the program silenced or changed the tone by itself."""
    return f"The tone was changed: {why}"


def asked(action: str, want: object) -> str:
    """Return what a procedure asks of the person."""
    return f"Asked of you: {action.replace('_', ' ')} {want}"


def kink_share(title: str, harmonics: str) -> str:
    """Return a cause followed by the harmonics that show it."""
    return f"{title}; {harmonics}."


def listed(harmonics: list[tuple[int, str]]) -> str:
    """Return the strongest harmonics with their levels, for example "3rd −42 dB, 5th −49 dB"."""
    return ", ".join(f"{ordinal(order)} {level}".replace(" ", _FIXED_SPACE) for order, level in harmonics)


_SHORT = {
    Kind.CARRIER: "An oscillation or a carrier stands above the band.",
    Kind.SECOND_TONE: "A second tone counts as noise.",
    Kind.STRONGER_LINE: "Another line is stronger than the tone.",
    Kind.NO_HARMONIC_IN_BAND: "No harmonic falls inside the band.",
    Kind.FUNDAMENTAL_OUTSIDE_BAND: "The tone lies outside the measuring band.",
}
_SAID_OTHERWISE = (Kind.LEVEL_MOVES, Kind.HARMONICS_CUT, Kind.BAND_CUT)


def note(given: Note) -> str:
    """Return a note as one short sentence, "" where the window says it in another place."""
    if given.kind in _SAID_OTHERWISE:
        return ""
    if given.kind in _SHORT:
        return _SHORT[given.kind]
    words = wording.sentence(given)
    return f"{words[:1].upper()}{words[1:]}."
