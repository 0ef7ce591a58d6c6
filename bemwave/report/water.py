"""What the page's 3-D view is given: the film as whole numbers, hulls and their motion, guides."""

from __future__ import annotations

import base64
import json
import math
import zlib
from collections.abc import Iterator
from typing import Any

import numpy as np
import numpy.typing as npt

from bemwave.bodies.modes import displacement
from bemwave.geometry.hull import Hull
from bemwave.handoff import box_of
from bemwave.records import Run
from bemwave.report.colours import WATER, table
from bemwave.report.film import Film
from bemwave.report.series import Bodies

LEVELS = 2048  # of the elevation, from 0 to the peak
_DIGITS = 4


def water_json(run: Run, film: Film, limit: float, bodies: Bodies | None) -> str:
    """The view's data as JSON that can stand inside a page: no "<" in it."""
    step = film.peak / LEVELS
    heights = np.round(film.filled(film.total) / step).astype("<i2")
    heights[:, :, 1:] -= heights[:, :, :-1].copy()  # small numbers pack better
    content = {
        "nx": len(film.x),
        "ny": len(film.y),
        "x": [film.x[0], film.x[-1]],
        "y": [film.y[0], film.y[-1]],
        "times": np.round(film.times, _DIGITS).tolist(),
        "step": step,
        "limit": limit,
        "heights": packed(heights),
        "shown": packed(film.inside.astype("u1")),
        "colours": packed(table(WATER)),
        "bodies": [_body(hull, film, limit, bodies) for hull in run.hulls + run.riders],
        "boxes": list(_boxes(run)),
        "gauges": [{"name": g.name, "place": list(g.position)} for g in run.case.gauge],
    }
    return json.dumps(content, separators=(",", ":"), allow_nan=False).replace("<", "\\u003c")


def packed(array: npt.NDArray[Any]) -> str:
    """An array's bytes, deflated, as base64."""
    return base64.b64encode(zlib.compress(array.tobytes(), 9)).decode("ascii")


def _body(hull: Hull, film: Film, limit: float, bodies: Bodies | None) -> dict[str, Any]:
    points, lines = hull.mesh.points, hull.polygons()
    middle = (np.concatenate(lines) if lines else points[:, :2]).mean(axis=0)
    size = float(np.ptp(points[:, :2], axis=0).max())
    # walls over still water: the solver knows no shape there, so a plain height
    wall = max(0.08 * size, 1.5 * limit)
    return {
        "name": hull.name,
        "points": packed(points.astype("<f4")),
        "triangles": packed(hull.mesh.flipped().triangles.astype("<u4")),
        "waterlines": [np.round(line, _DIGITS).tolist() for line in lines],
        "wall": wall,
        "label": [*middle.tolist(), wall if lines else float(points[:, 2].max())],
        "poses": None if bodies is None else _poses(hull, bodies, film.times),
    }


def _poses(hull: Hull, bodies: Bodies, times: npt.NDArray[np.float64]) -> list[list[float]] | None:
    """Rows of 3 x 4 that take the hull from its place at rest; None where it never moves."""
    motion = bodies.motion_at(hull.name, times)
    if motion is None or not motion.any():
        return None
    rows = []
    for six in motion:
        pose = displacement(hull, six)
        rows.append(np.round(np.column_stack([pose.rotation, pose.shift]), 6).ravel().tolist())
    return rows


def _boxes(run: Run) -> Iterator[dict[str, Any]]:
    for entry in run.case.handoff:
        box = box_of(entry)
        if box is not None:
            bottom = box.bottom if math.isfinite(box.bottom) else 0.0
            yield {
                "centre": list(box.centre),
                "size": list(box.size),
                "angle": box.angle,
                "bottom": bottom,
                "top": box.top,
            }
