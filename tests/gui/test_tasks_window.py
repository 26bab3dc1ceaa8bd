"""The other tasks in the window: the list, planner, rig, devices, calibration, and how a lost bench is opened again."""

import time
from collections.abc import Callable
from pathlib import Path
from typing import TYPE_CHECKING

import pytest

from tests.gui.conftest import Frames, settle
from tests.gui.fake_runner import FakeRunner
from wattproof.core.audio_device import Device
from wattproof.core.calibration import Calibration
from wattproof.core.run import Ending
from wattproof.runner.screen import Ended, Refused
from wattproof.store.rig_file import read_rig

if TYPE_CHECKING:
    from wattproof.gui.window import Window

pytestmark = pytest.mark.display
PATIENCE_S = 100.0


def wait_until(true: Callable[[], bool], step: Callable[[], None] = lambda: None) -> None:
    deadline = time.monotonic() + PATIENCE_S
    while not true():
        assert time.monotonic() < deadline
        step()
        settle()
        time.sleep(0.01)


def test_the_planner_draws_a_circuit_and_says_what_is_wrong(window: "Window") -> None:
    from wattproof.gui.form import Entry  # noqa: PLC0415 - Qt needs the display first
    from wattproof.gui.planner_page import PlannerPage  # noqa: PLC0415

    window.board.open_task("planner")
    settle()
    page = window.face.panel.stack.currentWidget().findChild(PlannerPage)  # type: ignore[union-attr]  # a page is open
    assert isinstance(page, PlannerPage)
    assert page.sheet.isVisible()
    assert not window.face.trail.isVisible()
    assert page.sheet.picture.isVisible()
    assert "neither output terminal is ground" in page.sheet.text.text()
    power = page.form.widgets["power_w"]
    assert isinstance(power, Entry)
    power.setText("0")
    power.changed.emit()
    settle()
    assert not page.sheet.picture.isVisible()
    assert "power is 0" in page.sheet.text.text().lower()
    window.board.open_task("watch")
    assert window.face.trail.isVisible()


def test_a_rig_is_checked_as_it_is_typed_and_stored(
    window: "Window", monkeypatch: pytest.MonkeyPatch, tmp_path: Path
) -> None:
    from wattproof.gui import rig_page  # noqa: PLC0415 - Qt needs the display first
    from wattproof.gui.form import Entry  # noqa: PLC0415

    monkeypatch.setattr(rig_page, "rig_folder", lambda: tmp_path)
    window.board.open_task("rig")
    page = window.face.panel.stack.currentWidget().findChild(rig_page.RigPage)  # type: ignore[union-attr]  # likewise
    assert isinstance(page, rig_page.RigPage)
    name = page.rig.widgets["name"] if page.rig is not None else None
    load = page.channels[0].load.widgets["measured_ohm"]
    assert isinstance(name, Entry)
    assert isinstance(load, Entry)
    name.setText("bench two")
    load.setText("eight")
    window.board.press()
    assert 'Measured load is "eight"' in window.face.panel.notice.text()
    assert not list(tmp_path.iterdir())
    load.setText("7.96")
    window.board.press()
    assert not window.face.panel.notice.isVisible()
    files = list(tmp_path.iterdir())
    assert [read_rig(file).wirings[0].load.measured_ohm for file in files] == [7.96]
    assert str(files[0]) in page.sheet.text.text()


def test_devices_are_listed_and_the_chosen_one_is_opened_by_name() -> None:
    from wattproof.gui.device_page import DevicePage  # noqa: PLC0415 - Qt needs the display first
    from wattproof.gui.theme import Choice, Theme  # noqa: PLC0415

    opened: list[str] = []
    there = [Device("JACK", "loopback", 2, 2, 48_000.0, (48_000.0, 96_000.0))]
    page = DevicePage(Theme(Choice.LIGHT), lambda: tuple(there), opened.append)
    page.look()
    wait_until(lambda: bool(page.entries), page.poll)
    assert list(page.entries) == ["simulated", "JACK/loopback"]
    page.entries["JACK/loopback"].click()
    assert "48, 96 kHz" in page.sheet.text.text()
    page.start()
    assert opened == ["JACK/loopback rate=48000"]
    there.append(Device("ALSA", "hw:1", 2, 2, 44_100.0, ()))  # plugged in later
    page.look()
    wait_until(lambda: "ALSA/hw:1" in page.entries, page.poll)
    assert page.chosen == "JACK/loopback"


@pytest.mark.usefixtures("application")
def test_a_lost_bench_is_told_counted_and_opened_again_with_its_trail(
    window: "Window", runner: FakeRunner, frames: Frames, monkeypatch: pytest.MonkeyPatch
) -> None:
    from wattproof.core.errors import WrongUseError  # noqa: PLC0415 - beside what it is for
    from wattproof.core.notes import Kind, note  # noqa: PLC0415
    from wattproof.gui import reopening  # noqa: PLC0415

    frames(8)
    for second in (1.0, 2.0):
        runner.screen.tell(Refused(note(Kind.GAP, at_s=second, why="a witness")))
    runner.screen.tell(Ended(Ending.FAILED, "the device is gone"))
    for _ in range(6):
        window.tick()
    assert "2 blocks refused" in window.face.foot.text()
    assert "the device is gone" in window.face.verdict.text()
    assert window.face.panel.tone.text() == "Reconnect"
    answers: list[WrongUseError | FakeRunner] = [WrongUseError("there is no such device; plug it in"), FakeRunner()]

    def open_again(named: str) -> FakeRunner:
        assert named == runner.bench.identity.name
        answer = answers.pop(0)
        if isinstance(answer, WrongUseError):
            raise answer
        return answer

    monkeypatch.setattr(window, "_reopening", reopening.Reopening(runner, open_again))
    got: list[object] = []
    window.replaced.connect(got.append)
    window.board.press()
    wait_until(lambda: "plug it in" in window.face.panel.notice.text(), window.tick)
    assert not got
    window.board.press()
    wait_until(lambda: bool(got), window.tick)
    assert isinstance(got[0], FakeRunner)


def test_the_simulated_bench_is_calibrated_step_by_step(
    application: object, monkeypatch: pytest.MonkeyPatch, tmp_path: Path
) -> None:
    from PySide6.QtCore import Qt  # noqa: PLC0415 - Qt needs the display first
    from PySide6.QtTest import QTest  # noqa: PLC0415

    from wattproof.app import make_watch_runner, open_bench  # noqa: PLC0415 - beside what it is for
    from wattproof.gui import calibration_desk  # noqa: PLC0415
    from wattproof.gui.form import Entry  # noqa: PLC0415
    from wattproof.gui.theme import Choice, Theme  # noqa: PLC0415
    from wattproof.gui.window import Window  # noqa: PLC0415

    assert application is not None
    monkeypatch.setattr(calibration_desk, "calibration_folder", lambda: tmp_path)
    runner = make_watch_runner(open_bench("simulated", pace="free"))
    window = Window(runner, Theme(Choice.LIGHT))
    window.timer.stop()
    window.show()
    desk = window.board.runs[0]
    assert isinstance(desk, calibration_desk.CalibrationDesk)
    card = window.face.panel.card
    window.board.open_task("calibrate")
    for name, typed in (("sweep_s", "1"), ("block_s", "0.25"), ("most_blocks", "1")):
        entry = desk.plan.widgets[name]
        assert isinstance(entry, Entry)
        entry.setText(typed)
    window.board.press()
    asked: list[str] = []
    while desk.running:
        wait_until(lambda: desk.asked is not None or not desk.running, window.tick)
        if desk.asked is not None:
            asked.append(str(desk.asked.ask.want))
            assert desk.sheet.picture.isVisible()
            QTest.keyClick(card.main, Qt.Key.Key_Return)
    assert asked == ["direct", "meter", "meter", "pad", "amplifier"]
    assert desk.sheet.words.text() == "Calibrated"
    assert isinstance(desk.record, Calibration)
    assert [scale.socket for scale in desk.record.inputs] == [1, 2]
    assert len(list(tmp_path.iterdir())) == 1
    window.board.open_task("watch")
    assert runner.running
    window.close()
    window.deleteLater()
    runner.close()
    settle()
