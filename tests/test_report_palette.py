"""The palette as numbers: text and lines stand out in light and dark, curves differ for every kind of eye.

Contrast: W3C, Web Content Accessibility Guidelines 2.1, 1.4.3 (text 4.5:1) and 1.4.11 (graphics 3:1), with its formula
for relative luminance. Colour vision: the matrices of Machado, Oliveira and Fernandes (IEEE Trans. Visualization and
Computer Graphics 15, 2009) for full deuteranopia, protanopia and tritanopia, from memory.
"""

from __future__ import annotations

import re
from importlib import resources
from itertools import combinations

import numpy as np
import pytest

CSS = resources.files("optopick.report").joinpath("templates/palette.css").read_text(encoding="utf-8")
PICTURES = resources.files("optopick.report").joinpath("templates/pictures.css").read_text(encoding="utf-8")
PAGE = resources.files("optopick.report").joinpath("templates/page.css").read_text(encoding="utf-8")

LIGHT, DARK = (dict(re.findall(r"--([\w-]+): (#[0-9a-f]{6})", part)) for part in CSS.split("@media"))
themes = pytest.mark.parametrize("theme", [LIGHT, DARK], ids=["light", "dark"])

TEXTS = ("ink", "quiet", "link", "holds", "tight", "fails")
MARKS = ("rule", "series-1", "series-2", "series-3", "series-4", "series-5")

EYES = {
    "usual": np.eye(3),
    "deuteranopia": [[0.367322, 0.860646, -0.227968], [0.280085, 0.672501, 0.047413], [-0.011820, 0.042940, 0.968881]],
    "protanopia": [[0.152286, 1.052583, -0.204868], [0.114503, 0.786281, 0.099216], [-0.003882, -0.048116, 1.051998]],
    "tritanopia": [[1.255528, -0.076749, -0.178779], [-0.078411, 0.930809, 0.147602], [0.004733, 0.691367, 0.303900]],
}
APART = 12.0
"""Least distance in CIELAB (1976) between two curves; about 2 is just seen."""


def linear(colour: str) -> np.ndarray:
    values = np.array([int(colour[k : k + 2], 16) / 255 for k in (1, 3, 5)])
    return np.where(values <= 0.04045, values / 12.92, ((values + 0.055) / 1.055) ** 2.4)


def contrast(one: str, other: str) -> float:
    low, high = sorted(float(np.dot([0.2126, 0.7152, 0.0722], linear(colour))) for colour in (one, other))
    return (high + 0.05) / (low + 0.05)


def lab(rgb: np.ndarray) -> np.ndarray:
    """CIELAB of linear sRGB, white D65."""
    to_xyz = [[0.4124, 0.3576, 0.1805], [0.2126, 0.7152, 0.0722], [0.0193, 0.1192, 0.9505]]
    x = np.asarray(to_xyz) @ np.clip(rgb, 0, 1) / [0.9505, 1.0, 1.089]
    f = np.where(x > 0.008856, np.cbrt(x), 7.787 * x + 16 / 116)
    return np.array([116 * f[1] - 16, 500 * (f[0] - f[1]), 200 * (f[1] - f[2])])


def test_contrast_formula():
    """Black on white is 21:1; #767676 on white is the well-known edge of 4.5:1 (from memory)."""
    assert contrast("#000000", "#ffffff") == pytest.approx(21.0)
    assert contrast("#767676", "#ffffff") == pytest.approx(4.54, abs=0.01)


@themes
def test_text_stands_out(theme):
    for text in TEXTS:
        for ground in ("paper", "panel"):
            assert contrast(theme[text], theme[ground]) >= 4.5, (text, ground)


@themes
def test_marks_stand_out(theme):
    for mark in MARKS:
        assert contrast(theme[mark], theme["paper"]) >= 3.0, mark


@themes
@pytest.mark.parametrize("eye", EYES)
def test_curves_differ(theme, eye):
    seen = [lab(np.asarray(EYES[eye]) @ linear(theme[f"series-{k}"])) for k in range(1, 6)]
    assert min(np.linalg.norm(one - other) for one, other in combinations(seen, 2)) >= APART


def test_curves_differ_without_colour():
    dashes = re.findall(
        r"\.plot \.series-(\d) \{[^}]*?(stroke-dasharray: [^;]+)?; ?(?:stroke-linecap[^}]*)?\}", PICTURES
    )
    patterns = [dash for _, dash in dashes]
    assert len(patterns) == 5
    assert len(set(patterns)) == 5


def test_colours_stand_in_the_palette_only():
    """No other file of styles names a colour, and both themes name the same ones."""
    assert set(LIGHT) == set(DARK)
    for css in (PICTURES, PAGE):
        assert re.findall(r"#[0-9a-fA-F]{3,8}\b|rgb", css.replace("#fff", "").replace("#explorer", "")) == []
        for used in re.findall(r"var\(--([\w-]+)\)", css):
            assert used in LIGHT


def test_text_is_never_faint():
    """Text takes a text colour; the faint one is for lines."""
    for css in (PICTURES, PAGE):
        for used in re.findall(r"(?<![\w-])(?:color|fill): var\(--([\w-]+)\)", css):
            assert used in {*TEXTS, "paper", "panel", "series-1", "series-2"}
