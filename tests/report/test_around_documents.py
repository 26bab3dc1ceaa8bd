"""The JSON contracts and pages of what is measured around the power statement: every documented key, plain ASCII."""

import json
from collections.abc import Iterator

import pytest

from tests.procedures.sitting import PLANS, once
from wattproof.report.around import document_of, sheet_of
from wattproof.report.quantities import Document
from wattproof.report.reading_document import json_text
from wattproof.report.sheet import sheet_text

Q = {"value", "u", "unit", "limited_by"}
POINT = {"frequency_hz", "relative_db", "u_db", "power_ratio", "phase_deg", "u_deg"}
ENVELOPE = {"wattproof", "version", "settings", "rig", "ending", "why", "notes"}
# one path into each document, and the keys that its docstring promises there
KEYS = {
    ("idle", "channels"): {
        "channel", "load_ohm", "band_hz", "terminated", "unweighted_vrms", "noise_vrms", "hum_vrms", "a_weighted_vrms",
        "quasi_peak_v", "quasi_peak_highest_v", "levels", "mains", "density", "dc_v", "dc_origin",
    },
    ("idle", "channels", "unweighted_vrms"): Q,
    ("idle", "channels", "levels"): {"unweighted", "a_weighted", "quasi_peak"},
    ("idle", "channels", "levels", "a_weighted"): {"dbv", "below_output_db", "below_1w_db", "u_db"},
    ("idle", "channels", "mains", "lines"): {"frequency_hz", "level_vrms"},
    ("idle", "channels", "density"): {"frequency_hz", "v_per_rthz"},
    ("response", "curves"): {
        "channel", "load_ohm", "relative_to", "level_vrms", "stepped", "swept", "orders", "minus_3_db", "peak", "notes",
    },
    ("response", "curves", "stepped"): POINT,
    ("sweep", "curves", "swept"): POINT,
    ("sweep", "curves", "orders"): {"order", "frequency_hz", "ratio"},
    ("response", "curves", "minus_3_db"): {"low_hz", "high_hz"},
    ("frequency", "curves"): {"channel", "load_ohm", "band_hz", "points", "notes"},
    ("frequency", "curves", "points"): {
        "frequency_hz", "level_vrms", "thdn", "thd", "noise", "harmonics_inside", "remark",
    },
    ("gain", "channels"): {"channel", "name", "inverted", "sensitivity_vrms", "positions"},
    ("gain", "channels", "positions"): {"position", "gain", "gain_db", "u_db", "from_first_db"},
    ("gain", "balance"): {"position", "right_over_left_db", "u_db"},
    ("output-resistance", "curves"): {"channel", "loads_ohm", "damping_at_ohm", "drift", "points", "notes"},
    ("output-resistance", "curves", "points"): {
        "frequency_hz", "resistance_ohm", "reactance_ohm", "magnitude_ohm", "damping",
    },
    ("output-resistance", "curves", "points", "damping"): {"value", "low", "high", "words"},
    ("crosstalk", "ways"): {"driven", "into", "load_ohm", "points", "notes"},
    ("crosstalk", "ways", "points"): {"frequency_hz", "ratio", "crosstalk_db", "u_db", "limited_by"},
    ("efficiency", "points"): {
        "level_vrms", "output_w", "supply_v", "supply_a", "supply_w", "efficiency", "heat_w",
    },
    ("efficiency", "points", "heat_w"): Q,
}  # fmt: skip


def document(name: str) -> Document:
    found, frame = once(name)
    return json.loads(json_text(document_of(found.result, frame)))  # type: ignore[no-any-return]  # an object by contract


@pytest.mark.parametrize("name", PLANS)
def test_every_document_stands_in_the_same_frame(name: str) -> None:
    told = document(name)
    assert told.keys() >= ENVELOPE
    assert (told["wattproof"], told["version"], told["ending"], told["why"]) == (once(name)[0].name, 1, "done", "")


@pytest.mark.parametrize("path", KEYS, ids=".".join)
def test_the_documented_keys_are_there_and_no_others(path: tuple[str, ...]) -> None:
    value: object = document(path[0])
    for key in path[1:]:
        assert isinstance(value, dict)
        value = value[key]
        value = value[0] if isinstance(value, list) else value
    assert isinstance(value, dict)
    assert set(value) == KEYS[path]


def numbers(value: object) -> Iterator[float]:
    if isinstance(value, dict):
        for each in value.values():
            yield from numbers(each)
    elif isinstance(value, list):
        for each in value:
            yield from numbers(each)
    elif isinstance(value, float):
        yield value


@pytest.mark.parametrize("name", PLANS)
def test_every_stated_quantity_has_an_uncertainty_that_is_no_guess_of_zero(name: str) -> None:
    found, frame = once(name)
    text = json_text(document_of(found.result, frame))
    assert text.isascii()
    assert list(numbers(json.loads(text)))  # and json_text refuses NaN and infinity


@pytest.mark.parametrize("name", PLANS)
@pytest.mark.parametrize("width", [60, 100])
def test_every_page_keeps_its_width_and_names_its_uncertainty(name: str, width: int) -> None:
    page = sheet_text(sheet_of(once(name)[0].result), width=width, ascii_only=True)
    assert page.isascii()
    assert max(len(line) for line in page.splitlines()) <= width
    assert "+- at 95 %" in " ".join(page.split())
