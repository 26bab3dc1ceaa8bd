"""Reads and writes records as TOML: a wrong one is refused with file, field and line, and nothing is overwritten.

A record begins with what it is (`wattproof = "rig"`) and its version. Frozen values are taken apart and put together by
cattrs; what a value itself refuses, and what it does not know, is told with the line at which it stands.
"""

import difflib
import os
import re
import tempfile
import tomllib
from collections.abc import Mapping
from pathlib import Path as FilePath
from typing import Any, TypeVar

import attrs
import cattrs
import tomli_w
from cattrs.errors import (
    AttributeValidationNote,
    BaseValidationError,
    ForbiddenExtraKeysError,
    IterableValidationNote,
)

from wattproof.core.errors import WrongUseError
from wattproof.core.fields import fields_of
from wattproof.store.toml_place import Path, line_of, spelled

Value = TypeVar("Value")
_KIND, _VERSION = "wattproof", "version"
_LONGEST_SHOWN = 40
_MOST_BYTES = 16_000_000  # a record of two channels has a few hundred thousand


def new_converter() -> cattrs.Converter:
    """Return a converter that takes numbers for numbers only and refuses fields that a value does not have."""
    converter = cattrs.Converter(forbid_extra_keys=True, omit_if_default=False)
    converter.register_structure_hook(float, lambda value, _: _number(value))
    converter.register_structure_hook(int, lambda value, _: _whole(value))
    converter.register_structure_hook(bool, lambda value, _: _truth(value))
    converter.register_structure_hook(str, lambda value, _: _text(value))
    return converter


def _number(value: object) -> float:
    if isinstance(value, bool) or not isinstance(value, int | float):
        raise TypeError(f"{_shown(value)} is no number; give a plain number, without unit and without quotes")
    return float(value)


def _whole(value: object) -> int:
    if isinstance(value, bool) or not isinstance(value, int):
        raise TypeError(f"{_shown(value)} is no whole number")
    return value


def _truth(value: object) -> bool:
    if not isinstance(value, bool):
        raise TypeError(f"{_shown(value)} is neither true nor false")
    return value


def _text(value: object) -> str:
    if not isinstance(value, str):
        raise TypeError(f"{_shown(value)} is no text; put it in quotes")
    return value


def _shown(value: object) -> str:
    text = str(value)
    return ascii(text if len(text) <= _LONGEST_SHOWN else text[:_LONGEST_SHOWN] + "...")


@attrs.frozen
class Format:
    """One kind of record: its name, the version that is written, and the converter of its values."""

    kind: str
    version: int
    converter: cattrs.Converter


@attrs.frozen
class Document:
    """A record as it was read: where, its text, and what it holds beyond its head."""

    file: FilePath
    text: str
    content: Mapping[str, Any]

    def error(self, path: Path, why: str) -> WrongUseError:
        """Return the error that names file, line and field."""
        line = line_of(self.text, path)
        at = f"{self.file}, line {line}" if line else f"{self.file}"
        return WrongUseError(f"{at}: {spelled(path)}: {why}" if path else f"{at}: {why}")


def read_document(file: FilePath, expected: Format) -> Document:
    """Read a TOML record and look at its head.

    Raises:
        WrongUseError: no such file, not readable, no TOML, another kind of record, or a version that is not known.
    """
    try:
        if file.stat().st_size > _MOST_BYTES:
            raise WrongUseError(f"{file} is too large for a {expected.kind} record; give another file")
        text = file.read_text(encoding="utf-8")
    except OSError as error:
        raise WrongUseError(f"{file} cannot be read: {error.strerror or error}") from error
    except UnicodeDecodeError as error:
        raise WrongUseError(f"{file} is no text in UTF-8; save it as UTF-8") from error
    try:
        content = tomllib.loads(text)
    except tomllib.TOMLDecodeError as error:
        raise WrongUseError(_syntax(file, str(error))) from error
    document = Document(file, text, content)
    kind, version = content.pop(_KIND, None), content.pop(_VERSION, None)
    if kind != expected.kind:
        found = "names no kind" if kind is None else f"is a {_shown(kind)} record"
        raise document.error(
            (_KIND,), f'it {found}; a {expected.kind} record begins with wattproof = "{expected.kind}"'
        )
    if version != expected.version:
        raise document.error(
            (_VERSION,), f"version {_shown(version)} is not known; this program reads {expected.version}"
        )
    return document


def _syntax(file: FilePath, said: str) -> str:
    place = re.search(r"\(at (?:line (\d+), column \d+|end of document)\)", said)
    what = said[: place.start()].strip() if place else said
    line = f", line {place[1]}" if place and place[1] else ""
    return f"{file}{line}: not TOML: {what}; strings need quotes, numbers none, and the decimal sign is a point"


def structured(document: Document, cls: type[Value], expected: Format) -> Value:
    """Return the value that a document holds.

    Raises:
        WrongUseError: a field is unknown, missing, of the wrong kind, or refused by the value itself.
    """
    try:
        return expected.converter.structure(document.content, cls)
    except BaseValidationError as group:
        path, why = _first(group, ())
        raise document.error(path, why) from group


def _first(error: BaseException, path: Path) -> tuple[Path, str]:
    """Return the path of the first thing that is wrong, and why."""
    for note in getattr(error, "__notes__", ()):
        if isinstance(note, AttributeValidationNote):
            path = (*path, note.name)
        elif isinstance(note, IterableValidationNote):
            path = (*path, note.index)
    if isinstance(error, BaseValidationError):
        inner = error.exceptions[0]
        field = _field_refused(error.cl, str(inner)) if not getattr(inner, "__notes__", ()) else ""
        return _first(inner, (*path, field) if field else path)
    if isinstance(error, ForbiddenExtraKeysError):
        unknown = min(error.extra_fields)
        names = [field.name for field in attrs.fields(error.cl)] if attrs.has(error.cl) else []
        near = difflib.get_close_matches(unknown, names, 1, 0.5)
        hint = f"did you mean {near[0]}?" if near else f"there are {', '.join(names)}"
        return (*path, unknown), f"no such field; {hint}"
    if isinstance(error, KeyError):
        return path, f"{error.args[0]} is missing"
    return _refused(error, path)


def _field_refused(cls: type[Any], text: str) -> str:
    """Return the field that a value's own refusal speaks of, by its name or its label; empty where none is found."""
    for field in fields_of(cls) if attrs.has(cls) else ():
        if text.startswith((f"{cls.__name__}.{field.name} ", f"{field.label.lower()} is ")):
            return field.name
    return ""


def _refused(error: BaseException, path: Path) -> tuple[Path, str]:
    """Return where a value's own refusal belongs: its text may begin with Class.field."""
    named = re.match(r"[A-Z]\w*\.(\w+) ", str(error))
    return ((*path, named[1]) if named and (not path or path[-1] != named[1]) else path), str(error)


def written(content: Mapping[str, Any], expected: Format) -> str:
    """Return the TOML text of a record's content; what is None is left out."""
    head = {_KIND: expected.kind, _VERSION: expected.version}
    return tomli_w.dumps({**head, **_without_none(content)})


def _without_none(content: Mapping[str, Any]) -> dict[str, Any]:
    return {key: _kept(value) for key, value in content.items() if value is not None}


def _kept(value: Any) -> Any:  # noqa: ANN401 - whatever TOML holds
    if isinstance(value, Mapping):
        return _without_none(value)
    if isinstance(value, list | tuple):
        return [_kept(each) for each in value]
    return value


def save(file: FilePath, text: str) -> None:
    """Write a record whole or not at all: what was there stays until the new text is on the disk.

    Raises:
        WrongUseError: the folder or the file cannot be written.
    """
    try:
        file.parent.mkdir(parents=True, exist_ok=True)
        handle, name = tempfile.mkstemp(prefix=f".{file.name}.", dir=file.parent)
        try:
            with os.fdopen(handle, "w", encoding="utf-8", newline="\n") as stream:
                stream.write(text)
                stream.flush()
                os.fsync(stream.fileno())
            FilePath(name).replace(file)
        except BaseException:
            FilePath(name).unlink(missing_ok=True)
            raise
    except OSError as error:
        raise WrongUseError(f"{file} cannot be written: {error.strerror or error}") from error


def file_name(name: str) -> str:
    """Return a name that every file system takes, for a record of that name.

    Raises:
        WrongUseError: nothing of it can be part of a file's name.
    """
    safe = re.sub(r"[^A-Za-z0-9._-]+", "-", name).strip("-.")
    if not safe:
        raise WrongUseError(f"{_shown(name)} cannot name a file; use letters and digits")
    return f"{safe[:100]}.toml"
