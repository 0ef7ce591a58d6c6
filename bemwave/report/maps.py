"""Maps of the water: elevation at chosen times, what bodies add, how high the waves are where."""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path
from typing import Any

import numpy as np
import numpy.typing as npt

from bemwave.handoff import box_of
from bemwave.records import Run
from bemwave.report.colours import HEIGHT, SIGNED, WATER, colour_map, light
from bemwave.report.figures import WIDTH, Figure, drawn
from bemwave.report.film import Film
from bemwave.report.words import number

Array = npt.NDArray[np.float64]


def elevation_maps(run: Run, film: Film, limit: float, folder: Path) -> Iterator[Figure]:
    """The surface in every frame of a film, all on one scale."""
    for place, (time, field) in enumerate(zip(film.times, film.total, strict=True), 1):
        yield _map(
            run,
            film,
            field,
            f"elevation-{place}",
            f"The surface at t = {time:.2f} s.",
            f"Elevations from {number(_least(field), 2)} to {number(_most(field), 2)} m.",
            "elevation, m",
            {"cmap": colour_map(WATER), "vmin": -limit, "vmax": limit},
            folder,
        )


def scattered_map(run: Run, film: Film, folder: Path) -> Figure:
    """What is solved: the surface at the last frame without the incident waves."""
    field = film.scattered[-1]
    reach = float(np.nanmax(np.abs(field), initial=0.0)) or 1.0
    return _map(
        run,
        film,
        field,
        "scattered",
        f"Of it, what bodies and walls add to the incident sea, at t = {film.times[-1]:.2f} s.",
        f"Up to {number(reach, 2)} m.",
        "elevation without the incident waves, m",
        {"cmap": colour_map(SIGNED), "vmin": -reach, "vmax": reach},
        folder,
    )


def height_map(run: Run, film: Film, folder: Path) -> Figure:
    """Height of the waves where they pass: four standard deviations over a film's time, m."""
    field = np.full(film.wet.shape, np.nan)
    field[film.wet] = 4.0 * film.total[:, film.wet].std(axis=0)
    return _map(
        run,
        film,
        field,
        "height",
        f"Height of the waves, four standard deviations from t = {film.times[0]:.1f} s on: where "
        "it is rough and where there is shelter. Boxes are dashed; gauges have the numbers they "
        "have in the table.",
        f"Heights from {number(_least(field), 2)} to {number(_most(field), 2)} m.",
        "height of the waves, m",
        {"cmap": colour_map(HEIGHT), "vmin": 0.0, "vmax": _most(field) or 1.0},
        folder,
        guides=True,
    )


def _map(
    run: Run,
    film: Film,
    field: Array,
    name: str,
    caption: str,
    told: str,
    label: str,
    colours: dict[str, Any],
    folder: Path,
    guides: bool = False,
) -> Figure:
    from matplotlib.ticker import MaxNLocator

    def draw(sheet: Any) -> None:
        axes = sheet.add_subplot()
        shown = axes.pcolormesh(
            film.x, film.y, film.filled(field), shading="gouraud", rasterized=True, **colours
        )
        if run.case.surface.outline == "circle":
            _clip(shown, axes, run)
        for hull in run.hulls + run.riders:
            for loop in hull.polygons():
                axes.fill(*loop.T, color=light("hull"), linewidth=0.0, zorder=3)
        if guides:
            _guides(axes, run)
        axes.set(xlabel="x, m", ylabel="y, m", aspect="equal")
        axes.set(xlim=film.x[[0, -1]], ylim=film.y[[0, -1]])
        axes.grid(False)
        shape = {"shrink": 0.8, "aspect": 32, "ticks": MaxNLocator(5)}
        bar = sheet.colorbar(shown, ax=axes, label=label, location="top", **shape)
        bar.outline.set_visible(False)

    across, up = film.x[-1] - film.x[0], film.y[-1] - film.y[0]
    height = float(np.clip(0.86 * WIDTH * up / across, 1.2, 2.0 * WIDTH)) + 0.95
    return drawn(name, caption, told, draw, folder, height)


def _clip(shown: Any, axes: Any, run: Run) -> None:
    """Cut a picture at the edge of round water."""
    from matplotlib.patches import Circle

    surface = run.case.surface
    rim = Circle(surface.centre, surface.extent[0] / 2, transform=axes.transData)
    shown.set_clip_path(rim)


def _guides(axes: Any, run: Run) -> None:
    """Boxes by outline and gauges by number."""
    half = 0.5 * np.array([[-1, -1], [1, -1], [1, 1], [-1, 1], [-1, -1]])
    for entry in run.case.handoff:
        box = box_of(entry)
        if box is not None:
            corners = box.to_earth(half * np.asarray(box.size))
            axes.plot(*corners.T, "--", color="white", linewidth=1.2, zorder=4)
    for place, gauge in enumerate(run.case.gauge, 1):
        dot = {"boxstyle": "circle", "facecolor": "white", "edgecolor": "black", "pad": 0.25}
        at = {"ha": "center", "va": "center", "fontsize": 7, "zorder": 5}
        axes.text(*gauge.position, str(place), color="black", bbox=dot, **at)


def _most(field: Array) -> float:
    known = field[np.isfinite(field)]
    return float(known.max()) if known.size else 0.0


def _least(field: Array) -> float:
    return -_most(-field)
