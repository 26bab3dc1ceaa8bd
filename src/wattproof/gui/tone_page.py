"""The page of the tone: frequency, drive, and the drive limit that a person sets; in volts where they are known."""

import attrs

from wattproof.core.units import db, from_db
from wattproof.gui import text
from wattproof.gui.controls import Adjuster, Range
from wattproof.gui.driven import Driven
from wattproof.gui.panel import Hands, Page
from wattproof.gui.stations import Table
from wattproof.gui.theme import Theme
from wattproof.runner.limits import HIGHEST_LIMIT_VRMS

_LOWEST_HZ, _HIGHEST_HZ = 20.0, 20_000.0
_HIGHEST_OF_RATE = 0.45  # a tone is kept this far below the sampling rate: the converter's filter falls from there on
_SOFTEST_DB = -80.0


@attrs.define(eq=False)
class TonePage:
    """What can be set of the tone."""

    frequency: Adjuster
    drive: Adjuster
    limit: Adjuster

    def refresh(self, runner: Driven, table: Table) -> None:
        """Show what is in force."""
        self.frequency.show_value(table.wishes.frequency_hz)
        if table.drive_vrms is None:
            self.drive.show_value(_in_db(table.wishes.level_fs))
            self.limit.show_value(_in_db(runner.limit.fs))
        else:
            self.drive.show_value(table.drive_vrms)
            self.limit.show_value(table.rig.limits.drive_vrms)


def build_tone_page(page: Page, rate_hz: float, hands: Hands, table: Table) -> TonePage:
    """Build the page for a bench that has an output."""
    theme = page.theme
    highest = min(_HIGHEST_HZ, _HIGHEST_OF_RATE * rate_hz)
    frequency = Adjuster(theme, text.FREQUENCY, Range(_LOWEST_HZ, highest, "Hz", 2, log=True))
    frequency.adjusted.connect(hands.wish_frequency)
    scale = table.calibration.output_vrms(table.wiring.output)
    drive, limit = _in_dbfs(theme, hands) if scale is None else _in_volts(theme, hands, scale.value)
    for row in (frequency, drive, limit):
        page.rows.addWidget(row)
    page.add_words(text.LIMIT_HELP if scale is not None else f"{text.LIMIT_IN_DBFS} {text.LIMIT_HELP}")
    page.rows.addStretch(1)
    return TonePage(frequency, drive, limit)


def _in_volts(theme: Theme, hands: Hands, full_vrms: float) -> tuple[Adjuster, Adjuster]:
    drive = Adjuster(theme, text.DRIVE, Range(full_vrms * from_db(_SOFTEST_DB), full_vrms, "V", 4, log=True))
    drive.adjusted.connect(lambda volts: hands.wish_level(min(1.0, volts / full_vrms)))
    limit = Adjuster(theme, text.DRIVE_LIMIT, Range(0.0, HIGHEST_LIMIT_VRMS, "V", 3), slider=False)
    limit.adjusted.connect(hands.set_limit_vrms)
    return drive, limit


def _in_dbfs(theme: Theme, hands: Hands) -> tuple[Adjuster, Adjuster]:
    drive = Adjuster(theme, text.DRIVE, Range(_SOFTEST_DB, 0.0, "dBFS", 1))
    drive.adjusted.connect(lambda level_db: hands.wish_level(from_db(level_db)))
    limit = Adjuster(theme, text.DRIVE_LIMIT, Range(_SOFTEST_DB, 0.0, "dBFS", 1), slider=False)
    limit.adjusted.connect(lambda limit_db: hands.set_limit_fs(from_db(limit_db)))
    return drive, limit


def _in_db(ratio: float) -> float:
    return max(_SOFTEST_DB, db(ratio))
