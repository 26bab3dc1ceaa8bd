"""Starting and ending the child, and what is said where there is no PortAudio or one that hangs; no server needed."""

import json
import subprocess
import sys
import threading
from pathlib import Path

import numpy as np
import pytest

from wattproof.bench.portaudio import layout, marker
from wattproof.bench.portaudio.bench import PortaudioBench
from wattproof.bench.portaudio.devices import list_devices
from wattproof.bench.portaudio.naming import Entry, NamingError, choose
from wattproof.bench.protocol import Bench
from wattproof.core.errors import BenchLostError, WrongUseError
from wattproof.core.signal import Tone


def put_in_place_of_sounddevice(monkeypatch: pytest.MonkeyPatch, folder: Path, text: str) -> None:
    (folder / "sounddevice.py").write_text(text, encoding="utf-8")
    monkeypatch.syspath_prepend(folder)


def test_without_portaudio_one_line_names_the_package(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    put_in_place_of_sounddevice(monkeypatch, tmp_path, "raise OSError('PortAudio library not found')")
    with pytest.raises(WrongUseError, match="apt-get install libportaudio2"):
        list_devices()
    with pytest.raises(WrongUseError, match="apt-get install libportaudio2"):
        PortaudioBench("JACK/loopback").open()


def test_a_sound_system_that_hangs_is_given_up(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    put_in_place_of_sounddevice(monkeypatch, tmp_path, "import time\ntime.sleep(60)")
    with pytest.raises(BenchLostError, match="within 1 s"):
        list_devices(deadline_s=1.0)


def test_a_sound_system_that_fails_is_said(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    put_in_place_of_sounddevice(monkeypatch, tmp_path, "raise RuntimeError('no memory')")
    with pytest.raises(BenchLostError, match="RuntimeError: no memory"):
        list_devices()
    with pytest.raises(BenchLostError, match="RuntimeError: no memory"):
        PortaudioBench("JACK/loopback").open()


def test_a_bench_that_is_not_open_says_so_and_stays_closed() -> None:
    bench: Bench = PortaudioBench("JACK/loopback", inputs=1)
    assert (bench.identity.name, bench.identity.inputs, bench.identity.real) == ("JACK/loopback", 1, True)
    assert bench.calibration.input_vrms(1) is None
    assert bench.controls == ()
    with pytest.raises(WrongUseError, match="no control 'volume'"):
        bench.turn("volume", 1.0)
    with pytest.raises(BenchLostError, match="not open"):
        bench.play(Tone(997.0, 0.1))
    with pytest.raises(BenchLostError, match="not open"):
        bench.capture(0, 10, threading.Event())
    bench.mute()
    bench.release()
    bench.close()


def test_the_child_imports_nothing_heavy() -> None:
    program = "import wattproof.bench.portaudio.child, sys, json; print(json.dumps(sorted(sys.modules)))"
    listed = subprocess.run([sys.executable, "-c", program], capture_output=True, text=True, check=True)
    modules = json.loads(listed.stdout)
    ours = [name for name in modules if name.startswith("wattproof.")]
    allowed = {"bench", "bench.portaudio"} | {
        f"bench.portaudio.{name}" for name in ("channels", "child", "engine", "layout", "naming", "rates", "synth")
    }
    assert set(ours) == {f"wattproof.{name}" for name in allowed}
    assert not {"attrs", "scipy", "sounddevice", "PySide6"} & set(modules)


def test_the_parent_never_imports_portaudio() -> None:
    program = (
        "import wattproof.bench.portaudio.bench, wattproof.bench.portaudio.devices, sys;"
        "sys.exit('sounddevice' in sys.modules)"
    )
    assert subprocess.run([sys.executable, "-c", program], check=False).returncode == 0


@pytest.mark.parametrize("rate_hz", [44_100, 48_000, 96_000, 192_000])
def test_the_ring_holds_five_seconds_whatever_the_rate(rate_hz: int) -> None:
    shape = layout.shape_for(rate_hz, 2, 2)
    assert shape.ring_frames - shape.ring_frames // layout.MARGIN >= 5 * rate_hz


def test_names_of_memory_are_short_enough_for_every_system() -> None:
    memory = layout.create(layout.Shape(64, 1, 1))
    memory.unlink()
    name = memory.name
    memory.release()
    assert len(f"/{name.lstrip('/')}") <= 30  # macOS: 31 with the closing zero (XNU, PSHMNAMLEN)


def entry(host_api: str, name: str, inputs: int = 2, outputs: int = 2) -> Entry:
    return Entry(host_api=host_api, name=name, inputs=inputs, outputs=outputs, default_rate_hz=48_000.0)


DEVICES = [
    entry("ALSA", "Box: USB Audio (hw:1,0)"),
    entry("JACK Audio Connection Kit", "loopback"),
    entry("JACK Audio Connection Kit", "loopback too"),
    entry("Windows WASAPI", "Line (Box)", 2, 0),
    entry("Windows WASAPI", "Line (Box)", 0, 2),
    entry("Windows WASAPI", "Speakers", 0, 2),
]


@pytest.mark.parametrize(
    ("text", "places"),
    [
        ("JACK/loopback", (1, 1)),
        ("jack audio connection kit/LOOPBACK", (1, 1)),
        ("JACK/too", (2, 2)),
        ("ALSA/hw:1,0", (0, 0)),
        ("WASAPI/Line (Box)", (3, 4)),
    ],
)
def test_a_device_is_chosen_by_host_api_and_name(text: str, places: tuple[int, int]) -> None:
    assert choose(DEVICES, text) == places


@pytest.mark.parametrize(
    ("text", "words"),
    [
        ("loopback", "HOST/NAME"),
        ("JACK/", "HOST/NAME"),
        ("JACK/loop", "may be any of: loopback, loopback too"),
        ("JACK/Box", "no device .* there are: ALSA/Box"),
        ("WASAPI/Speakers", "has no inputs"),
        ("1/loopback", "no device"),
    ],
)
def test_a_name_that_fits_none_or_several_is_refused(text: str, words: str) -> None:
    with pytest.raises(NamingError, match=words):
        choose(DEVICES, text)


@pytest.mark.parametrize("rate_hz", [44_100, 96_000, 192_000])
def test_the_marker_is_found_in_noise_upside_down_and_filtered(rate_hz: int) -> None:
    wave = marker.waveform(rate_hz)
    noise = np.random.default_rng(1).normal(0.0, 0.001, rate_hz // 2)
    captured = noise.copy()
    captured[12_345 : 12_345 + len(wave)] -= 0.01 * wave  # 17 dB above the noise
    assert marker.find(captured, wave) == 12_345
    assert marker.find(noise, wave) is None
    assert marker.find(np.zeros(rate_hz // 2), wave) is None
    assert len(wave) <= layout.MARKER_FRAMES
