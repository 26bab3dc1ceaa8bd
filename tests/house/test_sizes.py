"""Sizes that keep a house light, and a sentence at the head of every module."""

import ast
from pathlib import Path
from statistics import median, quantiles

import pytest

from tests.house.sources import PACKAGE, TESTS, modules, tree

_MEDIAN_LINES = 150
_MOST_LINES = 400
_FUNCTION_LINES = 30  # for nine of ten


def _lines(path: Path) -> int:
    return len(path.read_text(encoding="utf-8").splitlines())


def _function_lines(path: Path) -> list[int]:
    functions = (node for node in ast.walk(tree(path)) if isinstance(node, ast.FunctionDef | ast.AsyncFunctionDef))
    return [(node.end_lineno or node.lineno) - node.lineno + 1 for node in functions]


@pytest.mark.parametrize("top", [PACKAGE, TESTS], ids=["package", "tests"])
def test_no_module_is_too_long(top: Path) -> None:
    assert {path.name: _lines(path) for path in modules(top) if _lines(path) > _MOST_LINES} == {}


@pytest.mark.parametrize("top", [PACKAGE, TESTS], ids=["package", "tests"])
def test_half_of_the_modules_are_short(top: Path) -> None:
    told = [_lines(path) for path in modules(top) if path.name != "__init__.py"]  # which would lower the median
    assert median(told) <= _MEDIAN_LINES


@pytest.mark.parametrize("top", [PACKAGE, TESTS], ids=["package", "tests"])
def test_nine_of_ten_functions_are_short(top: Path) -> None:
    told = [lines for path in modules(top) for lines in _function_lines(path)]
    assert quantiles(told, n=10)[-1] <= _FUNCTION_LINES


@pytest.mark.parametrize("top", [PACKAGE, TESTS], ids=["package", "tests"])
def test_every_module_begins_with_a_sentence(top: Path) -> None:
    heads = {path: (ast.get_docstring(tree(path)) or "").split("\n", maxsplit=1)[0] for path in modules(top)}
    assert [str(path) for path, head in heads.items() if not head.endswith((".", "?", "!"))] == []
