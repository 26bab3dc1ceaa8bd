"""Where in a TOML text a field stands, so that an error can name the line; `tomllib` itself keeps no places."""

import re
from collections.abc import Iterator

Path = tuple[str | int, ...]  # keys, and indices of arrays of tables, from the root

_HEADER = re.compile(r"^\s*(\[\[|\[)\s*([^\[\]]+?)\s*\]\]?\s*(?:#.*)?$")
_KEY = re.compile(r"""^\s*((?:[A-Za-z0-9_-]+|"[^"]*"|'[^']*')(?:\s*\.\s*(?:[A-Za-z0-9_-]+|"[^"]*"|'[^']*'))*)\s*=""")
_QUOTES = re.compile(r'"""|' + "'''")


def line_of(text: str, path: Path) -> int | None:
    """Return the line, from 1, at which the field of a path stands, or the nearest table around it; None for none."""
    places = dict(_places(text))
    for length in range(len(path), 0, -1):
        found = places.get(path[:length])
        if found is not None:
            return found
    return None


def _places(text: str) -> Iterator[tuple[Path, int]]:
    """Yield the path of each table and key with its line. Text inside long strings is passed over."""
    table: Path = ()
    counts: dict[Path, int] = {}
    inside = False
    for number, line in enumerate(text.splitlines(), 1):
        quotes = len(_QUOTES.findall(line))
        if inside:
            inside = quotes % 2 == 0
            continue
        inside = quotes % 2 == 1
        header = _HEADER.match(line)
        if header is not None:
            table = _entered(_split(header[2]), counts, is_array=header[1] == "[[")
            yield table, number
            continue
        key = _KEY.match(line)
        if key is not None:
            yield (*table, *_split(key[1])), number


def _split(dotted: str) -> tuple[str, ...]:
    return tuple(part.strip().strip("\"'") for part in dotted.split("."))


def _entered(keys: tuple[str, ...], counts: dict[Path, int], *, is_array: bool) -> Path:
    """Return the path of a table: inside an array of tables it belongs to the newest entry."""
    path: Path = ()
    for key in keys[:-1]:
        path = (*path, key)
        if path in counts:
            path = (*path, counts[path])
    path = (*path, keys[-1])
    if is_array:
        counts[path] = counts.get(path, -1) + 1
        path = (*path, counts[path])
    return path


def spelled(path: Path) -> str:
    """Return a path as a person writes it: wirings[2].load.measured_ohm, entries counted from 1."""
    text = ""
    for step in path:
        text += f"[{step + 1}]" if isinstance(step, int) else f".{step}" if text else step
    return text
