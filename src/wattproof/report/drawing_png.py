"""A drawing as a picture of pixels, for programs that take no SVG."""

from wattproof.report.typesetting import typeset

_SHEET = b'#set page(width: auto, height: auto, margin: 0pt)\n#set text(font: "Inter")\n#image("drawing.svg")\n'


def drawing_png(svg: str) -> bytes:
    """Return a PNG of a drawing."""
    return typeset({"main.typ": _SHEET, "drawing.svg": svg.encode()}, "png")
