"""Sets a document with the faces that travel with the program, as PDF or as a picture."""

import tempfile
from collections.abc import Mapping
from pathlib import Path
from typing import Literal

import typst

FONTS = Path(__file__).parents[1] / "gui" / "fonts"
DOTS_PER_INCH = 144.0  # of a picture


def typeset(files: Mapping[str, bytes], kind: Literal["pdf", "png"], inputs: Mapping[str, str] | None = None) -> bytes:
    """Return the document that `main.typ` among the files describes; the others are what it includes.

    Raises:
        RuntimeError: the document is not as the typesetter wants it.
    """
    with tempfile.TemporaryDirectory(prefix="wattproof-") as folder:  # pictures reach the typesetter as files only
        for name, content in files.items():
            Path(folder, name).write_bytes(content)
        found = typst.compile(
            Path(folder, "main.typ"),
            root=Path(folder),
            format=kind,
            ppi=DOTS_PER_INCH,
            font_paths=[FONTS],
            ignore_system_fonts=True,
            sys_inputs=dict(inputs or {}),
        )
    return bytes(found)
