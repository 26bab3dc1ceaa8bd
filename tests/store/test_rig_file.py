"""Rig files: what is written is read back, and whatever is wrong is said with file, line and field."""

from pathlib import Path

import attrs
import pytest

from wattproof.core.errors import WrongUseError
from wattproof.core.rig import Attenuator, Limits, Load, Rig, Wiring
from wattproof.store.rig_file import read_rig, rig_text, write_rig

RIG = Rig(
    "bench by the window",
    (
        Wiring("left", 1, 1, Load(8.0, 8.03, rated_w=100.0, hot_ohm=8.06), Attenuator(20.0, 60.0), bridge_tied=True),
        Wiring("right", 2, 2, Load(4.0)),
    ),
    Limits(1.5, 40.0, 120.0),
    "ALSA/interface",
    'measured 2026-01-02 with the "blue" meter',
)
TEXT = """wattproof = "rig"
version = 1
name = "table"

[[wirings]]
name = "left"
[wirings.load]
nominal_ohm = 8.0
measured_ohm = 8.02
[wirings.attenuator]
r1a_ohm = 10000.0
r2a_ohm = 1000.0
input_ohm = 10000.0
"""


def refused(folder: Path, text: str) -> str:
    file = folder / "rig.toml"
    file.write_text(text, encoding="utf-8")
    with pytest.raises(WrongUseError) as error:
        read_rig(file)
    assert file.read_text(encoding="utf-8") == text  # nothing is overwritten
    said = str(error.value)
    assert said.startswith(str(file))
    assert "\n" not in said
    return said.removeprefix(str(file))


def test_what_is_written_is_read_back(tmp_path: Path) -> None:
    file = tmp_path / "deep" / "rig.toml"
    write_rig(file, RIG)
    assert read_rig(file) == RIG
    assert [path.name for path in file.parent.iterdir()] == ["rig.toml"]  # no leftover of the writing


def test_the_ratio_comes_from_the_resistors_and_what_loads_them(tmp_path: Path) -> None:
    file = tmp_path / "rig.toml"
    file.write_text(TEXT, encoding="utf-8")
    # by hand: 1 + 10 000·(1/1000 + 1/10 000) = 12
    assert read_rig(file).wirings[0].attenuator.ratio == pytest.approx(12.0, rel=1e-12, abs=0.0)


@pytest.mark.parametrize(
    ("old", "new", "said"),
    [
        (
            "measured_ohm = 8.02",
            'measured_ohm = "8.02 Ω"',
            ", line 9: wirings[1].load.measured_ohm: '8.02 \\u03a9' is no",
        ),
        (
            "measured_ohm = 8.02",
            "measured_ohm = 8020",
            ", line 9: wirings[1].load.measured_ohm: 8020 Ω beside a nominal 8",
        ),
        (
            "measured_ohm = 8.02",
            "measured_ohm = -8.02",
            ", line 9: wirings[1].load.measured_ohm: Load.measured_ohm is -8",
        ),
        (
            "measured_ohm",
            "mesured_ohm",
            ", line 9: wirings[1].load.mesured_ohm: no such field; did you mean measured_ohm?",
        ),
        ("nominal_ohm = 8.0", "nominal_ohm = 0.0", ", line 8: wirings[1].load.nominal_ohm: load is 0"),
        (
            "r2a_ohm = 1000.0\n",
            "",
            ", line 11: wirings[1].attenuator.r1a_ohm: a resistor to ground (r2a_ohm) is missing",
        ),
        (
            "r1a_ohm",
            "ratio = 11.0\nr1a_ohm",
            ", line 11: wirings[1].attenuator.ratio: 11 is not what the resistors make",
        ),
        ('name = "left"', "name = left", ", line 6: not TOML: "),
        ("version = 1", "version = 2", ", line 2: version: version '2' is not known; this program reads 1"),
        ('"rig"', '"calibration"', ", line 1: wattproof: it is a 'calibration' record; a rig record begins with"),
        ('name = "table"', "name = 5", ", line 3: name: '5' is no text; put it in quotes"),
    ],
)
def test_a_file_edited_by_hand_is_refused_with_its_line(tmp_path: Path, old: str, new: str, said: str) -> None:
    assert refused(tmp_path, TEXT.replace(old, new, 1)).startswith(said)


def test_milliohm_are_recognised(tmp_path: Path) -> None:
    assert "it looks like mΩ; give Ω, 8.02" in refused(tmp_path, TEXT.replace("8.02", "8020"))


def test_a_measured_ratio_stands_beside_its_resistors(tmp_path: Path) -> None:
    file = tmp_path / "rig.toml"
    file.write_text(TEXT + "ratio = 12.1\nmeasured_accuracy = 0.002\n", encoding="utf-8")
    assert read_rig(file).wirings[0].attenuator.ratio == 12.1


def test_files_that_are_none_are_refused(tmp_path: Path) -> None:
    with pytest.raises(WrongUseError, match="cannot be read: No such file"):
        read_rig(tmp_path / "none.toml")
    with pytest.raises(WrongUseError, match="cannot be read"):
        read_rig(tmp_path)
    (tmp_path / "bytes.toml").write_bytes(b"\xff\xfe\x00")
    with pytest.raises(WrongUseError, match="save it as UTF-8"):
        read_rig(tmp_path / "bytes.toml")


def test_a_write_that_fails_leaves_what_was_there(tmp_path: Path) -> None:
    file = tmp_path / "file" / "rig.toml"
    (tmp_path / "file").write_text("in the way", encoding="utf-8")
    with pytest.raises(WrongUseError, match="cannot be written"):
        write_rig(file, RIG)
    assert (tmp_path / "file").read_text(encoding="utf-8") == "in the way"


def test_every_field_that_a_rig_declares_is_written() -> None:
    text = rig_text(RIG)
    wiring = RIG.wirings[0]
    for value in (wiring, wiring.load, wiring.attenuator, RIG.limits):
        for name, content in attrs.asdict(value, recurse=False).items():
            if content is not None:  # what is not known is left out
                assert f"{name} = " in text or f"{name}]" in text
