"""Colours of the page: maps that are perceptually uniform and safe for colour-blind eyes.

The maps are Crameri's (2018, doi:10.5281/zenodo.1243862); the colours of lines are Okabe and Ito's
(2008, https://jfly.uni-koeln.de/color/). Ink, paper and lines have a second value for dark pages.
"""

from __future__ import annotations

from typing import Any

import numpy as np
import numpy.typing as npt

WATER = "oslo"  # the surface: dark troughs, white crests
SIGNED = "vik"  # what is added to the sea, up and down
HEIGHT = "lapaz"  # heights of waves, never below 0

# name on the page: (light, dark)
THEME = {
    "ink": ("#0d2630", "#e3eef0"),
    "soft": ("#4c626b", "#a3b7be"),
    "rule": ("#c6d3d7", "#2a434d"),
    "card": ("#fffffe", "#0f232b"),
    "hull": ("#7d8c92", "#8ea0a7"),
    "line1": ("#0072b2", "#56b4e9"),
    "line2": ("#d55e00", "#f0a04b"),
    "line3": ("#009e73", "#3fd0a0"),
    "line4": ("#a3487f", "#e0a3c8"),
    "line5": ("#5a5a5b", "#b9b9ba"),
}


def light(name: str) -> str:
    """A colour as it is on light paper; figures are drawn with it."""
    return THEME[name][0]


def colour_map(name: str) -> Any:
    """A matplotlib colour map by name."""
    from cmcrameri import cm

    return getattr(cm, name)


def table(name: str) -> npt.NDArray[np.uint8]:
    """A colour map as (256, 3) bytes, sRGB."""
    colours = np.asarray(colour_map(name)(np.arange(256)))[:, :3]
    return np.round(255 * colours).astype(np.uint8)
