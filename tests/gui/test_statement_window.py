"""The guided power statement in the window, on the simulated bench: only keys and clicks, as a person has them."""

import time
from collections.abc import Callable, Iterator
from typing import TYPE_CHECKING

import pytest

from tests.gui.conftest import settle
from wattproof.app import make_watch_runner, open_bench
from wattproof.bench.simulated.truth import Truth
from wattproof.core.run import Ending
from wattproof.runner.watching import WatchRunner

if TYPE_CHECKING:
    from PySide6.QtCore import Qt

    from wattproof.gui.window import Window

pytestmark = pytest.mark.display
PATIENCE_S = 120.0  # nothing is judged by it: it only ends a test that hangs
FRAME_S = 0.05


@pytest.fixture
def bench_runner() -> Iterator[WatchRunner]:
    runner = make_watch_runner(open_bench("simulated:class-d-bridge", pace="free"))
    yield runner
    runner.close()


@pytest.fixture
def desk_window(application: object, bench_runner: WatchRunner) -> "Iterator[Window]":
    """Return a window whose timer rests: the test lets the frames pass, so that the run's thread has its share."""
    from PySide6.QtTest import QTest  # noqa: PLC0415 - only once there is a display

    from wattproof.gui.theme import Choice, Theme  # noqa: PLC0415 - likewise
    from wattproof.gui.window import Window  # noqa: PLC0415 - likewise

    assert application is not None
    shown = Window(bench_runner, Theme(Choice.LIGHT))
    shown.timer.stop()
    shown.resize(1280, 720)
    shown.show()
    shown.activateWindow()
    QTest.qWaitForWindowActive(shown)
    yield shown
    shown.close()
    shown.deleteLater()
    settle()


def press(window: "Window", key: "Qt.Key") -> None:
    """Press a key where the focus is, as a keyboard does."""
    from PySide6.QtTest import QTest  # noqa: PLC0415 - Qt needs the display first
    from PySide6.QtWidgets import QApplication  # noqa: PLC0415

    QTest.keyClick(QApplication.focusWidget() or window, key)
    settle()


def watch(window: "Window", until: Callable[[], bool]) -> None:
    """Let frames pass until something shows."""
    deadline = time.monotonic() + PATIENCE_S
    while not until():
        assert time.monotonic() < deadline, f"{window.face.verdict.text()} / {window.face.panel.notice.text()}"
        window.tick()
        settle()
        time.sleep(FRAME_S)


def to_setup(window: "Window") -> None:
    from PySide6.QtCore import Qt  # noqa: PLC0415 - Qt needs the display first

    press(window, Qt.Key.Key_M)
    press(window, Qt.Key.Key_Tab)  # the list opens on "Watch"; the next one is the statement
    press(window, Qt.Key.Key_Return)
    assert window.face.panel.head.text() == "Power statement"


def no_hold(window: "Window") -> None:
    next(button for value, button in window.desk.setup.hold.buttons if value == 0.0).click()


def asked(window: "Window", words: str) -> Callable[[], bool]:
    card = window.face.panel.card
    return lambda: not card.isHidden() and words in card.words.text()


def test_by_hand_from_the_list_to_the_sentence(desk_window: "Window", bench_runner: WatchRunner) -> None:
    from PySide6.QtCore import Qt  # noqa: PLC0415 - Qt needs the display first
    from PySide6.QtTest import QTest  # noqa: PLC0415

    window, desk, card = desk_window, desk_window.desk, desk_window.face.panel.card
    to_setup(window)
    supply = next(control for control in bench_runner.bench.controls if control.name == "supply")
    QTest.keyClicks(desk.setup.supply, f"{supply.value:g}")
    QTest.keyClicks(desk.setup.claimed, "50")
    no_hold(window)
    window.face.setFocus()
    press(window, Qt.Key.Key_Space)
    watch(window, asked(window, "all the way down"))
    assert not desk.sounding
    assert card.main.text() == "Turn it down"
    press(window, Qt.Key.Key_Return)
    watch(window, asked(window, "up, slowly"))
    assert desk.sounding
    assert card.knob is not None
    assert card.knob.isVisible()
    press(window, Qt.Key.Key_Return)  # "Let it be turned"
    watch(window, asked(window, "Hands off"))
    assert "muted" in window.face.verdict.text()
    assert "10 % THD+N passed" in window.face.verdict.text()
    watch(window, asked(window, "down again"))
    press(window, Qt.Key.Key_Return)
    watch(window, lambda: desk.run is not None and desk.run.settled)
    run = desk.run
    assert run is not None
    assert run.ended is not None
    assert run.ended.ending is Ending.DONE, run.ended.why
    window.tick()
    window.show_digits(words_too=True)
    truth = Truth("class-d-bridge", supply_v=supply.value)
    stated = run.stated(0)
    assert stated is not None
    points = {point.at: point for point in stated.points}
    for name, thdn in (("1 %", 0.01), ("10 %", 0.10)):
        volts = points[name].voltage_vrms
        assert volts is not None
        # 0.02 dB, or the own 2u: what is asked of hand strokes up to 6 dB/s
        assert volts.value == pytest.approx(truth.vrms_at_thdn(thdn), rel=0.0023, abs=2.0 * volts.u)
    assert [mark.name for mark in desk.trail.marks] == ["onset", "1 %", "10 %"]
    assert desk.trail.beside, "the stroke up is still to be seen beside the one down"
    assert "Power at 1 %" in window.face.thdn.text()
    assert "W" in window.face.power.text()
    assert "the box says 50 W" in desk.page.words.text()
    assert "momentary" in desk.page.table.text()
    assert "flatters" in desk.page.remarks.text()
    press(window, Qt.Key.Key_Space)
    assert window.face.panel.tone.text() == "Start the measurement"


def test_by_steps_asks_for_the_load_in_silence(desk_window: "Window", bench_runner: WatchRunner) -> None:
    from PySide6.QtCore import Qt  # noqa: PLC0415 - Qt needs the display first

    window, desk, card = desk_window, desk_window.desk, desk_window.face.panel.card
    to_setup(window)
    desk.setup.how.buttons[1][1].click()
    desk.setup.loads.buttons[-1][1].click()
    no_hold(window)
    press(window, Qt.Key.Key_Space)
    watch(window, asked(window, "full up"))
    press(window, Qt.Key.Key_Return)
    watch(window, asked(window, "Switch the load to 4"))
    assert not desk.sounding
    assert "It waits for you, in silence" in window.face.verdict.text()
    assert card.main.text() == "Switch to 4 Ω"
    assert card.main.hasFocus()
    assert len(desk.page.table.rows) == 2
    assert all(cell.found for cell in desk.page.table.rows[0].cells)
    press(window, Qt.Key.Key_Return)
    watch(window, lambda: desk.trail.earlier is not None and desk.sounding)
    load = next(control for control in bench_runner.bench.controls if control.name == "load")
    assert load.value == 4.0
    press(window, Qt.Key.Key_Escape)
    watch(window, lambda: desk.run is not None and desk.run.settled)
    assert not desk.sounding
    assert desk.run is not None
    assert desk.run.ended is not None
    assert desk.run.ended.ending is Ending.STOPPED
    window.show_digits(words_too=True)
    assert "Stopped: the tone is silent" in window.face.verdict.text()
    assert "Into 8.0 Ω" in desk.page.words.text()  # what was measured stays stated


def test_a_measurement_is_not_left_by_accident_and_the_watch_comes_back(
    desk_window: "Window", bench_runner: WatchRunner
) -> None:
    from PySide6.QtCore import Qt  # noqa: PLC0415 - Qt needs the display first

    window, desk = desk_window, desk_window.desk
    to_setup(window)
    press(window, Qt.Key.Key_Space)
    watch(window, asked(window, "all the way down"))
    press(window, Qt.Key.Key_M)
    assert "Stop it first" in window.face.panel.notice.text()
    window.board.open_station("load")
    assert window.face.panel.head.text() == "Power statement"
    press(window, Qt.Key.Key_Escape)
    watch(window, lambda: not desk.running)
    window.board.open_station("load")
    assert window.face.panel.head.text() == "Watch"
    assert bench_runner.running
    assert not bench_runner.wishes.tone_on
    watch(window, lambda: window.reading is not None)


def test_a_setting_that_does_not_fit_is_said_and_the_watch_goes_on(
    desk_window: "Window", bench_runner: WatchRunner
) -> None:
    from PySide6.QtCore import Qt  # noqa: PLC0415 - Qt needs the display first
    from PySide6.QtTest import QTest  # noqa: PLC0415

    window, desk = desk_window, desk_window.desk
    to_setup(window)
    QTest.keyClicks(desk.setup.supply, "fifteen")
    window.face.setFocus()
    press(window, Qt.Key.Key_Space)
    assert 'Supply is "fifteen"; give a number' in window.face.panel.notice.text()
    assert desk.run is None
    assert bench_runner.running


def test_a_closed_window_silences_the_measurement(desk_window: "Window") -> None:
    from PySide6.QtCore import Qt  # noqa: PLC0415 - Qt needs the display first

    window, desk = desk_window, desk_window.desk
    to_setup(window)
    press(window, Qt.Key.Key_Space)
    watch(window, asked(window, "all the way down"))
    press(window, Qt.Key.Key_Return)
    watch(window, lambda: desk.sounding)
    window.close()
    assert desk.run is not None
    assert desk.run.measurement.runner.muted
    assert not desk.run.measurement.runner.running
