"""Colours: readable on their paper, and apart for every kind of colour vision."""

from __future__ import annotations

from itertools import combinations

import numpy as np
import pytest

from meterlens.report.theme import DARK, LIGHT, PHASE_DASH

# Full-strength deficiency matrices on linear RGB: G. M. Machado, M. M. Oliveira,
# L. A. F. Fernandes, IEEE Trans. Vis. Comput. Graph. 15(6), 2009, table of severity 1.0.
DEFICIENCIES = {
    "none": np.eye(3),
    "protan": np.array(
        [
            [0.152286, 1.052583, -0.204868],
            [0.114503, 0.786281, 0.099216],
            [-0.003882, -0.048116, 1.051998],
        ]
    ),
    "deutan": np.array(
        [
            [0.367322, 0.860646, -0.227968],
            [0.280085, 0.672501, 0.047413],
            [-0.011820, 0.042940, 0.968881],
        ]
    ),
    "tritan": np.array(
        [
            [1.255528, -0.076749, -0.178779],
            [-0.078411, 0.930809, 0.147602],
            [0.004733, 0.691367, 0.303900],
        ]
    ),
}
TO_XYZ = np.array([[0.4124, 0.3576, 0.1805], [0.2126, 0.7152, 0.0722], [0.0193, 0.1192, 0.9505]])
PALETTES = pytest.mark.parametrize("palette", [LIGHT, DARK], ids=["light", "dark"])


def linear(colour: str) -> np.ndarray:
    """Return linear RGB of ``#rrggbb``."""
    c = np.array([int(colour[k : k + 2], 16) / 255 for k in (1, 3, 5)])
    return np.where(c <= 0.04045, c / 12.92, ((c + 0.055) / 1.055) ** 2.4)


def lab(rgb: np.ndarray) -> np.ndarray:
    """Return CIE L*a*b* (D65) of linear RGB."""
    t = TO_XYZ @ np.clip(rgb, 0, 1) / np.array([0.95047, 1.0, 1.08883])
    f = np.where(t > 216 / 24389, np.cbrt(t), (24389 / 27 * t + 16) / 116)
    return np.array([116 * f[1] - 16, 500 * (f[0] - f[1]), 200 * (f[1] - f[2])])


def contrast(one: str, other: str) -> float:
    """Return the WCAG contrast ratio of two colours."""
    light, dark = sorted((float(TO_XYZ[1] @ linear(c)) + 0.05 for c in (one, other)), reverse=True)
    return light / dark


def test_both_palettes_have_the_same_names() -> None:
    assert LIGHT.keys() == DARK.keys()


@PALETTES
@pytest.mark.parametrize("kind", DEFICIENCIES)
def test_phases_stay_apart(palette: dict[str, str], kind: str) -> None:
    seen = {k: lab(DEFICIENCIES[kind] @ linear(palette[k])) for k in "abc"}
    for one, other in combinations("abc", 2):
        assert np.linalg.norm(seen[one] - seen[other]) > 18, (one, other)


@PALETTES
@pytest.mark.parametrize("kind", DEFICIENCIES)
def test_coverage_colours_stay_apart(palette: dict[str, str], kind: str) -> None:
    names = ("low", "mid", "full")
    seen = [lab(DEFICIENCIES[kind] @ linear(palette[k])) for k in names]
    for one, other in combinations(seen, 2):
        assert np.linalg.norm(one - other) > 18


@PALETTES
def test_contrast(palette: dict[str, str]) -> None:
    for ground in ("page", "paper", "band"):
        for name in ("ink", "muted", "link", "limit"):
            assert contrast(palette[name], palette[ground]) >= 4.5, (name, ground)
    for name in ("a", "b", "c", "n", "p", "q", "s"):
        assert contrast(palette[name], palette["paper"]) >= 3.0, name


def test_every_phase_has_its_own_dash() -> None:
    assert len(set(PHASE_DASH.values())) == 4
