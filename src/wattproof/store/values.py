"""Values of ours as canonical JSON text and back, bit for bit: what the records of a session file hold."""

import json
import math
from functools import cache
from typing import Any, TypeVar, get_origin

import cattrs
import numpy as np

Value = TypeVar("Value")
_NOT_FINITE = {"inf": math.inf, "-inf": -math.inf}


def canonical(content: object) -> str:
    """Return JSON in ASCII with sorted keys and no spaces; floats as the shortest text that reads back to the same.

    Raises:
        ValueError: a number that is not finite; `unstructured` writes infinities as text.
    """
    return json.dumps(content, sort_keys=True, separators=(",", ":"), allow_nan=False)


def unstructured(value: object) -> Any:  # noqa: ANN401 - whatever JSON holds
    """Return a value of ours as what JSON holds: dicts, lists, text and numbers; infinity is the text "inf"."""
    return _converter().unstructure(value)


def structured(content: object, cls: type[Value]) -> Value:
    """Return the value that `unstructured` made this content of.

    Raises:
        cattrs.BaseValidationError, ValueError, TypeError, KeyError: it was not made of such a value.
    """
    return _converter().structure(content, cls)


@cache
def _converter() -> cattrs.Converter:
    converter = cattrs.Converter(detailed_validation=False)
    converter.register_unstructure_hook(float, _number_out)
    converter.register_structure_hook(float, lambda value, _: _number_in(value))
    converter.register_structure_hook_func(lambda cls: cls == float | str, lambda value, _: _either_in(value))
    converter.register_unstructure_hook_func(lambda cls: cls == float | str, _either_out)
    converter.register_unstructure_hook_func(_is_array, _array_out)
    converter.register_structure_hook_func(_is_array, lambda value, _: _array_in(value))
    return converter


def _number_out(value: float) -> float | str:
    return float(value) if math.isfinite(value) else str(float(value))


def _number_in(value: Any) -> float:  # noqa: ANN401 - whatever the file holds
    return _NOT_FINITE[value] if isinstance(value, str) else float(value)


def _either_out(value: float | str) -> float | str:
    return value if isinstance(value, str) else _number_out(value)


def _either_in(value: Any) -> float | str:  # noqa: ANN401 - likewise
    return _NOT_FINITE.get(value, value) if isinstance(value, str) else float(value)


def _is_array(cls: Any) -> bool:  # noqa: ANN401 - any type of any field
    return cls is np.ndarray or get_origin(cls) is np.ndarray


def _array_out(array: "np.ndarray[Any, Any]") -> Any:  # noqa: ANN401 - whatever JSON holds
    if np.iscomplexobj(array):
        return {"re": array.real.tolist(), "im": array.imag.tolist()}
    return array.tolist()


def _array_in(content: Any) -> "np.ndarray[Any, Any]":  # noqa: ANN401 - likewise
    if not isinstance(content, dict):
        return np.asarray(content, dtype=np.float64)
    array = np.empty(len(content["re"]), dtype=np.complex128)
    array.real, array.imag = content["re"], content["im"]
    return array
