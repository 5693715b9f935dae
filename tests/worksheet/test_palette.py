"""Colours: readable, and apart for every kind of colour vision."""

from __future__ import annotations

from itertools import combinations

import numpy as np
import pytest

from relook.worksheet.palette import (
    AMISS,
    DONE,
    FIELD,
    GREY,
    INK,
    PAPER,
    contrast,
    hues,
    label_colours,
    ramp,
)

# Machado, Oliveira & Fernandes (2009), "A physiologically-based model for simulation of color
# vision deficiency", table 1, severity 1.0; applied to linear RGB.
SIMULATED = {
    "normal": np.eye(3),
    "protanopia": np.array(
        [[0.152286, 1.052583, -0.204868], [0.114503, 0.786281, 0.099216],
         [-0.003882, -0.048116, 1.051998]]
    ),
    "deuteranopia": np.array(
        [[0.367322, 0.860646, -0.227968], [0.280085, 0.672501, 0.047413],
         [-0.011820, 0.042940, 0.968881]]
    ),
    "tritanopia": np.array(
        [[1.255528, -0.076749, -0.178779], [-0.078411, 0.930809, 0.147602],
         [0.004733, 0.691367, 0.303900]]
    ),
}  # fmt: skip


def linear(colour: str) -> np.ndarray:
    channels = np.array([int(colour[at : at + 2], 16) / 255 for at in (0, 2, 4)])
    return np.where(channels <= 0.04045, channels / 12.92, ((channels + 0.055) / 1.055) ** 2.4)


def cielab(rgb: np.ndarray) -> np.ndarray:
    """CIE 1976 L*a*b* of linear sRGB under D65."""
    to_xyz = np.array(
        [[0.4124, 0.3576, 0.1805], [0.2126, 0.7152, 0.0722], [0.0193, 0.1192, 0.9505]]
    )
    x, y, z = to_xyz @ np.clip(rgb, 0, 1) / np.array([0.9505, 1.0, 1.089])
    fx, fy, fz = (np.cbrt(t) if t > 216 / 24389 else (841 / 108) * t + 4 / 29 for t in (x, y, z))
    return np.array([116 * fy - 16, 500 * (fx - fy), 200 * (fy - fz)])


def test_contrast_is_that_of_the_standard() -> None:
    """Black on white has 21:1 and a colour on itself 1:1 (WCAG 2.1)."""
    assert contrast("000000", "FFFFFF") == pytest.approx(21, abs=1e-12)
    assert contrast("123456", "123456") == 1
    # #767676 on white: 4.54:1, the standard example of a grey that just passes 4.5:1.
    assert contrast("767676", "FFFFFF") == pytest.approx(4.54, abs=0.005)


@pytest.mark.parametrize("ground", [*hues(), *ramp(8), FIELD, DONE, AMISS, PAPER])
def test_ink_reads_on_every_ground(ground: str) -> None:
    """7:1 or more, for labels and for the cells that are filled in."""
    assert contrast(INK, ground) >= 7


@pytest.mark.parametrize("ground", [PAPER, DONE])
def test_grey_text_reads_too(ground: str) -> None:
    """4.5:1, the standard's minimum for text, for codes and other reference."""
    assert contrast(GREY, ground) >= 4.5


@pytest.mark.parametrize("vision", SIMULATED)
def test_no_two_hues_look_the_same(vision: str) -> None:
    """A CIE 1976 difference of 7 or more between any two, about three times the just noticeable."""
    seen = [cielab(SIMULATED[vision] @ linear(hue)) for hue in hues()]
    assert min(float(np.linalg.norm(a - b)) for a, b in combinations(seen, 2)) >= 7


@pytest.mark.parametrize("steps", range(1, 9))
def test_a_ramp_only_darkens(steps: int) -> None:
    """Each step has less contrast to ink than the one before."""
    against = [contrast(INK, colour) for colour in ramp(steps)]
    assert len(against) == steps
    assert against == sorted(against, reverse=True)


def test_colours_end_at_eight() -> None:
    """Nine labels get none, since nine hues cannot be told apart."""
    assert len(label_colours([str(at) for at in range(8)], ordered=False)) == 8
    assert label_colours([str(at) for at in range(9)], ordered=True) == {}
    assert label_colours([], ordered=False) == {}
