"""A list of points of the user's own: csv, vtp or vtu."""

from __future__ import annotations

import math
from pathlib import Path

import numpy as np

from bemwave.case import Case
from bemwave.case.output import Handoff as Entry
from bemwave.errors import InputError
from bemwave.geometry.strangers import refuse_hostile
from bemwave.geometry.vtp_files import read_vtk_points
from bemwave.handoff.box import Array, PointSet, free_points

HEADER = "x,y,z"


def read_points(entry: Entry, case: Case) -> PointSet:
    """Read the points of an entry and check that they are in the water that is solved.

    Raises
    ------
    InputError
        If the file cannot be read, holds no points, or some lie outside the useful water or below
        the bed.
    """
    path = case.folder / str(entry.points)
    points = load_points(path)
    outside = [not case.surface.contains(x, y) for x, y, _ in points]
    if any(outside):
        x, y, _ = points[outside.index(True)]
        raise InputError(
            f"{path} has {sum(outside)} points outside the useful water, the first at "
            f"({x:g}, {y:g}); expected all inside: make [surface] size larger, or leave them out"
        )
    under = points[:, 2] < -case.water.depth * (1 + 1e-9)
    if math.isfinite(case.water.depth) and under.any():
        raise InputError(
            f"{path} has {under.sum()} points below the bed, the lowest at "
            f"z = {points[:, 2].min():g}; expected z >= {-case.water.depth:g}: leave them out"
        )
    return free_points(points)


def load_points(path: Path) -> Array:
    """Read the points (n, 3) of a csv file with the header x,y,z, or of a vtp or vtu file."""
    readers = {".csv": _from_csv, ".vtp": _from_vtk, ".vtu": _from_vtk}
    if path.suffix.lower() not in readers:
        raise InputError(
            f"{path} was given for points; expected a file ending in .csv, .vtp or .vtu"
        )
    if not path.is_file():
        raise InputError(f"{path} was given for points; there is no such file: check the name")
    points = readers[path.suffix.lower()](path)
    if len(points) == 0 or not np.isfinite(points).all():
        raise InputError(
            f"{path} holds {len(points)} points, not all of them numbers; expected at least one "
            "point and finite x, y, z in metres"
        )
    return points


def _from_csv(path: Path) -> Array:
    # what is not UTF-8 is no number either, and told with its line
    lines = path.read_text(encoding="utf-8-sig", errors="replace").splitlines()
    header = lines[0].replace(" ", "") if lines else ""
    if header != HEADER:
        raise InputError(
            f"{path}, line 1: got {header!r}, expected the header {HEADER}: write it above the "
            "coordinates in metres"
        )
    rows = []
    for number, line in enumerate(lines[1:], start=2):
        if not line.strip():
            continue
        try:
            x, y, z = (float(word) for word in line.split(","))
        except ValueError:
            raise InputError(
                f"{path}, line {number}: got {line!r}, expected three numbers x,y,z"
            ) from None
        rows.append((x, y, z))
    return np.array(rows, dtype=np.float64).reshape(-1, 3)


def _from_vtk(path: Path) -> Array:
    refuse_hostile(path)
    try:
        return read_vtk_points(path)
    except ValueError as error:
        raise InputError(
            f"{path} could not be read ({error}); expected a VTK file with points"
        ) from error
