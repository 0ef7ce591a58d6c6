"""A picture of a case's layout, to scale: water, absorber, panels, bodies, gauges, boxes, waves."""

from __future__ import annotations

import math
from pathlib import Path
from typing import Any

import numpy as np

from bemwave.geometry.outline import Circle
from bemwave.handoff import box_of
from bemwave.running.survey import Survey, useful_water


def draw(survey: Survey, path: Path) -> None:
    """Draw the plan of a surveyed case into a PNG."""
    from matplotlib.backends.backend_agg import FigureCanvasAgg
    from matplotlib.figure import Figure

    figure = Figure(figsize=(9.0, 7.0), layout="constrained")
    FigureCanvasAgg(figure)
    axes = figure.add_subplot()
    axes.set_aspect("equal")
    _outline(axes, survey.outline, "absorber", facecolor="0.88", edgecolor="0.6")
    _outline(axes, useful_water(survey.case), "useful water", facecolor="white", edgecolor="0.3")
    if survey.mesh is not None and survey.sheet is None:
        x, y = survey.water.points[:, 0], survey.water.points[:, 1]
        axes.triplot(x, y, survey.water.triangles, color="#88aacc", linewidth=0.3)
    for number, hull in enumerate(survey.hulls + survey.riders):
        plan = hull.polygons() or [hull.mesh.points[:, :2]]
        for k, loop in enumerate(plan):
            label = hull.name if k == 0 else None
            axes.fill(*loop.T, label=label, color=f"C{number}", zorder=3)
    _places(axes, survey)
    _headings(axes, survey)
    axes.set(xlabel="x, m", ylabel="y, m")
    axes.set_title(survey.case.title, parse_math=False, wrap=True)  # dollar signs are dollar signs
    axes.legend(loc="center left", bbox_to_anchor=(1.01, 0.5), frameon=False)
    figure.savefig(path, dpi=120, format="png", bbox_inches="tight")


def _places(axes: Any, survey: Survey) -> None:
    """Gauges by number, boxes and the region of the frames by outline, named in the legend."""
    for number, gauge in enumerate(survey.case.gauge, 1):
        label = f"{number}: gauge {gauge.name}"
        axes.plot(*gauge.position, "k.", label=label, markersize=4, zorder=4)
        axes.annotate(
            str(number), gauge.position, (3, 3), textcoords="offset points", fontsize=9, zorder=4
        )
    for entry in survey.case.handoff:
        box = box_of(entry)
        if box is not None:
            half = 0.5 * np.asarray(box.size)
            corners = np.array([[-1, -1], [1, -1], [1, 1], [-1, 1], [-1, -1]]) * half
            label = f"hand-off {entry.name}"
            axes.plot(*box.to_earth(corners).T, "--", color="k", label=label, zorder=4)
    frames = survey.case.frames
    if frames is not None and frames.region is not None:
        corners = np.array([[-1, -1], [1, -1], [1, 1], [-1, 1], [-1, -1]]) / 2
        region = corners * frames.region.size + frames.region.centre
        axes.plot(*region.T, ":", color="C2", linewidth=2.0, label="frames", zorder=4)


def _headings(axes: Any, survey: Survey) -> None:
    """An arrow for each entry of waves, where they come from: in the absorber if there is one."""
    surface = survey.case.surface
    reach = 0.5 * max(surface.extent)
    start = 1.0 if survey.layer is None else 1.9
    for number, wave in enumerate(survey.case.waves, 1):
        along = np.array([math.cos(math.radians(a)) for a in (wave.heading, wave.heading - 90.0)])
        tail = np.array(surface.centre) - start * reach * along
        axes.annotate(
            f"waves {number}",
            tail + 0.6 * reach * along,
            tail,
            arrowprops={"arrowstyle": "-|>", "color": "C3", "linewidth": 2.0},
            color="C3",
            ha="center",
            va="center",
            zorder=5,
        )


def _outline(axes: Any, outline: Any, label: str, **style: Any) -> None:
    if isinstance(outline, Circle):
        angle = np.linspace(0.0, 2.0 * np.pi, 181)
        x = outline.x + outline.radius * np.cos(angle)
        y = outline.y + outline.radius * np.sin(angle)
    else:
        x = np.array([outline.x_min, outline.x_max, outline.x_max, outline.x_min])
        y = np.array([outline.y_min, outline.y_min, outline.y_max, outline.y_max])
    axes.fill(x, y, label=label, linewidth=1.0, **style)
