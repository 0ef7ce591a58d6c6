"""Colours can be told apart: contrasts by the formula of WCAG 2.2 (criteria 1.4.3, 1.4.11)."""

from __future__ import annotations

import re
from pathlib import Path

import numpy as np
import pytest

from bemwave import report
from bemwave.report.colours import HEIGHT, THEME, WATER, table

CSS = (Path(report.__file__).parent / "page.css").read_text(encoding="utf-8")


def luminance(colour: str) -> float:
    """Relative luminance (WCAG 2.2, definitions) of #rrggbb."""
    values = np.array([int(colour[k : k + 2], 16) / 255 for k in (1, 3, 5)])
    linear = np.where(values <= 0.04045, values / 12.92, ((values + 0.055) / 1.055) ** 2.4)
    return float(linear @ [0.2126, 0.7152, 0.0722])


def contrast(one: str, other: str) -> float:
    dark, light = sorted((luminance(one), luminance(other)))
    return (light + 0.05) / (dark + 0.05)


def colours(dark: bool) -> dict[str, str]:
    """All colours of the page by name."""
    parts = re.split(r"@media \(prefers-color-scheme: dark\)", CSS)
    own = dict(re.findall(r"--([\w-]+): (#[0-9a-f]{6})", parts[0]))
    if dark:
        own |= dict(re.findall(r"--([\w-]+): (#[0-9a-f]{6})", parts[1]))
    return own | {name: pair[dark] for name, pair in THEME.items()}


@pytest.mark.parametrize("dark", [False, True])
def test_text_and_lines_stand_out(dark: bool) -> None:
    page = colours(dark)
    for text in ("ink", "soft", "pass", "fail", "info", "buoy"):
        for ground in ("paper", "card"):
            assert contrast(page[text], page[ground]) >= 4.5, (text, ground)
    for text in ("on-deep", "mist"):
        assert contrast(page[text], page["deep"]) >= 4.5
    for line in ("line1", "line2", "line3", "line4", "line5"):
        assert contrast(page[line], page["card"]) >= 3.0, line


@pytest.mark.parametrize("name", [WATER, HEIGHT])
def test_maps_of_one_sign_grow_lighter_all_the_way(name: str) -> None:
    light = np.array([luminance("#" + "".join(f"{c:02x}" for c in rgb)) for rgb in table(name)])
    assert np.all(np.diff(light) > -1e-3)
    assert light[-1] > 0.7
    assert light[0] < 0.05
