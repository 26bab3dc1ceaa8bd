"""The project's own files as the house tests see them: where they are, their syntax trees and what they import."""

import ast
import re
import tomllib
from collections.abc import Iterator
from importlib import metadata
from pathlib import Path
from typing import Any

ROOT = Path(__file__).parents[2]
PACKAGE = ROOT / "src" / "wattproof"
TESTS = ROOT / "tests"


def pyproject() -> dict[str, Any]:
    """Return the content of pyproject.toml."""
    return tomllib.loads((ROOT / "pyproject.toml").read_text(encoding="utf-8"))


def modules(top: Path) -> list[Path]:
    """Return the Python files below a folder, in order."""
    return sorted(top.rglob("*.py"))


def tree(path: Path) -> ast.Module:
    """Return a file's syntax tree."""
    return ast.parse(path.read_text(encoding="utf-8"))


def dotted(path: Path) -> str:
    """Return a module's name as an import writes it."""
    parts = path.relative_to(PACKAGE.parent).with_suffix("").parts
    return ".".join(parts[:-1] if parts[-1] == "__init__" else parts)


def imported(path: Path) -> Iterator[str]:
    """Yield the full name of each module that a file imports, inside functions too."""
    for node in ast.walk(tree(path)):
        if isinstance(node, ast.Import):
            yield from (alias.name for alias in node.names)
        elif isinstance(node, ast.ImportFrom):
            assert node.level == 0, f"{path} imports by a relative name; write it in full"
            yield node.module or ""


def required(specifiers: list[str]) -> set[str]:
    """Return the normalised distribution names (PEP 503) of requirement specifiers."""
    return {normal(re.split(r"[<>=!~\[; ]", specifier, maxsplit=1)[0]) for specifier in specifiers}


def normal(distribution: str) -> str:
    """Return a distribution's name as PEP 503 compares it."""
    return re.sub(r"[-_.]+", "-", distribution).lower()


def distributions() -> dict[str, set[str]]:
    """Return, for each top-level module that is installed, the distributions that bring it."""
    return {name: set(map(normal, found)) for name, found in metadata.packages_distributions().items()}
