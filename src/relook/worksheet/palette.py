"""Colours that people of any colour vision can tell apart, light enough for black text.

The hues are the eight of Okabe & Ito (2008), "Color Universal Design: how to make figures and
presentations that are friendly to colorblind people", mixed with white until near-black text on
them has a contrast of 7:1 or more (WCAG 2.1, success criterion 1.4.6). A colour only helps the eye:
the label's text is always there too.
"""

from __future__ import annotations

from collections.abc import Sequence

#: Colours of text and rules: warm near-black ink on paper.
INK = "24211C"
GREY = "716B60"
RULE = "D9D4C7"
PAPER = "FFFFFF"
FIELD = "FBF6E6"
DONE = "E9EFE3"
AMISS = "F3B8A2"

MOST_COLOURS = 8
#: As published; the order is ours, and black stands last, since it can only become a grey.
OKABE_ITO = (
    "56B4E9",  # sky blue
    "E69F00",  # orange
    "009E73",  # bluish green
    "F0E442",  # yellow
    "CC79A7",  # reddish purple
    "0072B2",  # blue
    "D55E00",  # vermillion
    "000000",  # black
)
#: How much of the hue is kept when mixed with white. Chosen so that the two closest of the eight
#: stay as far apart as they can (CIE 1976 colour difference) for normal vision and for each of the
#: three dichromacies as simulated by Machado, Oliveira & Fernandes (2009).
_KEPT = (0.36, 0.41, 0.35, 0.59, 0.20, 0.42, 0.44, 0.28)
_RAMP_HUE = "0072B2"
_RAMP_LIGHTEST, _RAMP_DARKEST = 0.05, 0.52


def mixed_with_white(colour: str, kept: float) -> str:
    """Return a colour, six hex digits, with the share `kept` of it left and white for the rest."""
    channels = (int(colour[at : at + 2], 16) for at in (0, 2, 4))
    return "".join(f"{round(255 - (255 - channel) * kept):02X}" for channel in channels)


def luminance(colour: str) -> float:
    """Return the relative luminance of a colour, 0 to 1 (WCAG 2.1, "relative luminance")."""

    def linear(channel: float) -> float:
        return channel / 12.92 if channel <= 0.04045 else float(((channel + 0.055) / 1.055) ** 2.4)

    red, green, blue = (linear(int(colour[at : at + 2], 16) / 255) for at in (0, 2, 4))
    return 0.2126 * red + 0.7152 * green + 0.0722 * blue


def contrast(first: str, second: str) -> float:
    """Return the contrast ratio of two colours, 1 to 21 (WCAG 2.1, "contrast ratio")."""
    lighter, darker = sorted((luminance(first), luminance(second)), reverse=True)
    return (lighter + 0.05) / (darker + 0.05)


def hues() -> tuple[str, ...]:
    """Return the eight lightened hues."""
    return tuple(mixed_with_white(hue, kept) for hue, kept in zip(OKABE_ITO, _KEPT, strict=True))


def ramp(steps: int) -> tuple[str, ...]:
    """Return a ramp of one hue from light to less light, for labels in an order.

    Parameters
    ----------
    steps : int
        1 to 8.
    """
    span = _RAMP_DARKEST - _RAMP_LIGHTEST
    return tuple(
        mixed_with_white(_RAMP_HUE, _RAMP_LIGHTEST + span * step / max(1, steps - 1))
        for step in range(steps)
    )


def label_colours(labels: Sequence[str], *, ordered: bool) -> dict[str, str]:
    """Return a colour for each label; none at all where there are more than eight.

    Parameters
    ----------
    labels : sequence of str
        In the code book's order, which the colours follow.
    ordered : bool
        Whether the order means something: a ramp, not separate hues.
    """
    if not 0 < len(labels) <= MOST_COLOURS:
        return {}
    colours = ramp(len(labels)) if ordered else hues()
    return dict(zip(labels, colours, strict=False))
