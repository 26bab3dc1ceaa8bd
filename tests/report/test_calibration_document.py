"""The calibration as a document and as lines: every figure, budgets whole, nothing that JSON cannot say."""

import json

from tests.store.test_calibration_file import CALIBRATION
from wattproof.core.calibration import Calibration
from wattproof.report.calibration_document import calibration_document, calibration_lines
from wattproof.report.reading_document import json_text


def test_the_document_is_json_with_every_budget() -> None:
    document = json.loads(json_text(calibration_document(CALIBRATION, "x.toml")))
    assert (document["wattproof"], document["version"], document["file"]) == ("calibration", 1, "x.toml")
    scale = document["scales"][0]["full_scale_vrms"]
    assert scale["parts"] == [{"source": "level calibration meter", "u": 0.005, "dof": 12.0}]
    assert document["scales"][1]["full_scale_vrms"]["parts"][0]["dof"] is None  # infinite
    loop = document["loops"][0]
    assert loop["latency_frames"] == 1536.25
    assert loop["crosstalk"] is None
    assert len(loop["response"]["gain_db"]) == 3
    assert loop["noise"][0]["tone_dbfs"] is None  # silence
    assert document["floors"][0]["harmonics"][0]["order"] == 2


def test_the_lines_say_what_was_found() -> None:
    told = "\n".join(calibration_lines(CALIBRATION))
    assert "Calibration of ALSA/interface, 96 kHz, 24 bit, 2026-01-02" in told
    assert "Input 2: full scale is 2.000 ± 0.011 V rms, measured" in told  # t for 12 degrees of freedom is 2.18
    assert "pad 20.00 dB" in told
    assert "noise -114.0 dBFS in silence" in told
    assert "50 Hz -120 dBFS" in told


def test_without_scales_they_say_how_to_get_them() -> None:
    assert "levels stay in dBFS" in "\n".join(calibration_lines(Calibration(device="x")))
