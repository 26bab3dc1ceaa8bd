"""The sentences of the look at a device before the first tone."""

from wattproof.core.notes import Kind

_INPUT = "input, counted from 1"
PREFLIGHT_WORDS: dict[Kind, tuple[str, dict[str, str]]] = {
    Kind.INPUT_ZEROS: (
        (
            "input {input:.0f} gives exact zeros: no converter does; the permission for the microphone is "
            "missing, the input is switched off, or nothing is connected to it in the sound system: look "
            "there, then check again"
        ),
        {"input": _INPUT},
    ),
    Kind.DIGITAL: (
        (
            "input {input:.0f} gives exact zeros in silence, but what is played comes back: a digital way, "
            "with no converter"
        ),
        {"input": _INPUT},
    ),
    Kind.NOISE_FLOOR: (
        "input {input:.0f} in silence: {db:.1f} dBFS",
        {"input": _INPUT, "db": "rms of all that is there, dB to a full-scale sine"},
    ),
    Kind.SOMETHING_PLAYS: (
        (
            "input {input:.0f} is not silent: {db:.1f} dBFS, most of it at {frequency_hz:.0f} Hz; another "
            "program plays, a source is connected, or the input hums: stop it or pull it out, then check "
            "again"
        ),
        {"input": _INPUT, "db": "rms, dB to a full-scale sine", "frequency_hz": "its strongest line, Hz"},
    ),
    Kind.MONITORING: (
        (
            "what goes in at input {input:.0f} comes out again: a second arrival of {db:.0f} dB to the first;"
            " turn monitoring off in the interface's mixer and in the sound system"
        ),
        {"input": _INPUT, "db": "second arrival to the first, dB"},
    ),
    Kind.NOTHING_BACK: (
        (
            "nothing of output {output:.0f} came back at input {input:.0f} at {db:.0f} dBFS: round trip, rate"
            " and clock were not looked at; check cable, gain and load, or go on without"
        ),
        {"output": "output, counted from 1", "input": _INPUT, "db": "level that was sent, dBFS"},
    ),
    Kind.ROUND_TRIP: (
        "round trip {ms:.2f} ms ({frames:.0f} frames)",
        {"ms": "from output to input, ms", "frames": "the same in frames"},
    ),
    Kind.RATE_HONEST: (
        ("a tone of {frequency_hz:.0f} Hz, near half the rate, comes back at {db:+.1f} dB to 1 kHz: the rate is real"),
        {"frequency_hz": "frequency near half the rate, Hz", "db": "its level to that of the tone of 997 Hz, dB"},
    ),
    Kind.RESAMPLED: (
        (
            "a tone of {frequency_hz:.0f} Hz, near half the rate, does not come back ({db:+.0f} dB to 1 kHz):"
            " the sound system resamples, or what is wired ends below; join output to input to tell, and "
            "choose a direct way to the device"
        ),
        {"frequency_hz": "frequency near half the rate, Hz", "db": "its level to that of the tone of 997 Hz, dB"},
    ),
    Kind.ONE_CLOCK: (
        "input and output run on one clock ({ppm:+.2f} ppm, within {within:.2f})",
        {"ppm": "captured over played frequency, less 1, ppm", "within": "its 95 % uncertainty, ppm"},
    ),
    Kind.TWO_CLOCKS: (
        (
            "input and output run on two clocks, {ppm:+.1f} ppm apart: the fit follows the frequency, so "
            "readings of a steady tone hold; one interface for both is better"
        ),
        {"ppm": "captured over played frequency, less 1, ppm"},
    ),
    Kind.WORD_LENGTH: (
        "input {input:.0f} delivers {what}",
        {"input": _INPUT, "what": "the word length, in words"},
    ),
    Kind.BITS_IDLE: (
        (
            "input {input:.0f} delivers {what}: the lowest {count:.0f} of 24 bits are never used, so noise "
            "cannot fall below {db:.0f} dB under full scale; look for a format or shared mode that cuts them "
            "off"
        ),
        {
            "input": _INPUT,
            "what": "the word length, in words",
            "count": "bits that are always zero",
            "db": "rounding noise of such a word, dB under a full-scale sine",
        },
    ),
}
