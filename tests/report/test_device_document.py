"""The list of devices as a document that programs rely on and as a table that people read."""

import json

from wattproof.core.audio_device import Device
from wattproof.report.device_document import CHOOSING, NONE_THERE, device_document, device_lines
from wattproof.report.reading_document import json_text

JACK = Device("JACK Audio Connection Kit", "loopback", 2, 2, 96_000.0, (96_000.0,))
BUSY = Device("ALSA", "Bö\nx (hw:1,0)", 8, 8, 48_000.0, ())
MUTE = Device("MME", "Mapper", 2, 0, 44_100.0)


def test_the_document_holds_what_its_contract_names() -> None:
    document = json.loads(json_text(device_document([JACK, BUSY, MUTE])))
    assert (document["wattproof"], document["version"]) == ("devices", 1)
    first, second, third = document["devices"]
    assert set(first) == {
        "choice", "host_api", "name", "inputs", "outputs", "default_rate_hz", "rates_hz", "trust", "between", "choose",
        "tried",
    }  # fmt: skip
    assert first["choice"] == "JACK Audio Connection Kit/loopback"
    assert (first["rates_hz"], second["rates_hz"], third["rates_hz"]) == ([96_000.0], [], None)
    assert (first["trust"], second["trust"], third["trust"]) == ("direct", "direct", "converted")
    assert (first["tried"], second["tried"]) == (True, False)


def test_the_table_says_what_opens_what_lies_between_and_what_to_choose() -> None:
    lines = device_lines([JACK, BUSY, MUTE])
    assert lines[0] == "JACK Audio Connection Kit/loopback"
    assert lines[1] == "  2 in, 2 out; opens at 96 kHz"
    assert any("another program may hold it" in line for line in lines)
    assert any("did not answer in time" in line for line in lines)
    assert sum("not tried by the makers" in line for line in lines) == 2
    assert all("\n" not in line for line in lines)
    assert lines[-1] == CHOOSING


def test_no_device_at_all_says_where_to_look() -> None:
    assert device_lines([]) == [NONE_THERE]
