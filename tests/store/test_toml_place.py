"""Where a field stands in a TOML text: tables, arrays of tables, dotted keys, and text inside strings."""

import pytest

from wattproof.store.toml_place import Path, line_of, spelled

TEXT = '''wattproof = "rig"
limits.drive_vrms = 1.0  # dotted

note = """
[not a table]
name = no key
"""
[[wirings]]
name = "left"
[wirings.load]
nominal_ohm = 8.0

[[wirings]]  # the second
  "input" = 2
[wirings.load]
  nominal_ohm = 4.0
'''


@pytest.mark.parametrize(
    ("path", "line"),
    [
        (("wattproof",), 1),
        (("limits", "drive_vrms"), 2),
        (("note",), 4),
        (("wirings", 0), 8),
        (("wirings", 0, "name"), 9),
        (("wirings", 0, "load", "nominal_ohm"), 11),
        (("wirings", 1, "input"), 14),
        (("wirings", 1, "load", "nominal_ohm"), 16),
        (("wirings", 1, "load", "rated_w"), 15),  # not there: the table around it
        (("wirings", 1, "attenuator"), 13),
        (("elsewhere",), None),
    ],
)
def test_each_field_has_its_line(path: Path, line: int | None) -> None:
    assert line_of(TEXT, path) == line


def test_a_path_is_spelled_as_a_person_counts() -> None:
    assert spelled(("wirings", 1, "load", "measured_ohm")) == "wirings[2].load.measured_ohm"
