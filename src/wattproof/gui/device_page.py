"""The list of devices: looked for in a thread of its own, one chosen by host API and name, then opened in its place."""

from collections.abc import Callable
from html import escape

from PySide6.QtCore import QTimer

from wattproof.core.audio_device import Device
from wattproof.core.device_advice import advice_on
from wattproof.core.errors import WattproofError, WrongUseError
from wattproof.gui import task_text
from wattproof.gui.background import Background
from wattproof.gui.controls import FlatButton
from wattproof.gui.form import Choices
from wattproof.gui.panel import Page
from wattproof.gui.sheet import PaperSheet
from wattproof.gui.task_list import EntryButton
from wattproof.gui.theme import Theme
from wattproof.report.device_document import NONE_THERE, rates_words

_POLL_MS = 100
SIMULATED = "simulated"


class DevicePage(Page):
    """What can be measured with. `chosen` is the bench in words, as the command line takes it."""

    def __init__(self, theme: Theme, look: Callable[[], tuple[Device, ...]], open_bench: Callable[[str], None]) -> None:
        super().__init__(theme)
        self.sheet = PaperSheet(theme)
        self._look, self._open_bench = look, open_bench
        self._job: Background[tuple[Device, ...]] | None = None
        self.devices: tuple[Device, ...] = ()
        self.entries: dict[str, EntryButton] = {}
        self.chosen = ""
        self.rate: Choices | None = None
        self.again = FlatButton(theme, task_text.LOOK_AGAIN)
        self.again.clicked.connect(lambda _=False: self.look())
        self.rows.addWidget(self.again)
        self._timer = QTimer(self)
        self._timer.setInterval(_POLL_MS)
        self._timer.timeout.connect(self.poll)

    def look(self) -> None:
        """Look for devices anew; what was plugged in since is found."""
        if self._job is None:
            self._job = Background(self._look, "wattproof-devices")
            self.sheet.show_text(task_text.LOOKING)
            self._timer.start()

    def poll(self) -> None:
        """Take the list once it is there."""
        job = self._job
        if job is None or not job.done:
            return
        self._job = None
        self._timer.stop()
        try:
            self.devices = job.take()
        except WattproofError as error:
            self.devices = ()
            self._fill()
            self.sheet.show_text(escape(str(error)))
            return
        self._fill()
        self.choose(self.chosen if self.chosen in self.entries else next(iter(self.entries)))

    def start(self) -> None:
        """Open what is chosen.

        Raises:
            WrongUseError: nothing is chosen.
        """
        if not self.chosen:
            raise WrongUseError(task_text.NOTHING_CHOSEN)
        rate_hz = None if self.rate is None else self.rate.value
        self._open_bench(self.chosen if rate_hz is None else f"{self.chosen} rate={rate_hz:g}")

    def choose(self, choice: str) -> None:
        """Choose a device and show what is known of it."""
        self.chosen = choice
        for each, button in self.entries.items():
            button.setChecked(each == choice)
        device = next((each for each in self.devices if each.choice == choice), None)
        if self.rate is not None:
            self.rate.setParent(None)
            self.rate = None
        if device is None:
            self.sheet.show_text(
                task_text.SIMULATED_SHEET if self.devices else f"{task_text.SIMULATED_SHEET}<p>{NONE_THERE}</p>"
            )
            return
        if device.rates_hz:
            rates: list[tuple[object, str]] = [(rate, f"{rate / 1000:g} k") for rate in device.rates_hz]
            self.rate = Choices(self.theme, task_text.RATE, rates)
            self.rate.choose(device.default_rate_hz if device.default_rate_hz in device.rates_hz else rates[0][0])
            self.rows.insertWidget(self.rows.count() - 1, self.rate)
        self.sheet.show_text(device_words(device))

    def _fill(self) -> None:
        while self.rows.count() > 1:
            item = self.rows.takeAt(1)
            widget = None if item is None else item.widget()
            if widget is not None:
                widget.setParent(None)
        self.entries = {SIMULATED: EntryButton(self.theme, task_text.SIMULATED_BENCH, task_text.SIMULATED_ABOUT)}
        for device in self.devices:
            self.entries[device.choice] = EntryButton(self.theme, device.name, device.host_api)
        for choice, button in self.entries.items():
            button.clicked.connect(lambda _=False, at=choice: self.choose(at))
            self.rows.addWidget(button)
        self.rows.addStretch(1)


def device_words(device: Device) -> str:
    """Return what is known of a device, as rich text."""
    advice = advice_on(device)
    tried = "" if advice.tried else task_text.NOT_TRIED
    lines = (
        f"<h2>{escape(device.name)}</h2>",
        f"<p>{escape(device.host_api)} · {device.inputs} in, {device.outputs} out</p>",
        f"<p>{escape(_sentence(rates_words(device)))}</p>",
        f"<p><b>{escape(_sentence(advice.trust.value))}</b> {escape(_sentence(advice.between + tried))}</p>",
        f"<p>{escape(_sentence(advice.choose))}</p>",
    )
    return "".join(lines)


def _sentence(words: str) -> str:
    """Return words as a sentence; nothing but the first letter changes."""
    return f"{words[:1].upper()}{words[1:]}."
