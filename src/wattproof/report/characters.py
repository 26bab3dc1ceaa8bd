r"""Text reduced to what the place it goes to can show: names of any bytes in one line, the trade's signs in ASCII."""

import unicodedata

_ASCII = str.maketrans({
    "−": "-", "–": "-", "±": "+-", "Ω": "ohm", "µ": "u", "μ": "u", "°": " deg", "²": "^2", "×": "x", "÷": "/", "·": "|",
    "…": "...", "√": "sqrt", "\u00a0": " ", "\u2009": " ", "\u202f": " ",
})  # fmt: skip


def encodable(text: str) -> str:
    r"""Return the text so that every JSON reader takes it: bytes of a file name that are no text come out as `\xNN`.

    Python holds them as lone surrogates (PEP 383), at which other readers of JSON stop.
    """
    return "".join(_escaped(character) if "\ud800" <= character <= "\udfff" else character for character in text)


def printable(text: str) -> str:
    r"""Return the text in one line that every terminal takes.

    Beside what `encodable` does, control characters, line ends and marks that turn the writing direction come out as
    their escapes.
    """
    return "".join(_escaped(character) if _hidden(character) else character for character in text)


def in_ascii(text: str) -> str:
    r"""Return the text with the trade's signs spelt in ASCII and any other character beyond it as its escape."""
    return text.translate(_ASCII).encode("ascii", "backslashreplace").decode("ascii")


def _hidden(character: str) -> bool:
    category = unicodedata.category(character)
    return category.startswith("C") or category in {"Zl", "Zp"}


def _escaped(character: str) -> str:
    if "\udc80" <= character <= "\udcff":  # PEP 383: the byte NN is held as U+DCNN
        return f"\\x{ord(character) - 0xDC00:02x}"
    return character.encode("unicode_escape").decode("ascii")
