"""Readings of a recording as a table for people: a head for the file, a block for each channel."""

import io
from collections.abc import Iterator, Sequence
from decimal import Decimal

from rich.console import Console, Group, RenderableType
from rich.padding import Padding
from rich.table import Table
from rich.text import Text

from wattproof.core.quantity import Quantity
from wattproof.core.reading import Harmonic, Reading, Reference, Remark, State
from wattproof.core.rounding import rounded
from wattproof.core.units import db
from wattproof.core.wording import sentence
from wattproof.report.characters import in_ascii, printable
from wattproof.report.decibels import in_db
from wattproof.report.source import Source

_MOST_DIGITS = 6  # of a figure; a finer uncertainty is then said to be less than the last digit
_FINEST_DB_PLACE = -2  # likewise for the dB beside a figure
_INDENT = 2
_STYLES = {State.OK: "bold green"}
_NOT_OK = "bold red"

Row = tuple[str, str, str, str, str]  # what, figure, its unit, ± of it, the same in dB or a remark


def reading_table(
    source: Source, readings: Sequence[Reading], *, width: int = 80, colour: bool = False, ascii_only: bool = False
) -> str:
    """Return the table of one recording, lines of at most `width` columns, without a line end at its end.

    ± is at 95 %. Quantities come rounded to their uncertainty. With `ascii_only` the trade's signs are spelt out.
    """
    blocks: list[RenderableType] = list(_head(source, readings, ascii_only=ascii_only))
    for reading in readings:
        blocks += ["", *_block(reading, width, ascii_only=ascii_only)]
    page = io.StringIO()
    console = Console(
        file=page,
        width=width,
        force_terminal=colour,
        color_system="standard" if colour else None,
        highlight=False,
        markup=False,
        emoji=False,
        legacy_windows=False,
    )
    console.print(Group(*blocks))
    return "\n".join(line.rstrip() for line in page.getvalue().splitlines())


def _head(source: Source, readings: Sequence[Reading], *, ascii_only: bool) -> Iterator[Text]:
    settings = readings[0].settings
    to = "total in the band" if settings.reference is Reference.TOTAL else "fundamental"
    channels = "1 channel" if source.channels == 1 else f"{source.channels} channels"
    seconds = source.frames / source.rate_hz
    yield _text(printable(source.file), ascii_only=ascii_only, style="bold")
    yield _text(
        f"{source.rate_hz / 1e3:g} kHz, {channels}, {seconds:.3f} s\n"
        f"Band {_hz(settings.low_hz)} to {_hz(settings.high_hz)}; ratios to the {to}",
        ascii_only=ascii_only,
    )
    if settings.full_scale_vrms is not None:
        load = "" if settings.load_ohm is None else f"; the load is {settings.load_ohm:g} Ω"
        yield _text(f"0 dBFS is {settings.full_scale_vrms:g} V rms{load}", ascii_only=ascii_only)
    yield _text("± at 95 %, from the spread within this recording alone", ascii_only=ascii_only)


def _block(reading: Reading, width: int, *, ascii_only: bool) -> Iterator[RenderableType]:
    span = reading.span
    title = _text(f"Channel {reading.channel}: ", ascii_only=ascii_only, style="bold")
    title.append(reading.state.value, _STYLES.get(reading.state, _NOT_OK))
    title.append(f", {span.start_s:.3f} s to {span.start_s + span.seconds:.3f} s")
    yield title
    yield _indented(_grid(_rows(reading), ascii_only=ascii_only))
    seen = [harmonic for harmonic in reading.harmonics if harmonic.remark is not Remark.NOT_SEEN]
    if seen:
        yield _indented(_harmonics(seen, width - _INDENT, ascii_only=ascii_only))
    if reading.notes:
        yield _indented(_notes(reading, ascii_only=ascii_only))


def _indented(block: RenderableType) -> RenderableType:
    return Padding(block, (0, 0, 0, _INDENT))


def _rows(reading: Reading) -> Iterator[Row]:
    yield from _row("Fundamental", reading.fundamental_hz, reading.fundamental_fs, "dBFS")
    level = in_db(reading.level_fs, "dBFS")
    yield from _row("Level", reading.level_vrms or level, reading.level_fs if reading.level_vrms else None, "dBFS")
    yield from _row("Power", reading.power_w)
    yield from _ratio("THD+N", reading.thdn)
    yield from _ratio("THD", reading.thd)
    yield from _ratio("Noise", reading.noise)
    yield from _hum(reading)
    yield from _row("SINAD", in_db(reading.sinad, "dB"))
    yield from _row("Crest factor", reading.crest_factor)
    if reading.peak_fs:
        yield "Peak", _minus(f"{db(reading.peak_fs):.2f}"), "dBFS", "", ""
    yield from _row("DC", None if reading.dc_fs is None else reading.dc_fs.scaled(100.0, "% FS"))


def _ratio(name: str, ratio: Quantity | None) -> Iterator[Row]:
    if ratio is not None:
        yield from _row(name, ratio.scaled(100.0, "%"), ratio, "dB")


def _row(name: str, quantity: Quantity | None, ratio: Quantity | None = None, db_unit: str = "") -> Iterator[Row]:
    """Yield the row of a quantity that is there; `ratio` is what to state in dB beside it."""
    if quantity is None:
        return
    value, spread = _figure(quantity)
    level = in_db(ratio, db_unit)
    beside = "" if level is None else f"{_figure(level, _FINEST_DB_PLACE)[0]} {db_unit}"
    yield name, value, "" if quantity.unit == "1" else quantity.unit, spread, beside


def _hum(reading: Reading) -> Iterator[Row]:
    mains = reading.mains
    if reading.hum is not None and reading.hum.value == 0.0 and mains.frequency_hz is None:
        yield "Hum", "none seen", "", "", ""
        return
    yield from _ratio("Hum", reading.hum)
    if mains.frequency_hz is not None:
        lines = "1 line" if len(mains.lines) == 1 else f"{len(mains.lines)} lines"
        yield "  mains", f"{mains.frequency_hz:.2f}", "Hz", "", lines


def _figure(quantity: Quantity, finest_place: int | None = None) -> tuple[str, str]:
    """Return value and ± as text, both cut to what a person can take in, or to `finest_place` (a power of ten)."""
    value, spread = rounded(quantity)
    number = Decimal(value)
    finest = number.adjusted() - _MOST_DIGITS + 1 if finest_place is None else finest_place
    exponent = number.as_tuple().exponent
    if isinstance(exponent, int) and exponent < finest <= 0:
        value, spread = f"{round(number, -finest):f}", f"< {Decimal(1).scaleb(finest):f}" if spread != "0" else "0"
    return _minus(value), "" if spread == "0" else f"± {spread}"


def _minus(number: str) -> str:
    return number.replace("-", "−")


def _grid(rows: Iterator[Row], *, ascii_only: bool) -> Table:
    grid = Table.grid(padding=(0, 1, 0, 0))
    grid.add_column(min_width=13)
    grid.add_column(justify="right", min_width=10, no_wrap=True)
    grid.add_column(min_width=5, no_wrap=True)
    grid.add_column(min_width=14, no_wrap=True)
    grid.add_column(no_wrap=True)
    for row in rows:
        grid.add_row(*(_text(cell, ascii_only=ascii_only) for cell in row))
    return grid


def _notes(reading: Reading, *, ascii_only: bool) -> Table:
    grid = Table.grid(padding=(0, 1, 0, 0))
    for note in reading.notes:
        grid.add_row("Note:", _text(sentence(note), ascii_only=ascii_only))
    return grid


def _harmonics(harmonics: Sequence[Harmonic], width: int, *, ascii_only: bool) -> RenderableType:
    doubtful = any(harmonic.remark is Remark.MAY_CONTAIN_MAINS for harmonic in harmonics)
    rows = [_harmonic_cells(harmonic) for harmonic in harmonics]
    widest = sum(max(map(len, column)) + 1 for column in zip(*rows, strict=True))
    abreast = max(1, width // widest)
    grid = Table.grid(*[""] * 3 * abreast, padding=(0, 1, 0, 0))
    cells = [_text(cell, ascii_only=ascii_only) for row in rows for cell in row]
    for first in range(0, len(cells), 3 * abreast):
        grid.add_row(*cells[first : first + 3 * abreast])
    head = "Harmonics seen, to the fundamental" + "; * may contain mains" * doubtful
    return Group(_text(head, ascii_only=ascii_only), grid)


def _harmonic_cells(harmonic: Harmonic) -> tuple[str, str, str]:
    mark = "*" if harmonic.remark is Remark.MAY_CONTAIN_MAINS else ""
    level = in_db(harmonic.ratio, "dB")
    percent = f"{_minus(_significant(100.0 * harmonic.ratio.value))} %"
    return f"H{harmonic.order}{mark}", percent, "" if level is None else _minus(f"{level.value:.1f} dB  ")


def _significant(number: float) -> str:
    """Return a number with three digits and without a power of ten."""
    rounded_once = Decimal(f"{number:.2e}")  # so that 0.9999 counts as 1.00
    places = min(max(0, 2 - rounded_once.adjusted()), 9) if number else 0
    return f"{rounded_once:.{places}f}"


def _hz(frequency_hz: float) -> str:
    return f"{frequency_hz / 1e3:g} kHz" if frequency_hz >= 1e3 else f"{frequency_hz:g} Hz"


def _text(text: str, *, ascii_only: bool, style: str = "") -> Text:
    return Text(in_ascii(text) if ascii_only else text, style)
