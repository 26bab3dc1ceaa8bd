"""A field is declared once, and its bounds speak in sentences."""

import attrs
import pytest

from wattproof.core import checks
from wattproof.core.fields import declared, fields_of


@attrs.frozen
class _Supply:
    volts: float = declared(24.0, label="Supply", unit="V", minimum=10.0, maximum=60.0, help="the amplifier's supply")
    gain: float = declared(1.0, label="Gain", minimum=0.5, help="voltage gain")
    fuse_a: float | None = declared(None, label="Fuse", unit="A", maximum=10.0, help="its rating")
    name: str = declared("bench", label="Name", help="what it is called")
    load_ohm: float = declared(8.0, label="Load", unit="Ω", help="the load", validator=checks.positive)
    undeclared: int = 0


def test_the_declaration_tells_everything_about_a_field() -> None:
    supply, gain, fuse, name, load = fields_of(_Supply)
    assert (supply.name, supply.kind, supply.default, supply.label) == ("volts", float, 24.0, "Supply")
    assert (supply.unit, supply.minimum, supply.maximum, supply.help) == ("V", 10.0, 60.0, "the amplifier's supply")
    assert (gain.unit, gain.minimum, gain.maximum) == ("", 0.5, None)
    assert (fuse.kind, fuse.default) == (float | None, None)
    assert (name.kind, name.default) == (str, "bench")
    assert load.name == "load_ohm"


@pytest.mark.parametrize("volts", [10.0, 24.0, 60.0])
def test_bounds_belong_to_the_range(volts: float) -> None:
    assert _Supply(volts=volts).volts == volts


@pytest.mark.parametrize("volts", [9.99, 60.01, -1.0, float("inf"), float("nan")])
def test_a_number_outside_is_refused_in_a_sentence(volts: float) -> None:
    with pytest.raises(ValueError, match=r"^supply is \S+ V; it must lie from 10 to 60 V$"):
        _Supply(volts=volts)


def test_one_bound_alone_is_said_alone() -> None:
    with pytest.raises(ValueError, match=r"^gain is 0\.25; it must be at least 0\.5$"):
        _Supply(gain=0.25)
    with pytest.raises(ValueError, match=r"^fuse is 16 A; it must be at most 10 A$"):
        _Supply(fuse_a=16.0)


def test_none_passes_where_it_is_the_default_and_nowhere_else() -> None:
    assert _Supply(fuse_a=None).fuse_a is None
    with pytest.raises((TypeError, ValueError)):
        _Supply(volts=None)  # type: ignore[arg-type] # the wrong value is what is tested


def test_a_further_check_is_asked_too() -> None:
    with pytest.raises(ValueError, match=r"_Supply\.load_ohm is 0\.0; it must be above zero"):
        _Supply(load_ohm=0.0)
