"""`wattproof report`: a session as a page in HTML or a document in PDF."""

from pathlib import Path

import click

from wattproof.cli.errors import OK
from wattproof.core.errors import WrongUseError
from wattproof.report.characters import printable
from wattproof.report.session_page import session_page
from wattproof.runner.session_report import session_content

_KINDS = (".html", ".pdf")


@click.command(epilog="Exit status: 0 written; 2 wrong use.")
@click.argument("session")
@click.option(
    "--to", "file", metavar="FILE", required=True, help="Where to write it; its end, .html or .pdf, says as what."
)
@click.option(
    "--paper", type=click.Choice(["a4", "letter"]), default="a4", show_default=True, help="Size of the sheet."
)
def report(*, session: str, file: str, paper: str) -> int:
    """Write the report of a session: statement first, then conditions, wiring, curves, calibration, evidence.

    Both kinds hold the same and need no network. The hash in it is what `wattproof recheck --expect` takes.
    """
    target = Path(file)
    if target.suffix.lower() not in _KINDS:
        raise WrongUseError(f"--to {printable(file)}: give a name that ends in .html or .pdf")
    page = session_page(session_content(Path(session)))
    try:
        if target.suffix.lower() == ".html":
            from wattproof.report.page_html import page_html  # noqa: PLC0415 - only what is written loads

            target.write_text(page_html(page, paper), encoding="utf-8")
        else:
            from wattproof.report.page_pdf import page_pdf  # noqa: PLC0415 - likewise

            target.write_bytes(page_pdf(page, paper))
    except OSError as error:
        raise WrongUseError(
            f"{printable(file)}: it cannot be written ({error.strerror or error}); give another place"
        ) from error
    click.echo(f"written: {printable(file)}")
    return OK
