"""The palettes can be read: contrast by WCAG 2.2."""

import pytest

from wattproof.gui.theme import DARK, LIGHT, Palette


def luminance(color: str) -> float:
    """Return the relative luminance of "#rrggbb" (WCAG 2.2, definition of relative luminance)."""
    channels = [int(color[i : i + 2], 16) / 255 for i in (1, 3, 5)]
    linear = [c / 12.92 if c <= 0.04045 else ((c + 0.055) / 1.055) ** 2.4 for c in channels]
    return 0.2126 * linear[0] + 0.7152 * linear[1] + 0.0722 * linear[2]


def contrast(one: str, other: str) -> float:
    light, dark = sorted((luminance(one), luminance(other)), reverse=True)
    return (light + 0.05) / (dark + 0.05)


@pytest.mark.parametrize("palette", [LIGHT, DARK])
def test_text_stands_out_from_ground_and_paper(palette: Palette) -> None:
    for ground in (palette.ground, palette.paper):
        assert contrast(palette.ink, ground) >= 7.0  # WCAG 2.2, 1.4.6
        assert contrast(palette.soft, ground) >= 4.5  # WCAG 2.2, 1.4.3
        assert contrast(palette.blue, ground) >= 4.5
    assert contrast(palette.ink, palette.warn_paper) >= 7.0


@pytest.mark.parametrize("palette", [LIGHT, DARK])
def test_shapes_stand_out(palette: Palette) -> None:
    assert contrast(palette.warn, palette.warn_paper) >= 3.0  # WCAG 2.2, 1.4.11
    assert contrast(palette.warn, palette.ground) >= 3.0
