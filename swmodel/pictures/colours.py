"""Colours: lines that colour-blind readers tell apart, and a map for signed fields that is even to the eye.

Sources: lines, Okabe & Ito 2008, "Color Universal Design"; the space in which the map is straight, Ottosson 2020, "A
perceptual color space for image processing" (OKLab).
"""

from __future__ import annotations

import math
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

if TYPE_CHECKING:
    from matplotlib.colors import Colormap

INK = "#222222"
FAINT = "#6b6b6b"
GRID = "#dddddd"
LAND = "#b9b2a6"

START = "#bdbdbd"  # the state at time 0, drawn broad: it shows beside a line that covers it
ZERO = "#8c8c8c"  # the level of nothing
FOUND = "#0072b2"  # what the model gave
FIT = "#d55e00"  # the curve through it
OTHER = "#009e73"  # a second quantity of the model
EXPECTED = INK  # theory and expectation, always dashed
BAND = "#e4e4e4"  # what an expectation allows

SHADES = 129  # on either side of zero
MIDDLE_LIGHTNESS, END_LIGHTNESS = 0.975, 0.5
END_CHROMA = 0.15
BELOW_HUE, ABOVE_HUE = math.radians(255), math.radians(40)  # blue and orange: apart for all common colour vision


def signed_shades() -> NDArray[np.float64]:
    """Return the colours of a signed field from its lowest to its highest value, sRGB in 0..1, ``[n, 3]``.

    From the light middle, lightness falls and chroma rises linearly to both ends, at one hue each: in OKLab two
    straight lines, walked at an even pace.
    """
    share = np.linspace(-1, 1, 2 * SHADES - 1)
    lightness = MIDDLE_LIGHTNESS + (END_LIGHTNESS - MIDDLE_LIGHTNESS) * np.abs(share)
    chroma = END_CHROMA * np.abs(share)
    hue = np.where(share < 0, BELOW_HUE, ABOVE_HUE)
    return srgb(lightness, chroma * np.cos(hue), chroma * np.sin(hue))


def srgb(lightness: NDArray[np.float64], a: NDArray[np.float64], b: NDArray[np.float64]) -> NDArray[np.float64]:
    """Turn OKLab into sRGB, ``[n, 3]``; values outside 0..1 lie outside what a screen shows (Ottosson 2020)."""
    long = (lightness + 0.3963377774 * a + 0.2158037573 * b) ** 3
    middle = (lightness - 0.1055613458 * a - 0.0638541728 * b) ** 3
    short = (lightness - 0.0894841775 * a - 1.2914855480 * b) ** 3
    linear = np.stack(
        [
            4.0767416621 * long - 3.3077115913 * middle + 0.2309699292 * short,
            -1.2684380046 * long + 2.6097574011 * middle - 0.3413193965 * short,
            -0.0041960863 * long - 0.7034186147 * middle + 1.7076147010 * short,
        ],
        axis=-1,
    )
    # IEC 61966-2-1
    low = 12.92 * linear
    high = 1.055 * np.maximum(linear, 0.0031308) ** (1 / 2.4) - 0.055
    return np.asarray(np.where(linear <= 0.0031308, low, high))


def signed_map() -> Colormap:
    """Return the map for signed fields, with land in its own colour."""
    from matplotlib.colors import ListedColormap

    return ListedColormap(np.clip(signed_shades(), 0, 1), name="signed").with_extremes(bad=LAND)
