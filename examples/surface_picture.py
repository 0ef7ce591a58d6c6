"""Draw the surface of a finished run: all that was kept of it, and what the bodies throw back.

    python examples/surface_picture.py examples/tender_by_platform-run picture.png

README's picture is made so.
"""

import sys

import numpy as np
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.figure import Figure

import bemwave


def main(folder: str, picture: str, time: float | None = None) -> float:
    """Draw the end of a run, or another time; returns the highest scattered wave [m]."""
    run = bemwave.open_run(folder)
    time = run.times[-1] if time is None else time
    kept, surface = run.case.run.history_region, run.case.surface
    (x0, y0), size = (kept.centre, kept.size) if kept else (surface.centre, surface.extent)
    x = x0 + size[0] * np.linspace(-0.5, 0.5, 181)
    y = y0 + size[1] * np.linspace(-0.5, 0.5, round(180 * size[1] / size[0]) + 1)
    plan = np.meshgrid(x, y)
    total = run.elevation(*plan, time)
    flat = np.column_stack([plan[0].ravel(), plan[1].ravel(), np.zeros(plan[0].size)])
    scattered = total - run.sea.at(flat).elevation(time).reshape(total.shape)

    figure = Figure(figsize=(10.0, 4.2), layout="constrained")
    FigureCanvasAgg(figure)
    panels = zip(figure.subplots(1, 2), (total, scattered), strict=True)
    for (axes, field), name in zip(panels, ("the surface", "of it, scattered"), strict=True):
        reach = np.nanmax(np.abs(field))
        colours = {"cmap": "RdBu_r", "vmin": -reach, "vmax": reach, "shading": "gouraud"}
        shown = axes.pcolormesh(x, y, field, **colours)
        for hull in run.hulls:
            for loop in hull.polygons():
                axes.fill(*loop.T, color="0.25")
        figure.colorbar(shown, ax=axes, label="elevation, m", shrink=0.85)
        axes.set(title=f"{name}, t = {time:.1f} s", xlabel="x, m", ylabel="y, m", aspect="equal")
    figure.savefig(picture, dpi=80)
    return float(np.nanmax(np.abs(scattered)))


if __name__ == "__main__":
    print(f"highest scattered wave {main(*sys.argv[1:3]):.2f} m, drawn in {sys.argv[2]}")
