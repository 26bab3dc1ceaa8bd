"""`wattproof read`: distortion, level and noise of recordings, as a table for people or JSON for programs."""

import click

from wattproof.cli.read_output import as_document, as_tables, exit_status, say_refusals, with_progress
from wattproof.cli.read_values import amount, band
from wattproof.cli.read_values import channel as channel_value
from wattproof.core.fields import fields_of
from wattproof.core.reading import ReadingSettings, Reference
from wattproof.runner.read_files import Wanted, read_files

MOST_HZ = 5e6  # half of the highest rate that a recording may have
MOST_S = 1e6  # eleven days
_DECLARED = {field.name: field for field in fields_of(ReadingSettings)}

_EPILOG = """The state of each reading is ok, overload, no tone, unsteady or too short; what can't be stated honestly is
left out. Exit status: 0 all readings ok; 1 some reading is not ok; 2 wrong use or a file that can't be read."""


def _help(field: str, more: str = "") -> str:
    text = _DECLARED[field].help
    return text[0].upper() + text[1:] + more + "."


@click.command(epilog=_EPILOG)
@click.argument("files", metavar="FILE...", nargs=-1, required=True, type=click.UNPROCESSED)
@click.option(
    "--channel",
    metavar="N|all",
    callback=channel_value,
    default="all",
    show_default=True,
    help="Channel to read, from 1.",
)
@click.option(
    "--fundamental",
    "fundamental_hz",
    metavar="HZ",
    callback=amount("Hz", "--fundamental 997", 1e-3, MOST_HZ),
    help="Read the tone of this frequency even where something else is stronger; found by itself without.",
)
@click.option(
    "--band",
    "band_hz",
    metavar="LO-HI",
    callback=band,
    help="Measuring band in Hz, both edges included. Default: 20-20000, or to half the rate of the file.",
)
@click.option(
    "--reference",
    type=click.Choice([reference.value for reference in Reference]),
    default=Reference.TOTAL.value,
    show_default=True,
    help=_help("reference"),
)
@click.option(
    "--full-scale-vrms",
    metavar="V",
    callback=amount("V rms", "--full-scale-vrms 40", 1e-6, 1e6),
    help=_help("full_scale_vrms", "; states levels in volts too"),
)
@click.option(
    "--load",
    "load_ohm",
    metavar="OHM",
    callback=amount("ohm", "--load 8", 1e-3, 1e6),
    help=_help("load_ohm", "; states power too, needs --full-scale-vrms"),
)
@click.option(
    "--start",
    "start_s",
    metavar="S",
    callback=amount("s", "--start 0.5", 0.0, MOST_S),
    default="0",
    show_default=True,
    help="Where in the file to begin, in s.",
)
@click.option(
    "--seconds",
    metavar="S",
    callback=amount("s", "--seconds 2", 1e-3, MOST_S),
    help="How much to read, in s. Default: all, up to 60 s.",
)
@click.option("--json", "as_json", is_flag=True, help="Print one JSON document, for programs.")
def read(  # noqa: PLR0913 - one parameter per option, as click hands them over
    *,
    files: tuple[str, ...],
    channel: int | None,
    fundamental_hz: float | None,
    band_hz: tuple[float, float] | None,
    reference: str,
    full_scale_vrms: float | None,
    load_ohm: float | None,
    start_s: float,
    seconds: float | None,
    as_json: bool,
) -> int:
    """Read the distortion, level, noise and hum of recordings.

    Any format that the system's sound library opens. The steady part of a tone is found by itself.
    """
    if load_ohm is not None and full_scale_vrms is None:
        raise click.UsageError("--load gives a power only where volts are known; add --full-scale-vrms V")
    low_hz, high_hz = band_hz or ReadingSettings().band_hz
    wanted = Wanted(
        settings=ReadingSettings(low_hz, high_hz, Reference(reference), full_scale_vrms, load_ohm),
        band_given=band_hz is not None,
        channel=channel,
        fundamental_hz=fundamental_hz,
        start_s=start_s,
        seconds=seconds,
    )
    outcomes = list(with_progress(read_files(files, wanted), len(files)))
    say_refusals(outcomes)
    text = as_document(outcomes) if as_json else as_tables(outcomes)
    if text:
        click.echo(text)
    return exit_status(outcomes)
