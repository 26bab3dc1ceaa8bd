"""Sets a report as a PDF document, from the same content as the page in HTML."""

import json
from importlib import resources

import attrs

from wattproof.report.page import Page
from wattproof.report.typesetting import typeset

PAPERS = {"a4": "a4", "letter": "us-letter"}


def page_pdf(page: Page, paper: str = "a4") -> bytes:
    """Return the document.

    Raises:
        KeyError: neither "a4" nor "letter".
    """
    template = resources.files("wattproof.report").joinpath("templates", "session.typ").read_bytes()
    files = {"main.typ": template}
    if page.photo_kind:
        files["photo"] = page.photo
    content = attrs.asdict(page, filter=lambda field, _: field.name != "photo")
    inputs = {"page": json.dumps(content), "paper": PAPERS[paper], "photo": page.photo_kind.replace("jpeg", "jpg")}
    try:
        return typeset(files, "pdf", inputs)
    except RuntimeError:
        if not page.photo_kind:
            raise
    return typeset(files, "pdf", inputs | {"photo": ""})  # a photo that no decoder takes costs the photo only
