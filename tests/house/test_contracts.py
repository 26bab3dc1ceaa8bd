"""Each import contract can fail: a violation planted in a copy of the package breaks that contract and no other."""

import shutil
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

import pytest

from tests.house.linting import broken_contracts
from tests.house.plants import PLANTS, Plant
from tests.house.sources import PACKAGE, ROOT, pyproject

_NO_CODE = shutil.ignore_patterns("__pycache__", "fonts")


@pytest.fixture(scope="module")
def copy(tmp_path_factory: pytest.TempPathFactory) -> Path:
    folder = tmp_path_factory.mktemp("copy")
    shutil.copytree(PACKAGE, folder / "wattproof", ignore=_NO_CODE)
    shutil.copy(ROOT / "pyproject.toml", folder)
    return folder


@contextmanager
def _planted(folder: Path, plant: Plant) -> Iterator[None]:
    stem = folder.joinpath("wattproof", *plant.module.split("."))
    made = plant.module == "shed"
    if made:
        stem.mkdir()
    path = stem / "__init__.py" if stem.is_dir() else stem.with_suffix(".py")
    before = path.read_text(encoding="utf-8") if path.exists() else None
    path.write_text(f"{before or ''}\n{plant.line}\n", encoding="utf-8")
    try:
        yield
    finally:
        if made:
            shutil.rmtree(stem)
        elif before is None:
            path.unlink()
        else:
            path.write_text(before, encoding="utf-8")


@pytest.mark.parametrize("plant", PLANTS, ids=str)
def test_a_planted_violation_breaks_its_contract_and_no_other(copy: Path, plant: Plant) -> None:
    with _planted(copy, plant):
        broken, report = broken_contracts(copy)
    assert broken == {plant.contract}, report


def test_a_clean_copy_keeps_every_contract(copy: Path) -> None:
    broken, report = broken_contracts(copy)
    assert not broken, report


def test_every_contract_has_a_planted_violation() -> None:
    contracts = {contract["name"] for contract in pyproject()["tool"]["importlinter"]["contracts"]}
    assert {plant.contract for plant in PLANTS} == contracts
