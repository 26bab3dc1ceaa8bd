"""Numbers as engineers write them: three digits and a prefix, with the unit; resistors to all of their digits."""

import math

_PREFIXES = {-12: "p", -9: "n", -6: "µ", -3: "m", 0: "", 3: "k", 6: "M", 9: "G"}


def engineering(number: float, unit: str, digits: int = 3) -> str:
    """Return a number with a prefix before its unit: 0.0432 W is "43.2 mW"; infinity is "unlimited"."""
    if math.isinf(number):
        return "unlimited"
    if number == 0.0:
        return f"0 {unit}"
    power = min(max(3 * math.floor(math.log10(abs(float(f"{number:.{digits - 1}e}"))) / 3), -12), 9)
    scaled = number / 10.0**power
    places = max(digits - 1 - math.floor(math.log10(abs(float(f"{scaled:.{digits - 1}e}")))), 0)
    return f"{scaled:.{places}f} {_PREFIXES[power]}{unit}".replace("-", "−")


def resistance(ohm: float) -> str:
    """Return a resistor's value without a digit more than it has: 4020 Ω is "4.02 kΩ"."""
    power = min(max(3 * math.floor(math.log10(ohm) / 3), 0), 6)
    return f"{ohm / 10**power:g} {_PREFIXES[power]}Ω"


def decibels_text(level_db: float, places: int = 1) -> str:
    """Return a level in dB with a true minus sign."""
    return f"{level_db:.{places}f} dB".replace("-", "−")
