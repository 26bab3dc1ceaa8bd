"""The demo recordings and their table are what their maker makes; its closed forms agree with the Fourier integral."""

import math
import subprocess
import sys
from importlib.util import module_from_spec, spec_from_file_location
from pathlib import Path
from types import ModuleType

import mpmath
import numpy as np
import pytest
import soundfile

MAKER = Path(__file__).with_name("make_demo_recordings.py")
FOLDER = Path(__file__).parents[2] / "demo_recordings"


@pytest.fixture(scope="module")
def maker() -> ModuleType:
    spec = spec_from_file_location(MAKER.stem, MAKER)
    assert spec is not None
    assert spec.loader is not None
    module = module_from_spec(spec)
    spec.loader.exec_module(module)
    return module


def test_the_maker_makes_the_recordings_and_the_table_that_are_there(tmp_path: Path) -> None:
    done = subprocess.run(
        [sys.executable, str(MAKER), str(tmp_path)],
        capture_output=True,
        text=True,
        encoding="utf-8",
        check=True,
        timeout=120,
    )
    made = sorted(path.name for path in tmp_path.iterdir())
    assert made == sorted(path.name for path in FOLDER.glob("*.flac"))
    for name in made:
        anew, rate_hz = soundfile.read(tmp_path / name)
        stored, stored_rate_hz = soundfile.read(FOLDER / name)
        assert rate_hz == stored_rate_hz
        # one step of 16 bits: a sine of another C library may round to the other side of a step, in either file
        np.testing.assert_allclose(anew, stored, rtol=0, atol=2.0**-15)
    assert (FOLDER / "README.md").read_text(encoding="utf-8").endswith("\n\n" + done.stdout)


@pytest.mark.parametrize("order", [3, 5, 7, 19])
@pytest.mark.parametrize("angle_deg", [60.0, 85.0])
def test_the_clipped_sine_is_the_fourier_integral_of_one(maker: ModuleType, order: int, angle_deg: float) -> None:
    # b_n = (4/π)·∫ f(x)·sin(nx) dx over a quarter period, by numeric quadrature (mpmath)
    drive = 1.0 / math.sin(math.radians(angle_deg))
    corner = mpmath.mpf(math.radians(angle_deg))

    def coefficient(n: int) -> mpmath.mpf:
        rising = mpmath.quad(lambda x: drive * mpmath.sin(x) * mpmath.sin(n * x), [0, corner])
        return rising + mpmath.quad(lambda x: mpmath.sin(n * x), [corner, mpmath.pi / 2])

    expected = float(coefficient(order) / coefficient(1))
    # quadrature is good to 1e-12 here; harmonics themselves are 1e-4 to 1e-1
    assert maker.clipped(order, angle_deg) == pytest.approx(expected, rel=1e-9, abs=1e-13)


@pytest.mark.parametrize("order", [3, 5, 7, 19])
@pytest.mark.parametrize("share", [0.01, 0.2])
def test_the_dead_zone_is_the_fourier_integral_of_one(maker: ModuleType, order: int, share: float) -> None:
    corner = mpmath.asin(share)

    def coefficient(n: int) -> mpmath.mpf:
        return mpmath.quad(lambda x: (mpmath.sin(x) - share) * mpmath.sin(n * x), [corner, mpmath.pi / 2])

    expected = float(coefficient(order) / coefficient(1))
    assert maker.dead_zone(order, share) == pytest.approx(expected, rel=1e-9, abs=1e-13)


def test_even_harmonics_of_a_symmetric_fault_are_none(maker: ModuleType) -> None:
    assert maker.clipped(2, 60.0) == maker.dead_zone(4, 0.1) == 0.0
