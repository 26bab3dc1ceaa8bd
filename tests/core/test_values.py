"""Values are frozen and slotted, and a wrong one cannot be built: the refusal names the field and the reason."""

import importlib
import inspect
import math
from collections.abc import Callable
from typing import Any

import attrs
import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from tests.house.sources import PACKAGE, dotted, modules
from wattproof.core.calibration import Floor, Scale
from wattproof.core.loopback import Response
from wattproof.core.notes import Kind, note
from wattproof.core.quantity import Part, Quantity, measured
from wattproof.core.reading import Reading, ReadingSettings, Reference, State
from wattproof.core.rig import Attenuator, Limits, Load, Rig, Wiring
from wattproof.core.run import Ending, Run
from wattproof.core.signal import Capture, Gap, Overload, Span, Tone

_ONE = Quantity(1.0, "V")
_HERE = Span(0, 100, 48_000.0)


def _attrs_classes() -> list[type[Any]]:
    found = []
    for path in modules(PACKAGE / "core"):
        module = importlib.import_module(dotted(path))
        members = inspect.getmembers(module, inspect.isclass)
        found += [kind for _, kind in members if attrs.has(kind) and kind.__module__ == module.__name__]
    return found


@pytest.mark.parametrize("kind", _attrs_classes(), ids=lambda kind: kind.__name__)
def test_every_value_is_frozen_and_slotted(kind: type[Any]) -> None:
    blank: object = object.__new__(kind)
    assert not hasattr(blank, "__dict__")
    with pytest.raises(attrs.exceptions.FrozenInstanceError):
        setattr(blank, attrs.fields(kind)[0].name, 0)


_WRONG: list[tuple[Callable[[], object], str]] = [
    (lambda: Tone(0.0, 0.5), r"Tone\.frequency_hz is 0\.0; it must be above zero"),
    (lambda: Tone(math.nan, 0.5), r"Tone\.frequency_hz is nan"),
    (lambda: Tone(997.0, 1.01), r"Tone\.level_fs is 1\.01; it must lie from 0 to 1"),
    (lambda: Tone(997.0, math.nan), r"Tone\.level_fs is nan"),
    (lambda: Tone(997.0, 0.5, (0,)), r"Tone\.outputs is \(0,\); channels count from 1"),
    (lambda: Tone(997.0, 0.5, (2, 2)), r"Tone\.outputs is \(2, 2\); channels count from 1, each once"),
    (lambda: Span(0, -1, 48_000.0), r"Span\.frames is -1; it must be zero or above"),
    (lambda: Span(0, 1, 0.0), r"Span\.rate_hz is 0\.0; it must be above zero"),
    (lambda: Gap(0, -1, "flag"), r"Gap\.frames is -1"),
    (lambda: Overload(0, 0, 1), r"Overload\.channel is 0; it counts from 1"),
    (lambda: Overload(1, 0, 0), r"Overload\.frames is 0; it must be above zero"),
    (lambda: Capture(np.zeros(8), 48_000.0), r"Capture\.samples has shape \(8,\).*\(frames, channels\)"),
    (lambda: Capture(np.zeros((8, 1), np.float32), 48_000.0), r"Capture\.samples has .* float32; .* float64"),
    (lambda: Capture(np.zeros((8, 1)), -1.0), r"Capture\.rate_hz is -1\.0"),
    (lambda: Quantity(math.nan, "V"), r"Quantity\.value is nan; it must be a finite number"),
    (lambda: Part("statistics", math.inf), r"Part\.u is inf; it must be a finite number"),
    (lambda: Scale(0, _ONE, "typed", "2024-05-01"), r"Scale\.socket is 0; it counts from 1"),
    (lambda: Floor(1, -0.1, _ONE), r"Floor\.level_fs is -0\.1; it must be zero or above"),
    (lambda: Response(np.zeros(2), np.zeros(3, complex)), r"Response\.frequency_hz and gain differ in length"),
    (lambda: ReadingSettings(low_hz=200.0, high_hz=100.0), "the band 200-100 Hz is reversed or empty; give LO-HI"),
    (lambda: ReadingSettings(low_hz=-1.0), r"ReadingSettings\.low_hz is -1\.0"),
    (lambda: ReadingSettings(high_hz=math.inf), r"ReadingSettings\.high_hz is inf"),
    (lambda: ReadingSettings(load_ohm=8.0), "a load without a full-scale voltage gives no power"),
    (lambda: ReadingSettings(full_scale_vrms=-1.0), r"ReadingSettings\.full_scale_vrms is -1\.0"),
    (lambda: ReadingSettings(full_scale_vrms=1.0, load_ohm=math.nan), r"ReadingSettings\.load_ohm is nan"),
    (lambda: Load(measured_ohm=0.0), r"Load\.measured_ohm is 0\.0; it must be above zero"),
    (lambda: Limits(power_w=math.inf), r"Limits\.power_w is inf"),
    (lambda: Reading(span=_HERE, channel=0, settings=ReadingSettings(), state=State.OK), r"Reading\.channel is 0"),
    (lambda: Load(nominal_ohm=0.0), r"load is 0 Ω; it must lie from 0\.1"),
    (lambda: Attenuator(ratio=0.5), "attenuator is 0.5 ÷; it must lie from 1 to 100000 ÷"),
    (lambda: Wiring(input=0), r"^capture input is 0; it must be at least 1$"),
    (lambda: Limits(drive_vrms=51.0), "drive limit is 51 V rms; it must lie from 0 to 50 V rms"),
    (lambda: Rig(wirings=()), r"Rig\.wirings is empty"),
    (
        lambda: Rig(wirings=(Wiring(), Wiring(output=2))),
        r"Rig\.wirings use inputs \[1, 1\]; each channel needs an input",
    ),
    (lambda: Run(procedure="watch", rig=Rig(), ending=Ending.FAILED), r"Run\.why is empty; a failed run says why"),
]


@pytest.mark.parametrize(("build", "says"), _WRONG, ids=[says for _, says in _WRONG])
def test_a_wrong_value_is_refused_by_name_and_reason(build: Callable[[], object], says: str) -> None:
    with pytest.raises(ValueError, match=says):
        build()


@given(st.floats().filter(lambda level: not 0.0 <= level <= 1.0))
def test_no_tone_is_above_full_scale_or_negative(level_fs: float) -> None:
    with pytest.raises(ValueError, match=r"Tone\.level_fs"):
        Tone(997.0, level_fs)


@given(st.floats(1e-3, 1e6), st.floats(0.0, 1.0), st.sets(st.integers(1, 64)))
def test_every_fair_tone_can_be_built(frequency_hz: float, level_fs: float, outputs: set[int]) -> None:
    tone = Tone(frequency_hz, level_fs, tuple(outputs))
    assert (tone.frequency_hz, tone.level_fs) == (frequency_hz, level_fs)


@given(st.integers(0, 2**53), st.integers(0, 2**31), st.sampled_from([44_100.0, 48_000.0, 96_000.0, 192_000.0]))
def test_a_span_ends_where_the_next_begins(first_frame: int, frames: int, rate_hz: float) -> None:
    span = Span(first_frame, frames, rate_hz)
    assert span.end_frame == first_frame + frames
    assert span.seconds * rate_hz == pytest.approx(frames, rel=1e-12, abs=0.0)  # one division and one product
    assert span.start_s * rate_hz == pytest.approx(first_frame, rel=1e-12, abs=0.0)


def test_a_capture_knows_its_span() -> None:
    capture = Capture(np.zeros((480, 2)), 48_000.0, first_frame=96_000)
    assert (capture.frames, capture.channels) == (480, 2)
    assert capture.span == Span(96_000, 480, 48_000.0)


def test_a_measured_load_is_reckoned_with_before_its_nominal_value() -> None:
    assert Load(8.0).ohm == 8.0
    assert Load(8.0, measured_ohm=7.93).ohm == 7.93


def test_a_runs_settings_cannot_be_changed_afterwards() -> None:
    given_settings = {"frequency_hz": 997.0}
    run = Run(procedure="watch", settings=given_settings, rig=Rig())
    given_settings["frequency_hz"] = 1.0
    assert run.settings["frequency_hz"] == 997.0
    with pytest.raises(TypeError):
        run.settings["frequency_hz"] = 1.0  # type: ignore[index] # the wrong write is what is tested


def _reading(thdn: Quantity | None, reference: Reference) -> Reading:
    return Reading(span=_HERE, channel=1, settings=ReadingSettings(reference=reference), state=State.OK, thdn=thdn)


@pytest.mark.parametrize(
    ("reference", "thdn", "sinad"),
    # closed forms: total over residual is 1/THD+N to the total, √(1 + 1/THD+N²) with THD+N to the fundamental
    [
        (Reference.TOTAL, 0.01, 100.0),
        (Reference.FUNDAMENTAL, 0.75, 5.0 / 3.0),
        (Reference.FUNDAMENTAL, 1.0, math.sqrt(2.0)),
    ],
)
def test_sinad_is_total_over_residual_whatever_the_reference(reference: Reference, thdn: float, sinad: float) -> None:
    got = _reading(measured(thdn, 1e-6 * thdn, "1"), reference).sinad
    assert got is not None
    assert got.value == pytest.approx(sinad, rel=1e-12, abs=0.0)
    step = 1e-6
    more = _reading(measured(thdn * (1 + step), 0.0, "1"), reference).sinad
    assert more is not None
    # first order: the change of SINAD for a change of THD+N by its u; second-order terms are 1e-6 of it
    assert got.u == pytest.approx(abs(more.value - got.value), rel=1e-5, abs=0.0)


def test_there_is_no_sinad_without_thdn() -> None:
    assert _reading(None, Reference.TOTAL).sinad is None
    assert _reading(measured(0.0, 0.0, "1"), Reference.TOTAL).sinad is None


def test_a_note_keeps_its_values_by_name_and_in_order() -> None:
    assert note(Kind.LEVEL_STEP, at_s=1.0, db=-3.0).values == (("at_s", 1.0), ("db", -3.0))
