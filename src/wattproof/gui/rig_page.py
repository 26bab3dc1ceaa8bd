"""The rig's form: what is wired on each channel and the limits, checked as it is typed and stored as TOML."""

from html import escape
from typing import Any

import attrs

from wattproof.app import rig_folder
from wattproof.core.errors import WattproofError, WrongUseError
from wattproof.core.rig import Attenuator, Limits, Load, Rig, Wiring
from wattproof.gui import task_text
from wattproof.gui.form import Choices, Form, built
from wattproof.gui.panel import Page
from wattproof.gui.sheet import PaperSheet
from wattproof.gui.theme import Theme
from wattproof.store.record_file import file_name
from wattproof.store.rig_file import read_rig, rig_text, write_rig

_RIG, _WIRING = ("name", "interface", "note"), ("name", "output", "input", "bridge_tied", "drive_path")


class _ChannelForms:
    """The forms of one amplifier channel."""

    def __init__(self, theme: Theme, wiring: Wiring) -> None:
        self.wiring = Form(theme, Wiring, only=_WIRING, values=_plain(wiring))
        self.load = Form(theme, Load, values=_plain(wiring.load))
        self.attenuator = Form(theme, Attenuator, values=_plain(wiring.attenuator))

    @property
    def forms(self) -> tuple[Form, Form, Form]:
        """All of them, in order."""
        return self.wiring, self.load, self.attenuator

    def value(self) -> Wiring:
        """Build the wiring."""
        load, attenuator = built(Load, self.load.values()), built(Attenuator, self.attenuator.values())
        return built(Wiring, self.wiring.values() | {"load": load, "attenuator": attenuator})


class RigPage(Page):
    """Edits one rig. The sheet shows the file as it will be written, or the one line that says what is wrong."""

    def __init__(self, theme: Theme, rig: Rig) -> None:
        super().__init__(theme)
        self.sheet = PaperSheet(theme)
        self.stored = Choices(theme, task_text.STORED_RIGS, [])
        self.rows.addWidget(self.stored)
        self.rig: Form | None = None
        self.show_rig(rig)

    def show_rig(self, rig: Rig) -> None:
        """Show a rig in the form."""
        while self.rows.count() > 1:
            item = self.rows.takeAt(1)
            widget = None if item is None else item.widget()
            if widget is not None:
                widget.setParent(None)
        theme = self.theme
        self.rig = Form(theme, Rig, only=_RIG, values=_plain(rig))
        self.limits = Form(theme, Limits, values=_plain(rig.limits))
        self.channels = [_ChannelForms(theme, wiring) for wiring in rig.wirings]
        names = [(index, wiring.name) for index, wiring in enumerate(rig.wirings)]
        self.which = Choices(theme, task_text.CHANNELS, names)
        self.which.changed.connect(self._show_channel)
        forms = [form for channel in self.channels for form in channel.forms]
        self.rows.addWidget(self.rig)
        self.rows.addWidget(self.which)
        for form in forms:
            self.rows.addWidget(form)
        self.rows.addWidget(self.limits)
        self.rows.addStretch(1)
        for form in (self.rig, self.limits, *forms):
            form.changed.connect(self.refresh)
        self._show_channel()
        self.refresh()

    def value(self) -> Rig:
        """Build the rig.

        Raises:
            WrongUseError: something typed does not fit; the line names it.
        """
        if self.rig is None:
            raise WrongUseError(task_text.NOTHING_CHOSEN)
        values: dict[str, Any] = self.rig.values()
        values["wirings"] = tuple(channel.value() for channel in self.channels)
        return built(Rig, values | {"limits": built(Limits, self.limits.values())})

    def start(self) -> None:
        """Store it.

        Raises:
            WrongUseError: something typed does not fit, or the file cannot be written; nothing is overwritten then.
        """
        rig = self.value()
        path = rig_folder() / file_name(rig.name)
        write_rig(path, rig)
        read_rig(path)
        self.refresh()
        self.sheet.show_text(f"<p>{escape(task_text.STORED.format(path=path))}</p>{self.sheet.text.text()}")

    def opened(self) -> None:
        """List what is stored."""
        names = sorted(each.stem for each in rig_folder().glob("*.toml")) if rig_folder().is_dir() else []
        self.rows.removeWidget(self.stored)
        self.stored.setParent(None)
        self.stored = Choices(self.theme, task_text.STORED_RIGS, [(name, name) for name in names])
        self.stored.setVisible(bool(names))
        self.stored.choose(None)
        self.stored.changed.connect(self._take_stored)
        self.rows.insertWidget(0, self.stored)
        self.refresh()

    def refresh(self) -> None:
        """Show the file as it will be, or why there is none."""
        try:
            words = f"<pre>{escape(rig_text(self.value()))}</pre>"
        except WrongUseError as error:
            words = f"<p>▲ {escape(str(error))}</p>"
        self.sheet.show_text(words)

    def _take_stored(self) -> None:
        try:
            self.show_rig(read_rig(rig_folder() / f"{self.stored.value}.toml"))
        except WattproofError as error:
            self.sheet.show_text(f"<p>▲ {escape(str(error))}</p>")

    def _show_channel(self) -> None:
        for index, channel in enumerate(self.channels):
            for form in channel.forms:
                form.setVisible(index == self.which.value)


def _plain(value: Any) -> dict[str, object]:  # noqa: ANN401 - any of the rig's parts
    return {field.name: getattr(value, field.name) for field in attrs.fields(type(value))}
