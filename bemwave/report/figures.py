"""Figures of the page: matplotlib's, as SVG that follows the page's light and dark, and as PNG."""

from __future__ import annotations

import io
import re
from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from bemwave.report.colours import THEME, light

WIDTH = 4.6  # inches: readable at the width of a phone without being wide on a desk
_STYLE: dict[str, Any] = {
    "font.size": 9.5,
    "axes.titlesize": 9.5,
    "axes.labelsize": 9.5,
    "axes.spines.top": False,
    "axes.spines.right": False,
    "axes.linewidth": 0.7,
    "axes.grid": True,
    "grid.linewidth": 0.5,
    "lines.linewidth": 1.3,
    "legend.frameon": False,
    "legend.fontsize": 9.0,
    "svg.fonttype": "none",
    "text.parse_math": False,  # a name with dollar signs is a name
    "axes.unicode_minus": True,
}
_INK = ("text.color", "axes.labelcolor", "xtick.labelcolor", "ytick.labelcolor", "axes.titlecolor")


@dataclass(frozen=True)
class Figure:
    """A figure of the page.

    Attributes
    ----------
    name : of its PNG file, and the start of the ids inside the SVG.
    caption : what it shows, under it.
    told : the same in words for who does not see it, with its main figures.
    svg : markup, made here alone and so safe to put in the page.
    """

    name: str
    caption: str
    told: str
    svg: str


def drawn(
    name: str,
    caption: str,
    told: str,
    draw: Callable[[Any], None],
    folder: Path,
    height: float = 2.6,
) -> Figure:
    """Draw a figure.

    Parameters
    ----------
    name : letters, digits, - and _.
    draw : takes a matplotlib Figure and fills it.
    folder : where NAME.png goes.
    height : inches.
    """
    from matplotlib.backends.backend_agg import FigureCanvasAgg
    from matplotlib.figure import Figure as Sheet
    from matplotlib.style import context

    with context(["default", _style(name)]):  # whatever the reader's own settings are
        sheet = Sheet(figsize=(WIDTH, height), layout="constrained")
        FigureCanvasAgg(sheet)
        sheet.patch.set_alpha(0.0)
        draw(sheet)
        for axes in sheet.axes:
            axes.patch.set_alpha(0.0)
        text = io.StringIO()
        sheet.savefig(text, format="svg", dpi=130, metadata={"Date": None, "Creator": None})
        sheet.set_layout_engine("none")  # it stays as it was just laid out
        sheet.savefig(folder / f"{name}.png", dpi=150, facecolor="white")
    return Figure(name, caption, told, themed(text.getvalue(), name))


def _style(name: str) -> Any:
    """Settings of matplotlib for a figure; its ids follow from its name alone."""
    return {
        **_STYLE,
        **dict.fromkeys(_INK, light("ink")),
        "svg.hashsalt": name,
        "axes.edgecolor": light("soft"),
        "xtick.color": light("soft"),
        "ytick.color": light("soft"),
        "grid.color": light("rule"),
    }


def themed(svg: str, name: str) -> str:
    """An SVG file as a part of a page: its ids its own, its colours the page's.

    Whoever reads the page by ear is told the figure in words, so the drawing itself is hidden.
    """
    body = svg[svg.index("<svg") :]
    body = re.sub(r"<metadata>.*?</metadata>", "", body, flags=re.DOTALL)
    body = re.sub(r'\bid="', f'id="{name}-', body)
    body = re.sub(r'((?:xlink:)?href="|url\()#', rf"\g<1>#{name}-", body)
    body = re.sub(r'(<svg[^>]*?) width="[^"]*"', r"\1", body, count=1)
    body = re.sub(r'(<svg[^>]*?) height="[^"]*"', r"\1", body, count=1)
    body = body.replace("<svg ", '<svg aria-hidden="true" focusable="false" ', 1)
    for colour, (on_paper, _) in THEME.items():
        body = body.replace(on_paper, f"var(--{colour})")
    return body.strip()
