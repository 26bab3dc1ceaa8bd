"""The root holds what it should and nothing else, and every file of the package travels with it."""

from fnmatch import fnmatch

from tests.house.sources import PACKAGE, ROOT, pyproject

_ROOT = {
    "README.md",
    "DEVELOPERS.md",
    "LICENSE",
    "pyproject.toml",
    "src",
    "tests",
    "calibration",
    "demo_recordings",
}
_ROOMS = {"core", "signals", "dsp", "procedures", "bench", "store", "report", "runner", "cli", "gui"}


def _ignored() -> list[str]:
    lines = (ROOT / ".gitignore").read_text(encoding="utf-8").splitlines()
    return [line.strip("/") for line in lines if line and not line.startswith("#")]


def test_the_root_holds_what_it_should_and_nothing_else() -> None:
    seen = {path.name for path in ROOT.iterdir() if not path.name.startswith(".")}
    built = {name for name in seen if any(fnmatch(name, pattern) for pattern in _ignored())}
    assert seen - built == _ROOT


def test_every_room_of_the_plan_stands_and_says_what_it_is_for() -> None:
    rooms = {path.parent.name for path in PACKAGE.glob("*/__init__.py")}
    assert rooms == _ROOMS


def test_the_tests_mirror_the_rooms() -> None:
    allowed = _ROOMS | {"house", "outside", "benchmarks"}
    tested = {path.name for path in (ROOT / "tests").iterdir() if path.is_dir() and path.name != "__pycache__"}
    assert tested <= allowed


def test_every_data_file_of_the_package_is_declared_and_every_declaration_finds_one() -> None:
    patterns: list[str] = pyproject()["tool"]["setuptools"]["package-data"]["wattproof"]
    files = [path.relative_to(PACKAGE) for path in PACKAGE.rglob("*") if path.is_file()]
    data = [path for path in files if path.suffix not in {".py", ".pyc"}]
    undeclared = [str(path) for path in data if not any(path.match(pattern) for pattern in patterns)]
    idle = [pattern for pattern in patterns if not any(path.match(pattern) for path in data)]
    assert (undeclared, idle) == ([], [])


def test_every_licence_file_that_is_named_exists() -> None:
    named: list[str] = pyproject()["project"]["license-files"]
    assert [name for name in named if not (ROOT / name).is_file()] == []
