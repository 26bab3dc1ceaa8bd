"""One declaration of a field makes its option: name, unit, range, help, and one line where a value is wrong."""

from collections.abc import Sequence
from enum import StrEnum
from typing import Any

import attrs
import click
import pytest

from wattproof.cli.main import run
from wattproof.cli.options import options_of, value_from
from wattproof.core.errors import WrongUseError
from wattproof.core.fields import declared, fields_of
from wattproof.core.reading import ReadingSettings
from wattproof.core.rig import Attenuator, Limits, Load, Rig, Wiring
from wattproof.procedures.watch import Watch


class Pace(StrEnum):
    """How fast."""

    SLOW = "slow"
    FAST = "fast"


@attrs.frozen
class Plan:
    """A plan with a field of each kind."""

    drive_vrms: float = declared(label="Drive", unit="V rms", minimum=0.0, maximum=5.0, help="level at the output")
    steps: int = declared(10, label="Steps", minimum=1, help="how many levels")
    stop_hz: float | None = declared(None, label="Last", unit="Hz", maximum=96e3, help="where to end")
    pace: Pace = declared(Pace.SLOW, label="Pace", help="how fast to go")
    name: str = declared("bench", label="Name", help="what it is called")
    ramped: bool = declared(default=True, label="Ramped", help="starts and ends softly")


def given(*arguments: str, cls: type[Any] = Plan) -> Any:  # noqa: ANN401 - of the class that was asked for
    """Return the value that a command with these arguments gets."""
    got: list[Any] = []

    @click.command()
    @options_of(cls)
    def command(**values: object) -> None:
        got.append(value_from(cls, values))

    with command.make_context("command", list(arguments)) as ctx:
        command.invoke(ctx)
    return got[0]


def test_every_kind_of_field_is_an_option() -> None:
    line = "--drive-vrms 1.5 --steps 3 --stop-hz 20000 --pace fast --name rig2 --no-ramped"
    assert given(*line.split()) == Plan(1.5, 3, 20_000.0, Pace.FAST, "rig2", ramped=False)


def test_what_is_left_out_is_as_declared() -> None:
    assert given("--drive-vrms", "1") == Plan(1.0)


@pytest.mark.parametrize("cls", [Watch, ReadingSettings, Load, Attenuator, Wiring, Limits, Rig])
def test_the_declared_values_of_the_house_are_options_too(cls: type[Any]) -> None:
    assert given(cls=cls) == cls()


def test_the_help_tells_label_unit_and_default() -> None:
    @click.command()
    @options_of(Plan)
    def command(**_: object) -> None:
        return

    text = " ".join(command.get_help(click.Context(command)).split())
    assert "--drive-vrms NUMBER Drive, in V rms: level at the output. [required]" in text
    assert "--stop-hz HZ Last, in Hz: where to end." in text
    assert "--pace [slow|fast] Pace: how fast to go. [default: slow]" in text
    assert "--ramped / --no-ramped Ramped: starts and ends softly. [default: ramped]" in text


def test_a_field_may_be_left_to_another_option() -> None:
    @click.command()
    @options_of(Plan, without=("name", "drive_vrms"))
    def command(**_: object) -> None:
        return

    assert [param.name for param in command.params] == ["steps", "stop_hz", "pace", "ramped"]


@pytest.mark.parametrize(
    ("arguments", "line"),
    [
        (("--drive-vrms", "9"), '--drive-vrms: "9": give a number from 0 to 5 V rms'),
        (("--drive-vrms", "nan"), '--drive-vrms: "nan": give a number from 0 to 5 V rms'),
        (("--drive-vrms", "1e999"), '--drive-vrms: "1e999": give a number from 0 to 5 V rms'),
        (("--drive-vrms", "loud"), '--drive-vrms: "loud": give a number from 0 to 5 V rms'),
        (("--drive-vrms", "1", "--steps", "1.5"), '--steps: "1.5": give a whole number from 1'),
        (("--drive-vrms", "1", "--stop-hz", "1e6"), '--stop-hz: "1e6": give a number up to 96000 Hz'),
        (("--drive-vrms", "1", "--pace", "x"), "--pace: 'x' is not one of 'slow', 'fast'"),
        ((), "--drive-vrms is missing; see wattproof plan --help"),
    ],
)
def test_a_wrong_value_is_one_line_that_says_what_to_give(
    arguments: Sequence[str], line: str, capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    @click.command("plan")
    @options_of(Plan)
    def command(**values: object) -> None:
        value_from(Plan, values)

    monkeypatch.setattr("wattproof.cli.main.COMMANDS", {"plan": (__name__, "unused")})
    monkeypatch.setattr("wattproof.cli.main.command_named", lambda _: command)
    assert run(["plan", *arguments], lambda _: 0, str) == 2
    assert capsys.readouterr().err == f"wattproof: plan: {line}\n"


def test_fields_that_do_not_fit_together_are_refused_in_the_words_of_the_value() -> None:
    with pytest.raises(WrongUseError, match="the band 500-100 Hz is reversed or empty"):
        given("--low-hz", "500", "--high-hz", "100", cls=ReadingSettings)


def test_a_field_that_no_option_can_hold_is_an_error_of_the_program() -> None:
    @attrs.frozen
    class Odd:
        levels: tuple[float, ...] = declared((), label="Levels", help="several")

    assert len(fields_of(Odd)) == 1
    with pytest.raises(TypeError, match="field levels is of type"):
        options_of(Odd)(lambda: None)
