"""The sentences of the power statement: what a procedure does, why it ended, what it found out, and what flatters."""

from wattproof.core.notes import Kind

_POINT = "the point's name"
_DOING = {
    Kind.RAISING: ("raising the drive, now {db:.1f} dBFS", {"db": "drive to full scale, dB"}),
    Kind.LOOKING_CLOSER: ("looking closer at {named}", {"named": _POINT}),
    Kind.HOLDING: ("holding {named}, {left_s:.0f} s to go", {"named": _POINT, "left_s": "time left of the hold, s"}),
    Kind.FOLLOWING: (
        "following the hand, {vrms:.3g} V, {what}",
        {"vrms": "output, V rms", "what": "what THD+N is made of, in words"},
    ),
    Kind.CHECKING: ("checking {what}", {"what": "what is checked, in words"}),
}
_WHY = {
    Kind.ONSET_GRADUAL: ("no distinct onset: distortion rises gradually", {}),
    Kind.ONSET_BEGIN_LOWER: ("begin lower: the record starts less than 20 dB below the onset", {}),
    Kind.ONSET_NOT_REACHED: (
        "onset not reached: distortion follows its trend up to {vrms:.3g} V",
        {"vrms": "highest output that was read, V rms"},
    ),
    Kind.NOT_CROSSED: (
        "THD+N does not rise through {percent:.4g} % up to {vrms:.3g} V",
        {"percent": "THD+N sought, %", "vrms": "highest output that was read, V rms"},
    ),
    Kind.NOT_SETTLED: (
        "{named} did not settle: THD+N was {percent:.3g} % at the end of the hold; the value is momentary",
        {"named": _POINT, "percent": "THD+N at the end of the hold, %"},
    ),
    Kind.NOT_LOOKED_FOR: ("not looked for: the run ended before", {}),
    Kind.PASSED: (
        "{percent:.4g} % THD+N passed at {vrms:.3g} V: the tone was muted",
        {"percent": "highest THD+N sought, %", "vrms": "output there, V rms"},
    ),
    Kind.LIMIT_REACHED: (
        "{what} reached its limit of {limit:.4g} {named}: the tone was muted",
        {"what": "the quantity", "limit": "its limit", "named": "its unit"},
    ),
    Kind.DRIVE_LIMIT_REACHED: (
        "the drive reached its limit of {db:.1f} dBFS; raise the limit or turn the amplifier up",
        {"db": "limit of the drive to full scale, dB"},
    ),
    Kind.CONTROL_RESTS: ("the control rests at {vrms:.3g} V: the stroke is over", {"vrms": "output there, V rms"}),
    Kind.PROTECTION: (
        (
            "the output fell by {db:.0f} dB at once, as a protection circuit does: the tone was muted; find "
            "the cause and "
            "let the amplifier cool before another try"
        ),
        {"db": "height of the fall, dB"},
    ),
    Kind.NOBODY_HERE: (
        'nobody said "I am here" for {seconds:.0f} s above a quarter of a rating: the tone was muted',
        {"seconds": "time without an answer, s"},
    ),
    Kind.HEAT_REACHED: (
        "{what} would pass its rating by the cooling model: the tone was muted; let it cool, and don't touch it",
        {"what": "the part"},
    ),
    Kind.NO_RATING: (
        "no rating is known of {what}: its heat is not followed; stay with it, and keep what burns away from it",
        {"what": "the part"},
    ),
    Kind.BURSTS: (
        (
            "read in bursts of {burst_s:.2g} s at a duty of {percent:.0f} %, no further than 1 %; sustained power at "
            "{frequency_hz:.0f} Hz burns {what}"
        ),
        {
            "burst_s": "length of a burst, s",
            "percent": "share of time with tone, %",
            "frequency_hz": "of the tone, Hz",
            "what": "the parts that burn",
        },
    ),
    Kind.SCRATCHY: (
        (
            "scratchy control: {jumps:.0f} blocks with a jump or drop-out and {crackles:.0f} with crackle "
            "were left out; "
            "clean or replace the control before a final statement"
        ),
        {"jumps": "blocks with a jump of the level", "crackles": "blocks whose residual stands out"},
    ),
    Kind.CHANNEL_SEEN: (
        "channel {channel:.0f} was recognised: its input is at least {db:.0f} dB above every other",
        {"channel": "counted from 1", "db": "distance to the next input, dB"},
    ),
    Kind.CHANNEL_ELSEWHERE: (
        "the tone of channel {channel:.0f} arrives on input {input:.0f}: check the wiring",
        {"channel": "counted from 1", "input": "where the tone is strongest"},
    ),
    Kind.CHANNEL_STATED: (
        "that channel {channel:.0f} is connected is the person's word; it could not be recognised",
        {"channel": "counted from 1"},
    ),
    Kind.LOAD_SEEN: (
        (
            "the switch from {before_ohm:.4g} to {after_ohm:.4g} Ω changed the level by {db:+.3f} dB, more "
            "than five times "
            "its uncertainty: recognised as a change of load"
        ),
        {"before_ohm": "load before", "after_ohm": "load after", "db": "change of level at the same drive, dB"},
    ),
    Kind.LOAD_STATED: (
        (
            "that the load is {after_ohm:.4g} Ω is the person's word: the level changed by {db:+.3f} dB, "
            "less than five "
            "times its uncertainty"
        ),
        {"after_ohm": "load after", "db": "change of level at the same drive, dB"},
    ),
    Kind.LOAD_WRONG_WAY: (
        (
            "the level changed by {db:+.3f} dB on the switch from {before_ohm:.4g} to {after_ohm:.4g} Ω, the wrong way "
            "round: check which load is in"
        ),
        {"before_ohm": "load before", "after_ohm": "load after", "db": "change of level at the same drive, dB"},
    ),
    Kind.LOAD_ASSUMED: ("the load of {load_ohm:.4g} Ω is {what}", {"load_ohm": "the load", "what": "whose word it is"}),
    Kind.TYPED_SCALE: ("volts rest on a full scale that was typed; ± holds the scatter of the readings alone", {}),
    Kind.KNOB_HELD: (
        "points were held by lowering the drive, the amplifier's control left where the stroke ended",
        {},
    ),
}
_JUDGED = {
    Kind.FLATTERS_MOMENTARY: (
        "momentary power flatters: {named} was {ratio:.3f} times its held value before the supply had settled",
        {"named": _POINT, "ratio": "momentary power over held power"},
    ),
    Kind.FLATTERS_TEN_PER_CENT: (
        "a 10 % rating flatters: it is {ratio:.2f} times the power at 1 %, and audibly distorted",
        {"ratio": "power at 10 % over power at 1 %"},
    ),
    Kind.FLATTERS_ONE_CHANNEL: (
        "one channel driven flatters: with all channels driven a common supply gives each less",
        {},
    ),
    Kind.FLATTERS_PEAK: (
        (
            "peak watts flatter: {ratio:.2f} times the power at 1 % is near the {peak:.0f} times by which a "
            "sine's peak "
            "power is above its average"
        ),
        {"ratio": "claimed power over power at 1 %", "peak": "peak over average power of a sine"},
    ),
    Kind.FLATTERS_SUPPLY: (
        (
            "a higher supply flatters: power goes with the square of its voltage, so the claim may have been taken at "
            "{needed_v:.3g} V in the place of {supply_v:.3g} V"
        ),
        {"needed_v": "supply that the claim needs, V", "supply_v": "supply as typed, V"},
    ),
    Kind.CLAIM_MET: (
        "the claimed {claimed_w:.4g} W is reached at {percent:.2g} % THD+N",
        {"claimed_w": "claimed power, W", "percent": "THD+N at that power, %"},
    ),
    Kind.CLAIM_AT_MORE: (
        "the claimed {claimed_w:.4g} W is reached only at {percent:.2g} % THD+N",
        {"claimed_w": "claimed power, W", "percent": "THD+N at that power, %"},
    ),
    Kind.CLAIM_MISSED: (
        (
            "the claimed {claimed_w:.4g} W was not reached: it takes {vrms:.3g} V rms, {db:.1f} dB or "
            "{ratio:.3g} times the "
            "power beyond the highest that was read"
        ),
        {
            "claimed_w": "claimed power, W",
            "vrms": "output that it takes, V rms",
            "db": "distance from the highest output that was read, dB",
            "ratio": "the same in power",
        },
    ),
    Kind.CLAIM_IMPOSSIBLE: (
        (
            "the claimed {claimed_w:.4g} W cannot be reached: it takes {vrms:.3g} V rms, and even a square "
            "wave between the "
            "rails that were seen gives no more than {most_w:.3g} W"
        ),
        {
            "claimed_w": "claimed power, W",
            "vrms": "output that it takes, V rms",
            "most_w": "square wave as high as the highest peak that was read, W",
        },
    ),
}
POWER_WORDS: dict[Kind, tuple[str, dict[str, str]]] = {**_DOING, **_WHY, **_JUDGED}
