"""What is imported, and when: nothing by the package itself, nothing slow at first, nothing undeclared."""

import json
import os
import subprocess
import sys
from pathlib import Path

import pytest

from tests.house.sources import (
    PACKAGE,
    TESTS,
    distributions,
    dotted,
    imported,
    modules,
    normal,
    pyproject,
    required,
)

_SLOW = ("scipy.signal", "scipy.optimize", "scipy.stats")  # a second each: not on the way to the first reading
_QT = ("PySide6", "shiboken6")
_PURE_ROOMS = ("core", "signals", "dsp", "procedures")
_PURE = {  # what numeric Python needs, and nothing that touches a file, a clock, a thread or a device
    "attrs",
    "bisect",
    "cmath",
    "collections",
    "decimal",
    "enum",
    "fractions",
    "functools",
    "itertools",
    "math",
    "numpy",
    "operator",
    "scipy",
    "string",
    "types",
    "typing",
    "wattproof",
}
_LOAD = (
    "import sys, json, importlib; [importlib.import_module(n) for n in sys.argv[1:]]; print(json.dumps([*sys.modules]))"
)
_PART_OF = {"shiboken6": "pyside6-essentials"}  # which requires it in its own version: the binding's run-time half
_AWAITED: set[str] = set()  # declared ahead of their use
_EXTRA = {"pyarrow"}  # imported inside one function, which says in one line what to install where it is missing
_NOT_QT = [path for path in modules(PACKAGE) if path.relative_to(PACKAGE).parts[0] != "gui"]


def _loaded(names: list[str]) -> set[str]:
    """Return every module that a fresh Python holds once these are imported."""
    done = subprocess.run(
        [sys.executable, "-c", _LOAD, *names],
        env={**os.environ, "PYTHONPATH": str(PACKAGE.parent)},
        capture_output=True,
        text=True,
        check=False,
    )
    assert done.returncode == 0, done.stderr
    return set(json.loads(done.stdout))


def _below(loaded: set[str], tops: tuple[str, ...]) -> list[str]:
    return sorted(name for name in loaded if any(name == top or name.startswith(f"{top}.") for top in tops))


def test_the_package_itself_imports_nothing() -> None:
    assert list(imported(PACKAGE / "__init__.py")) == []
    assert {name for name in _loaded(["wattproof"]) if name.startswith("wattproof")} == {"wattproof"}


def test_without_the_window_neither_qt_nor_a_slow_library_is_loaded() -> None:
    loaded = _loaded([dotted(path) for path in _NOT_QT])
    assert "wattproof.__main__" in loaded
    assert _below(loaded, _SLOW + _QT) == []


def test_the_window_loads_no_slow_library() -> None:
    loaded = _loaded([dotted(path) for path in modules(PACKAGE / "gui")])
    assert "PySide6" in loaded
    assert _below(loaded, _SLOW) == []


def test_the_check_would_see_a_slow_library() -> None:
    assert _below(_loaded(["scipy.signal"]), _SLOW) != []


@pytest.mark.parametrize("room", _PURE_ROOMS)
def test_a_pure_room_imports_only_what_is_pure(room: str) -> None:
    found = {(path.name, name) for path in modules(PACKAGE / room) for name in imported(path)}
    assert {(path, name) for path, name in found if name.split(".")[0] not in _PURE} == set()


def _foreign(paths: list[Path]) -> set[str]:
    tops = {name.split(".")[0] for path in paths for name in imported(path)}
    return tops - set(sys.stdlib_module_names) - {"wattproof", "tests", "__future__"}


def _brought_by(tops: set[str]) -> set[str]:
    known = distributions()
    names = {normal(name) for top in tops for name in known[top]}
    return {_PART_OF.get(name, name) for name in names}


def test_each_dependency_is_used_and_each_import_declared() -> None:
    used = _brought_by(_foreign(modules(PACKAGE)))
    assert not used & _AWAITED, "it is used now: take it off the list"
    assert used - _EXTRA | _AWAITED == required(pyproject()["project"]["dependencies"])
    assert required(pyproject()["project"]["optional-dependencies"]["parquet"]) == _EXTRA


def test_each_import_of_the_tests_is_declared() -> None:
    project = pyproject()["project"]
    declared = required(project["dependencies"]) | required(project["optional-dependencies"]["test"])
    assert _brought_by(_foreign(modules(TESTS))) <= declared
