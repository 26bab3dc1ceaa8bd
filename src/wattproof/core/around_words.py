"""The sentences of what is measured around the power statement: response, noise, gain, output resistance, crosstalk."""

from wattproof.core.notes import Kind

_CHANNEL = "counted from 1"
_DOING = {
    Kind.MEASURING_AT: (
        "measuring {what} at {frequency_hz:.4g} Hz",
        {"what": "the pass", "frequency_hz": "of the tone, Hz"},
    ),
    Kind.LISTENING: ("listening for {seconds:.3g} s, {what}", {"seconds": "length, s", "what": "to what"}),
}
_LEVELS = {
    Kind.LEVEL_NOT_REACHED: (
        "channel {channel:.0f} reached {vrms:.4g} V in the place of {wanted_vrms:.4g} V: the drive gives no more",
        {"channel": _CHANNEL, "vrms": "output that was reached, V rms", "wanted_vrms": "output asked for, V rms"},
    ),
    Kind.POINT_LEFT_OUT: (
        "nothing could be read at {frequency_hz:.4g} Hz: {why}",
        {"frequency_hz": "of the tone, Hz", "why": "the reason, in words"},
    ),
    Kind.BURST_POINTS: (
        (
            "above 5 kHz and below 40 Hz it was read in bursts of up to {burst_s:.2g} s at a duty of {percent:.0f} %; "
            "sustained power there burns parts"
        ),
        {"burst_s": "length of a burst, s", "percent": "share of time with tone, %"},
    ),
    Kind.STEERED: (
        "the drive was steered so that the output stayed at {vrms:.4g} V within {percent:.2g} %",
        {"vrms": "output, V rms", "percent": "largest departure, %"},
    ),
    Kind.HARMONICS_LEAVE: (
        (
            "above {frequency_hz:.5g} Hz no harmonic lies inside the band, which ends at {high_hz:.5g} Hz: THD+N is "
            "not stated there, since it would fall without the amplifier being any better"
        ),
        {"frequency_hz": "half of the band's end, Hz", "high_hz": "end of the band, Hz"},
    ),
}
_IDLE = {
    Kind.TERMINATED_SEEN: (
        "channel {channel:.0f}: a tone from the interface does not arrive, so the input is off the interface",
        {"channel": _CHANNEL},
    ),
    Kind.NOT_TERMINATED: (
        (
            "channel {channel:.0f}: a tone from the interface still arrives, {db:.0f} dB below the input's full scale: "
            "the amplifier's input is not terminated, and the interface's output noise is in the reading"
        ),
        {"channel": _CHANNEL, "db": "how far below full scale, dB"},
    ),
    Kind.TERMINATED_STATED: (
        "channel {channel:.0f}: that the input is terminated is the person's word; nothing could be played to check it",
        {"channel": _CHANNEL},
    ),
    Kind.OWN_NOISE_UNKNOWN: (
        "channel {channel:.0f}: the interface's own noise is not known and is in the reading; calibrate it by loopback",
        {"channel": _CHANNEL},
    ),
    Kind.OWN_NOISE_WHITE: (
        "channel {channel:.0f}: the spectrum of the interface's own noise is not known; it was taken as white",
        {"channel": _CHANNEL},
    ),
    Kind.DC_NOT_PASSED: ("DC offset not read: the interface passes no DC; measure it with a meter and type it", {}),
    Kind.DC_TYPED: ("DC offset as typed from a meter", {}),
}
_RESPONSE = {
    Kind.LOOP_INSIDE: ("the interface's own response is in these figures; measure its loop, or calibrate it", {}),
    Kind.LOOP_TAKEN_OUT: ("the interface's own response, measured in a loop, is taken out", {}),
    Kind.DELAY_TAKEN_OUT: (
        "the phase is less a delay of {delay_us:.1f} µs, by its slope from 300 Hz to 6 kHz: the way round is not known",
        {"delay_us": "delay, µs"},
    ),
    Kind.CLOCKS_DIFFER: ("output and input do not share a clock: no phase is stated", {}),
    Kind.SWEEP_TOO_LOUD: (
        (
            "the sweep was left out: it stays above 5 kHz for longer than a burst may, so it is only sounded up to "
            "{most_w:.3g} W; this level is {power_w:.3g} W"
        ),
        {"most_w": "most power of a sweep, W", "power_w": "power at this level, W"},
    ),
    Kind.RELATIVE_TO_FLAT: ("shown relative to the flat setting, measured just before with the same drive", {}),
    Kind.BOOST_COSTS: (
        (
            "channel {channel:.0f}: the lift of {db:+.2f} dB at {frequency_hz:.4g} Hz asks for {ratio:.3g} times the "
            "power; where {level_w:.3g} W play without it, {needed_w:.3g} W are needed with it"
        ),
        {
            "channel": _CHANNEL,
            "db": "largest lift, dB",
            "frequency_hz": "where, Hz",
            "ratio": "the same in power",
            "level_w": "listening level, W",
            "needed_w": "power with the lift, W",
        },
    ),
    Kind.PEAKS_AT: (
        "channel {channel:.0f} into {load_ohm:.4g} Ω: the response peaks by {db:+.2f} dB at {frequency_hz:.5g} Hz",
        {"channel": _CHANNEL, "load_ohm": "the load, Ω", "db": "height, dB", "frequency_hz": "where, Hz"},
    ),
}
_PAIR = {
    Kind.CHANNELS_DIFFER: (
        "the channels differ by {db:.2f} dB with the control at {named}, where {allowed_db:.2g} dB is allowed",
        {"db": "difference, dB", "named": "the position", "allowed_db": "what is allowed, dB"},
    ),
    Kind.CHANNEL_ALONE: (
        (
            "the control moved the {what} channel by {db:.2f} dB and the {named} channel by only {other_db:.2f} dB: it "
            "works on one side only; look for a broken track, a switch or a wire"
        ),
        {
            "what": "the one that moved",
            "db": "by how much, dB",
            "named": "the one that stayed",
            "other_db": "by how much, dB",
        },
    ),
    Kind.POLARITY_TURNED: ("channel {channel:.0f} turns the polarity", {"channel": _CHANNEL}),
    Kind.POLARITY_UNKNOWN: (
        "the polarity could not be told: the sweep's first arrival is not clear, or the loop's polarity is not known",
        {},
    ),
    Kind.SENSE_POINT: (
        "wires and contacts between the point where the voltage is sensed and the load count in the output resistance",
        {},
    ),
    Kind.DAMPING_UNSURE: (
        (
            "at {frequency_hz:.4g} Hz the damping factor is {named} with 95 %: 0.01 dB of doubt is 11.6 % of a "
            "damping factor of 100"
        ),
        {"frequency_hz": "of the tone, Hz", "named": "the interval, or its bound"},
    ),
    Kind.SHARED_GROUND: (
        (
            "channels that share a ground wire between load, attenuator and interface show its voltage as crosstalk; "
            "take each channel's ground at its own output terminal"
        ),
        {},
    ),
    Kind.CROSSTALK_LIMIT: (
        "from channel {channel:.0f}: at {frequency_hz:.4g} Hz crosstalk is no more than stated; {why} hides it",
        {"channel": _CHANNEL, "frequency_hz": "of the tone, Hz", "why": "what hides it"},
    ),
    Kind.CROSSTALK_OWN_UNKNOWN: (
        "the interface's own crosstalk is not known and is in these figures; calibrate it by loopback",
        {},
    ),
    Kind.UNDRIVEN_TERMINATED: (
        "that the input of channel {channel:.0f} was terminated while it was not driven is the person's word",
        {"channel": _CHANNEL},
    ),
    Kind.SUPPLY_MEAN: (
        "volts times amperes is the supply's power on DC only; on the mains side read a wattmeter, never V times A",
        {},
    ),
    Kind.SUPPLY_IMPOSSIBLE: (
        "the output of {power_w:.4g} W is more than the {supply_w:.4g} W of the supply: a typed figure is wrong",
        {"power_w": "output of all channels, W", "supply_w": "supply's power as typed, W"},
    ),
}
AROUND_WORDS: dict[Kind, tuple[str, dict[str, str]]] = {**_DOING, **_LEVELS, **_IDLE, **_RESPONSE, **_PAIR}
