"""The JSON document keeps its contract: names, units, nulls, ASCII, no NaN and no infinity."""

import json
import math
from pathlib import Path
from typing import Any

import attrs
import pytest

from wattproof.core.notes import Kind, note
from wattproof.core.quantity import measured
from wattproof.core.reading import Mains, Reading, ReadingSettings, Reference, State
from wattproof.core.wording import sentence
from wattproof.report.reading_document import (
    file_document,
    files_document,
    json_text,
    reading_entry,
    refusal_document,
)
from wattproof.report.source import Source

ENTRY_KEYS = [
    "channel",
    "start_s",
    "seconds",
    "state",
    "notes",
    "fundamental_hz",
    "fundamental_dbfs",
    "level_dbfs",
    "level_vrms",
    "power_w",
    "dc_fs",
    "peak_dbfs",
    "crest_factor",
    "thdn",
    "thd",
    "sinad_db",
    "noise",
    "hum",
    "mains",
    "harmonics",
]


def parsed(document: dict[str, object]) -> dict[str, Any]:
    text = json_text(document)
    assert text.isascii()
    return dict(json.loads(text, parse_constant=pytest.fail))


def test_a_file_has_the_keys_of_the_contract_and_no_other(source: Source, sound_reading: Reading) -> None:
    document = parsed(file_document(source, (sound_reading,)))
    assert list(document) == ["wattproof", "version", "source", "settings", "readings"]
    assert (document["wattproof"], document["version"]) == ("reading", 1)
    assert document["source"] == {
        "file": "tag 31.flac",
        "rate_hz": 48_000,
        "frames": 144_000,
        "channels": 1,
        "sha256": "5e" * 32,
    }
    assert document["settings"] == {
        "band_hz": [20.0, 20_000.0],
        "reference": "total",
        "full_scale_vrms": 40.0,
        "load_ohm": 8.0,
    }
    assert [list(entry) for entry in document["readings"]] == [ENTRY_KEYS]


def test_a_reading_s_span_state_and_plain_ratios_are_as_they_were_read(sound_reading: Reading) -> None:
    entry = parsed(reading_entry(sound_reading))
    assert (entry["channel"], entry["start_s"], entry["seconds"]) == (1, 0.5, 2.0)
    assert (entry["state"], entry["notes"]) == ("ok", [])
    assert entry["fundamental_hz"] == {"value": 997.0, "u": 2e-5, "unit": "Hz"}
    assert entry["level_vrms"] == {"value": 20.0, "u": 4e-4, "unit": "V"}
    assert entry["power_w"] == {"value": 50.0, "u": 2e-3, "unit": "W"}
    assert entry["thdn"] == {"value": 0.01, "u": 1e-5, "unit": "1"}
    assert entry["noise"] == {"value": 1e-4, "u": 1e-6, "unit": "1"}
    assert entry["hum"] == {"value": 0.0, "u": 1e-7, "unit": "1"}
    assert entry["dc_fs"]["value"] == -1.25e-4
    assert entry["crest_factor"]["value"] == 1.42


def test_levels_are_20_lg_of_the_ratio_and_u_follows_the_slope(sound_reading: Reading) -> None:
    entry = parsed(reading_entry(sound_reading))
    # 20 lg 0.5 = -6.0206 dB; d(20 lg x) = 8.685889638 dx/x, closed form
    assert entry["level_dbfs"]["value"] == pytest.approx(-6.020599913, rel=0, abs=1e-9)
    assert entry["level_dbfs"]["u"] == pytest.approx(8.685889638 * 1e-5 / 0.5, rel=1e-9, abs=0)
    assert entry["level_dbfs"]["unit"] == entry["fundamental_dbfs"]["unit"] == "dBFS"
    assert entry["peak_dbfs"] == pytest.approx(-6.020599913, rel=0, abs=1e-9)


def test_sinad_is_what_thdn_to_the_total_is_below(sound_reading: Reading) -> None:
    # SINAD = -THD+N (to total) in dB: (S+N+D)/(N+D)
    sinad = parsed(reading_entry(sound_reading))["sinad_db"]
    assert sinad["value"] == pytest.approx(40.0, rel=0, abs=1e-9)
    assert sinad["u"] == pytest.approx(8.685889638e-3, rel=1e-9, abs=0)
    assert sinad["unit"] == "dB"


def test_sinad_does_not_depend_on_the_reference(sound_reading: Reading) -> None:
    # THD+N_F = THD+N_R / sqrt(1 - THD+N_R^2), closed form
    to_fundamental = attrs.evolve(
        sound_reading,
        settings=attrs.evolve(sound_reading.settings, reference=Reference.FUNDAMENTAL),
        thdn=measured(0.01 / math.sqrt(1 - 1e-4), 1e-5, "1"),
    )
    assert parsed(reading_entry(to_fundamental))["sinad_db"]["value"] == pytest.approx(40.0, rel=0, abs=1e-9)


def test_harmonics_and_mains_lines_carry_their_ratio_phase_and_remark(sound_reading: Reading) -> None:
    entry = parsed(reading_entry(sound_reading))
    assert entry["mains"]["frequency_hz"] == 50.02
    assert entry["mains"]["lines"] == [{"frequency_hz": 100.04, "ratio": {"value": 2e-6, "u": 1e-7, "unit": "1"}}]
    second, third, twentieth = entry["harmonics"]
    assert list(third) == ["order", "frequency_hz", "ratio", "phase_deg", "remark"]
    assert (third["order"], third["frequency_hz"], third["remark"]) == (3, 2991.0, None)
    assert third["phase_deg"] == pytest.approx(180.0, rel=0, abs=1e-9)
    assert (second["remark"], twentieth["remark"]) == ("not seen", "may contain mains")


def test_what_cannot_be_honest_is_null(sound_reading: Reading) -> None:
    overload = Reading(
        span=sound_reading.span,
        channel=2,
        settings=ReadingSettings(),
        state=State.OVERLOAD,
        notes=(note(Kind.OVERLOADED, percent=3.0, longest_frames=9, add_db=6.0),),
    )
    entry = parsed(reading_entry(overload))
    assert list(entry) == ENTRY_KEYS
    assert entry["state"] == "overload"
    assert entry["notes"] == [sentence(overload.notes[0])]
    assert entry["mains"] == {"frequency_hz": None, "lines": []}
    assert entry["harmonics"] == []
    figures = set(ENTRY_KEYS) - {"channel", "start_s", "seconds", "state", "notes", "mains", "harmonics"}
    assert {entry[key] for key in figures} == {None}


@pytest.mark.parametrize(
    ("level", "u"),
    [(0.0, 0.0), (0.0, 1e-9), (5e-324, 1.0)],
    ids=["silence", "silence known to a billionth", "an uncertainty beyond all dB"],
)
def test_a_level_that_has_no_decibels_is_null(sound_reading: Reading, level: float, u: float) -> None:
    silent = attrs.evolve(
        sound_reading,
        level_fs=measured(level, u, "1"),
        fundamental_fs=measured(level, u, "1"),
        thdn=measured(0.0, u, "1"),
        peak_fs=0.0,
    )
    entry = parsed(reading_entry(silent))
    assert [entry[key] for key in ("level_dbfs", "fundamental_dbfs", "sinad_db", "peak_dbfs")] == [None] * 4


def test_a_number_that_json_cannot_hold_is_an_error_and_no_document(source: Source, sound_reading: Reading) -> None:
    broken = attrs.evolve(sound_reading, mains=Mains(math.nan))
    with pytest.raises(ValueError, match="not JSON compliant"):
        json_text(file_document(source, (broken,)))


def test_several_files_stand_in_order_and_a_refused_one_says_why(source: Source, sound_reading: Reading) -> None:
    good = file_document(source, (sound_reading,))
    document = parsed(files_document([refusal_document("gone.wav", "gone.wav: no such file"), good]))
    assert (document["wattproof"], document["version"]) == ("readings", 1)
    assert document["files"][0] == {"source": {"file": "gone.wav"}, "error": "gone.wav: no such file"}
    assert document["files"][1] == parsed(good)


def test_a_single_refused_file_says_what_document_it_is() -> None:
    assert parsed(refusal_document("gone.wav", "gone.wav: no such file")) == {
        "wattproof": "reading",
        "version": 1,
        "source": {"file": "gone.wav"},
        "error": "gone.wav: no such file",
    }


def test_a_file_name_of_any_bytes_comes_out_as_text(source: Source, sound_reading: Reading) -> None:
    name = b"caf\xc3\xa9 \xff\n.wav".decode("utf-8", "surrogateescape")
    document = parsed(file_document(attrs.evolve(source, file=name), (sound_reading,)))
    assert document["source"]["file"] == "café \\xff\n.wav"
    document["source"]["file"].encode()  # no lone surrogate, at which other readers of JSON stop


def test_every_key_of_a_reading_is_documented(sound_reading: Reading) -> None:
    readme = (Path(__file__).parents[2] / "README.md").read_text(encoding="utf-8")
    contract = readme.split("### The JSON document", maxsplit=1)[1]
    entry = parsed(reading_entry(sound_reading))
    named = [*entry, *entry["mains"], *entry["mains"]["lines"][0], *entry["harmonics"][0], *entry["thdn"]]
    assert [key for key in named if f'"{key}"' not in contract and f"`{key}`" not in contract] == []
