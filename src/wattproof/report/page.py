"""A report as content that a page in HTML and a document in PDF are both set from: sections of simple blocks."""

import attrs


@attrs.frozen
class Paragraph:
    """Running text; `lead` is set larger, `heads` stays with what follows."""

    text: str
    lead: bool = False
    heads: bool = False
    kind: str = "paragraph"


@attrs.frozen
class Items:
    """Sentences, one below the other; `marks` stand before them where given."""

    items: tuple[str, ...]
    marks: tuple[str, ...] = ()
    kind: str = "items"


@attrs.frozen
class Facts:
    """Names and what they are."""

    pairs: tuple[tuple[str, str], ...]
    kind: str = "facts"


@attrs.frozen
class Grid:
    """A table; columns named in `right` are set flush right."""

    columns: tuple[str, ...]
    rows: tuple[tuple[str, ...], ...]
    right: tuple[str, ...] = ()
    kind: str = "grid"


@attrs.frozen
class Drawing:
    """One drawing, SVG, with what stands below it."""

    svg: str
    caption: str


@attrs.frozen
class Drawings:
    """Drawings side by side, at most `across` in a row."""

    drawings: tuple[Drawing, ...]
    across: int = 1
    kind: str = "drawings"


@attrs.frozen
class Code:
    """What is typed or compared letter by letter."""

    text: str
    kind: str = "code"


Block = Paragraph | Items | Facts | Grid | Drawings | Code


@attrs.frozen
class Section:
    """A heading and its blocks."""

    title: str
    blocks: tuple[Block, ...]


@attrs.frozen
class Page:
    """A whole report. `foot` stands at the foot of each page."""

    title: str
    subject: str
    head: tuple[tuple[str, str], ...]
    sections: tuple[Section, ...]
    foot: str
    photo: bytes = b""  # PNG or JPEG

    @property
    def photo_kind(self) -> str:
        """What the photo's file is: png, jpeg, or nothing where it is neither."""
        return "png" if self.photo.startswith(b"\x89PNG") else "jpeg" if self.photo.startswith(b"\xff\xd8") else ""
