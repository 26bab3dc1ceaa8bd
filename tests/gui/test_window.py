"""The window, driven without a person on a real (virtual) display."""

import re
from typing import TYPE_CHECKING

import attrs
import pytest

from tests.gui.conftest import Frames, settle
from tests.gui.fake_runner import FakeRunner
from wattproof.core.reading import State
from wattproof.core.run import Ending
from wattproof.runner.screen import Ended, Refused, ToneChanged

if TYPE_CHECKING:
    from PySide6.QtCore import Qt
    from PySide6.QtWidgets import QWidget

    from wattproof.gui.readout import Withheld
    from wattproof.gui.tone_page import TonePage
    from wattproof.gui.window import Window

pytestmark = pytest.mark.display
LONG_ENOUGH = 40  # frames: longer than an overload stays and than a sentence stands


def press(widget: "QWidget", key: "Qt.Key") -> None:
    from PySide6.QtTest import QTest  # noqa: PLC0415 - Qt needs the display first

    QTest.keyClick(widget, key)
    settle()


def roll(widget: "QWidget", steps: int) -> None:
    from PySide6.QtCore import QPoint, QPointF, Qt  # noqa: PLC0415 - likewise
    from PySide6.QtGui import QWheelEvent  # noqa: PLC0415
    from PySide6.QtWidgets import QApplication  # noqa: PLC0415

    middle = QPointF(widget.rect().center())
    event = QWheelEvent(
        middle,
        QPointF(widget.mapToGlobal(widget.rect().center())),
        QPoint(),
        QPoint(0, 120 * steps),
        Qt.MouseButton.NoButton,
        Qt.KeyboardModifier.NoModifier,
        Qt.ScrollPhase.NoScrollPhase,
        False,  # noqa: FBT003 - not inverted; by position only
    )
    QApplication.sendEvent(widget, event)
    settle()


def figures(window: "Window") -> list[str]:
    return [
        numeral.text() for numeral in (window.face.thdn, window.face.power, window.face.level, window.face.frequency)
    ]


def tone_page(window: "Window") -> "TonePage":
    assert window.pages.tone is not None
    return window.pages.tone


def withheld(window: "Window") -> "Withheld":
    return window.face.thdn.figure.withheld


def test_it_opens_and_shows_the_reading(window: "Window", runner: FakeRunner, frames: Frames) -> None:
    frames(12)
    reading, _ = runner.read()
    assert reading.thdn is not None
    assert reading.power_w is not None
    assert f"{100 * reading.thdn.value:.3g}" in window.face.thdn.text()
    assert "dB" in window.face.thdn.text()
    assert f"{reading.power_w.value:.3g}" in window.face.power.text()
    assert "997.00 Hz" in window.face.frequency.text()
    assert "±" in window.face.level.text()
    assert window.face.verdict.text().strip()


def test_space_starts_and_stops_the_tone_whatever_has_the_focus(window: "Window", runner: FakeRunner) -> None:
    from PySide6.QtCore import Qt  # noqa: PLC0415 - Qt needs the display first

    window.board.open_station("tone")
    inside = window.centralWidget()
    assert inside is not None
    places = (
        inside,
        tone_page(window).frequency.field,
        tone_page(window).drive.slider,
        window.face.panel.tone,
        window.face.theme_button,
        *window.face.chain.buttons.values(),
    )
    for widget in places:
        before = runner.wishes.tone_on
        widget.setFocus()
        settle()
        press(widget, Qt.Key.Key_Space)
        assert runner.wishes.tone_on is not before, widget
        assert window.face.panel.tone.isChecked() is runner.wishes.tone_on


def test_escape_only_ever_silences(window: "Window", runner: FakeRunner) -> None:
    from PySide6.QtCore import Qt  # noqa: PLC0415 - Qt needs the display first

    for _ in range(2):
        press(window, Qt.Key.Key_Escape)
        assert not runner.wishes.tone_on


def test_wheel_keys_and_slider_turn_the_knob(window: "Window", runner: FakeRunner) -> None:
    from PySide6.QtCore import Qt  # noqa: PLC0415 - Qt needs the display first

    from wattproof.gui.controls import Adjuster  # noqa: PLC0415 - likewise
    from wattproof.gui.stations import Place  # noqa: PLC0415

    def knob() -> float:
        return runner.bench.settings["knob"].value

    start = knob()
    roll(window.face.chain.buttons[Place.AMPLIFIER], 3)
    assert knob() == pytest.approx(start + 3, rel=0, abs=1e-6)
    press(window, Qt.Key.Key_Up)
    assert knob() == pytest.approx(start + 4, rel=0, abs=1e-6)
    press(window, Qt.Key.Key_PageDown)
    assert knob() == pytest.approx(start - 1, rel=0, abs=1e-6)
    adjuster = window.face.panel.adjusters["knob"]
    assert isinstance(adjuster, Adjuster)
    adjuster.slider.setFocus()
    press(adjuster.slider, Qt.Key.Key_End)
    assert knob() == runner.bench.settings["knob"].maximum
    roll(window.face.chain.buttons[Place.LOAD], 3)
    assert knob() == runner.bench.settings["knob"].maximum
    roll(window.face.chain.buttons[Place.AMPLIFIER], 3)  # beyond its end it stays
    assert knob() == runner.bench.settings["knob"].maximum


def test_an_overload_withholds_every_figure_and_blames_the_interface(
    window: "Window", runner: FakeRunner, frames: Frames
) -> None:
    from wattproof.gui.readout import Withheld  # noqa: PLC0415 - Qt needs the display first
    from wattproof.gui.sentence import Mark  # noqa: PLC0415
    from wattproof.gui.stations import Place  # noqa: PLC0415

    frames(LONG_ENOUGH)
    runner.state = State.OVERLOAD
    frames(1)
    for shown in figures(window):
        assert not re.search(r"\d", shown), shown
    assert withheld(window) is Withheld.HATCH
    assert window.face.verdict.text().startswith("The interface is overloaded, not the amplifier")
    assert "attenuation" in window.face.verdict.text()
    assert window.face.verdict.sentence.mark is Mark.OVERLOAD
    assert window.face.residual.picture is None
    capture = window.face.chain.buttons[Place.CAPTURE]
    assert capture.station.hatched
    assert "overloaded" in capture.accessibleName()
    assert "withheld" in window.face.thdn.accessibleDescription()
    assert window.trail.drawn or window.trail.current is not None
    runner.state = None
    frames(3)
    assert withheld(window) is Withheld.HATCH  # it stays long enough to be seen
    frames(LONG_ENOUGH)
    assert withheld(window) is Withheld.NO


def test_only_an_overload_is_hatched(window: "Window", runner: FakeRunner, frames: Frames) -> None:
    from wattproof.gui.readout import Withheld  # noqa: PLC0415 - Qt needs the display first

    for state in State:
        if state in (State.OK, State.OVERLOAD):
            continue
        runner.state = state
        frames(LONG_ENOUGH)
        assert window.face.thdn.figure.withheld is Withheld.DASH, state
        assert not any(button.station.hatched for button in window.face.chain.buttons.values())
        assert not re.search(r"\d", "".join(figures(window))), state
        assert window.face.verdict.text().strip(), state


def test_a_drive_above_the_limit_is_refused_in_words(window: "Window", runner: FakeRunner) -> None:
    window.board.open_station("tone")
    before = runner.wishes
    tone_page(window).drive.field.setValue(1.8)
    settle()
    assert runner.wishes == before
    assert window.face.panel.notice.isVisible()
    assert "above your limit of 1 V" in window.face.panel.notice.text()
    tone_page(window).limit.field.setValue(2.0)
    assert runner.rig.limits.drive_vrms == pytest.approx(2.0, rel=1e-9, abs=0)
    tone_page(window).drive.field.setValue(1.8)
    settle()
    assert runner.wishes.level_fs == pytest.approx(0.9, rel=1e-6, abs=0)
    assert not window.face.panel.notice.isVisible()


def test_frequency_and_load_are_set_from_their_stations(window: "Window", runner: FakeRunner, frames: Frames) -> None:
    from wattproof.gui.controls import Switch  # noqa: PLC0415 - Qt needs the display first

    tone_page(window).frequency.field.setValue(6300.0)
    assert runner.wishes.frequency_hz == 6300.0
    load = window.face.panel.adjusters["load"]
    assert isinstance(load, Switch)
    load.buttons[4.0].click()
    assert runner.bench.settings["load"].value == 4.0
    frames(12)
    assert "4 Ω" in window.face.power.text()
    load.buttons[1e6].click()
    frames(12)
    assert not re.search(r"\d", window.face.power.text())
    assert "nothing connected" in window.face.power.text()


def test_stations_open_by_keys_and_carry_names_and_cautions(window: "Window") -> None:
    from PySide6.QtCore import Qt  # noqa: PLC0415 - Qt needs the display first
    from PySide6.QtWidgets import QLabel  # noqa: PLC0415

    from wattproof.gui.stations import Place  # noqa: PLC0415

    keys = (Qt.Key.Key_1, Qt.Key.Key_2, Qt.Key.Key_3, Qt.Key.Key_4, Qt.Key.Key_5)
    for key, place in zip(keys, Place, strict=True):
        press(window, key)
        assert window.face.chain.buttons[place].chosen
        assert window.face.panel.stack.currentWidget() is window.face.panel.scrolls[place]
        assert window.face.chain.buttons[place].accessibleName()
    button = window.face.chain.buttons[Place.LOAD]
    button.setFocus()
    press(button, Qt.Key.Key_Return)
    assert button.chosen

    def words(place: Place) -> str:
        return " ".join(label.text() for label in window.face.panel.pages[place].findChildren(QLabel))

    assert "licensed practice" in words(Place.AMPLIFIER)
    assert "local codes" in words(Place.AMPLIFIER)
    assert "no terminal is ground" in words(Place.AMPLIFIER)
    assert "no terminal is ground" in words(Place.ATTENUATOR)
    assert "hot" in words(Place.LOAD)


def test_everything_that_can_be_pressed_is_in_reach_of_the_keys(window: "Window") -> None:
    from PySide6.QtCore import Qt  # noqa: PLC0415 - Qt needs the display first
    from PySide6.QtWidgets import QAbstractButton, QAbstractSlider, QAbstractSpinBox, QScrollBar  # noqa: PLC0415

    for kind in (QAbstractButton, QAbstractSlider, QAbstractSpinBox):
        for widget in window.findChildren(kind):
            if isinstance(widget, QScrollBar):
                continue
            assert widget.focusPolicy() & Qt.FocusPolicy.TabFocus, widget
            assert widget.accessibleName(), widget


def test_a_change_by_the_program_and_the_ending_are_told(window: "Window", runner: FakeRunner, frames: Frames) -> None:
    frames(6)
    runner.screen.tell(ToneChanged(on=False, frequency_hz=997.0, level_fs=0.0, why="power 55 W is above the limit"))
    window.tick()
    assert "above the limit" in window.face.panel.notice.text()
    runner.screen.tell(Ended(Ending.FAILED, "the device is gone"))
    for _ in range(6):
        window.tick()
    assert "the device is gone" in window.face.verdict.text()
    assert not re.search(r"\d", "".join(figures(window)))
    frames(12)  # a new run has begun
    assert re.search(r"\d", window.face.thdn.text())


def test_a_reading_that_is_too_old_is_not_shown(window: "Window", frames: Frames) -> None:
    frames(6)
    for _ in range(70):
        window.tick()
    assert not re.search(r"\d", window.face.thdn.text())
    assert "Nothing comes from the bench" in window.face.verdict.text()


def test_a_refused_block_lifts_the_pen(window: "Window", runner: FakeRunner, frames: Frames) -> None:
    from wattproof.core.notes import Kind, note  # noqa: PLC0415 - beside what it is for

    frames(3)
    runner.screen.tell(Refused(note(Kind.GAP, at_s=1.0, why="a witness")))
    window.tick()
    assert window.trail.current is not None
    assert window.trail.current.x[-1] != window.trail.current.x[-1]  # NaN


def test_closing_stops_the_runner(window: "Window", runner: FakeRunner) -> None:
    window.close()
    assert runner.stops == 1
    assert not window.timer.isActive()


def test_a_bench_without_outputs_offers_no_tone(application: object) -> None:
    from wattproof.gui.stations import Place  # noqa: PLC0415 - Qt needs the display first
    from wattproof.gui.theme import Choice, Theme  # noqa: PLC0415
    from wattproof.gui.window import Window  # noqa: PLC0415

    assert application is not None
    runner = FakeRunner()
    runner.bench.identity = attrs.evolve(runner.bench.identity, outputs=0)
    runner.bench.settings.clear()
    window = Window(runner, Theme(Choice.LIGHT))
    window.timer.stop()
    window.show()
    settle()
    assert not window.face.panel.tone.isVisible()
    assert window.pages.tone is None
    assert window.face.chain.buttons[Place.TONE].station.figure == "recorded"
    before = runner.wishes
    window.board.press()
    assert runner.wishes == before
    window.close()
    window.deleteLater()
    settle()


def test_the_whole_window_is_painted_in_both_themes_at_every_size(window: "Window", frames: Frames) -> None:
    from wattproof.gui.theme import DARK, LIGHT, Choice  # noqa: PLC0415 - Qt needs the display first

    for choice, palette in ((Choice.DARK, DARK), (Choice.LIGHT, LIGHT)):
        window.theme.choose(choice)
        for width, height in ((1920, 1080), (1280, 720), (1024, 640)):
            window.resize(width, height)
            frames(2)
            image = window.grab().toImage()
            assert (image.width(), image.height()) == (width, height)
            assert image.pixelColor(2, height - 2).name() == palette.ground
            ink = sum(
                image.pixelColor(x, y).name() == palette.ink
                for x in range(0, width // 3, 2)
                for y in range(height // 6, height // 3, 2)
            )
            assert ink > 200  # the digits of THD+N
