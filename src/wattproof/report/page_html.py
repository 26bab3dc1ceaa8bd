"""Sets a report as one HTML page that needs nothing else: no network, no script, drawings inside."""

import base64
from importlib import resources

import jinja2

from wattproof.report.page import Page


def page_html(page: Page, paper: str = "a4") -> str:
    """Return the page; `paper` ("a4" or "letter") counts when it is printed."""
    environment = jinja2.Environment(
        autoescape=True, trim_blocks=True, lstrip_blocks=True, undefined=jinja2.StrictUndefined
    )
    template = resources.files("wattproof.report").joinpath("templates", "session.html").read_text(encoding="utf-8")
    photo = base64.b64encode(page.photo).decode() if page.photo_kind else ""
    return environment.from_string(template).render(page=page, photo=photo, paper={"letter": "letter"}.get(paper, "A4"))
