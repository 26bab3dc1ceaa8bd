"""A session's report stands alone, says the statement first, and its numbers are those of the session."""

import html
import html.parser
import json
import re
import zlib
from pathlib import Path
from xml.etree import ElementTree as ET

import attrs
import pytest

from tests.report.power_session import measured_session
from wattproof.core.rounding import rounded
from wattproof.report.page import Drawings, Page
from wattproof.report.page_html import page_html
from wattproof.report.page_pdf import page_pdf
from wattproof.report.power_words import figure
from wattproof.report.session_page import session_page
from wattproof.runner.session_report import session_content
from wattproof.store.recheck import recheck


@pytest.fixture(scope="module")
def session(tmp_path_factory: pytest.TempPathFactory) -> tuple[Path, str]:
    path = tmp_path_factory.mktemp("measured") / "kestrel.wattproof"
    return path, measured_session(path)


@pytest.fixture(scope="module")
def page(session: tuple[Path, str]) -> Page:
    return session_page(session_content(session[0]))


def test_a_measured_session_is_reproduced(session: tuple[Path, str]) -> None:
    outcome = recheck(session[0], session[1], workers=1)
    assert outcome.sound, outcome
    assert outcome.reproduced == outcome.readings > 40


def test_the_statement_comes_first_and_the_hash_with_its_command_last(session: tuple[Path, str], page: Page) -> None:
    titles = [section.title for section in page.sections]
    assert titles[0] == "What it delivers"
    assert titles[-1] == "Evidence"
    text = page_html(page)
    assert f"wattproof recheck kestrel.wattproof --expect {session[1]}" in text


def test_every_point_of_the_statement_is_in_the_table(session: tuple[Path, str]) -> None:
    content = session_content(session[0])
    text = page_html(session_page(content))
    points = [point for run in content.runs for row in run.statement.rows for point in row.points]
    assert len(points) == 6
    for point in points:
        assert point.power_w is not None
        assert html.escape(figure(point.power_w, "W")) in text
        assert rounded(point.power_w)[0][:3] in text


class _Outline(html.parser.HTMLParser):
    """Collects open elements and everything that a page would fetch."""

    def __init__(self) -> None:
        super().__init__()
        self.open: list[str] = []
        self.fetched: list[str] = []

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        if tag not in {"meta", "img", "br", "link"}:
            self.open.append(tag)
        self.fetched += [value or "" for name, value in attrs if name in {"src", "href"}]

    def handle_endtag(self, tag: str) -> None:
        assert self.open.pop() == tag


def test_the_page_is_well_formed_and_fetches_nothing(page: Page) -> None:
    text = page_html(page)
    outline = _Outline()
    outline.feed(text)
    assert outline.open == []
    assert [each[:22] for each in outline.fetched] == ["data:image/png;base64,"]
    assert "<script" not in text
    assert "Kestrel &lt;30&gt; &amp; co" in text
    assert "url(" not in text


def test_every_drawing_is_sound_svg_with_words_for_those_who_cannot_see_it(page: Page) -> None:
    drawings = [
        drawing
        for section in page.sections
        for block in section.blocks
        if isinstance(block, Drawings)
        for drawing in block.drawings
    ]
    assert len(drawings) == 2 + 2 * 6  # wiring, curve; waveform and spectrum of three points into two loads
    for drawing in drawings:
        root = ET.fromstring(drawing.svg)  # noqa: S314 - our own drawing
        names = [child.tag.rpartition("}")[2] for child in root]
        assert names[:2] == ["title", "desc"]
        width, height = (float(each) for each in root.attrib["viewBox"].split()[2:])
        numbers = [(float(x), float(y)) for x, y in re.findall(r"([-\d.]+),([-\d.]+)", drawing.svg)]
        assert all(0.0 <= x <= width and 0.0 <= y <= height for x, y in numbers)
        assert "nan" not in drawing.svg


def test_curves_are_told_apart_without_colour(page: Page) -> None:
    section = next(section for section in page.sections if section.title == "Distortion against power")
    block = section.blocks[0]
    assert isinstance(block, Drawings)
    lines = re.findall(r"<polyline [^>]*>", block.drawings[0].svg)
    assert len({re.findall(r'stroke-dasharray="([^"]*)"', line)[0] for line in lines if "dasharray" in line}) >= 1
    assert any("dasharray" not in line for line in lines)


def _inflated(stream: bytes) -> bytes:
    try:
        return zlib.decompress(stream)
    except zlib.error:  # a font or a picture, coded otherwise
        return b""


@pytest.mark.parametrize(("paper", "box"), [("a4", (595, 842)), ("letter", (612, 792))])
def test_the_document_has_its_paper(page: Page, paper: str, box: tuple[int, int]) -> None:
    content = page_pdf(page, paper)
    assert content.startswith(b"%PDF-1.")
    objects = b"".join(
        _inflated(stream) for stream in re.findall(rb"stream\r?\n(.*?)\r?\nendstream", content, re.DOTALL)
    )
    boxes = re.findall(rb"/MediaBox\s*\[0 0 ([\d.]+) ([\d.]+)\]", content + objects)
    found = [(round(float(wide)), round(float(high))) for wide, high in boxes]
    assert set(found) == {box}  # ISO 216 A4 and ANSI Letter in points of 1/72 inch
    assert 3 <= len(found) <= 8


def test_a_photo_that_cannot_be_decoded_costs_the_photo_only(page: Page) -> None:
    assert page_pdf(attrs.evolve(page, photo=page.photo[:-20])).startswith(b"%PDF-1.")


def test_the_same_content_goes_into_both(page: Page, session: tuple[Path, str]) -> None:
    again = session_page(session_content(session[0]))
    assert json.dumps([section.title for section in page.sections]) == json.dumps(
        [each.title for each in again.sections]
    )
    assert page_html(page) == page_html(again)
