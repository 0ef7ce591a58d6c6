"""What `bemwave mesh FILE` tells about a hull file."""

from __future__ import annotations

import math
import os
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path

import numpy as np

from bemwave.geometry.cut import below
from bemwave.geometry.faults import Fault, find_faults, find_odd_size
from bemwave.geometry.files import read_mesh
from bemwave.geometry.hull import prepare_hull
from bemwave.geometry.hull_file import SNAP, put_in_water
from bemwave.geometry.hydrostatics import Hydrostatics, hydrostatics
from bemwave.geometry.surface_mesh import FloatArray, SurfaceMesh
from bemwave.geometry.topology import extent


@dataclass(frozen=True, eq=False)
class Inspection:
    """A hull file, looked at; lengths in m, level axes, still water at z = 0.

    Attributes
    ----------
    path : Path
    mesh : SurfaceMesh
        What `--out` writes: the whole hull in the water, or its wetted part if it was cut;
        normals out of the hull.
    low, high : (3,) ndarray
        Extents of the whole hull.
    parts : dict
        Triangles of each part (or connected piece).
    hydrostatics : Hydrostatics or None
        Of `mesh` under water; None if nothing is under water.
    hydrostatics_before : Hydrostatics or None
        The same before remeshing.
    faults : tuple of Fault
    notes : tuple of str
        What was merged, cut, remeshed.
    """

    path: Path
    mesh: SurfaceMesh
    low: FloatArray
    high: FloatArray
    parts: dict[str, int]
    hydrostatics: Hydrostatics | None
    hydrostatics_before: Hydrostatics | None
    faults: tuple[Fault, ...]
    notes: tuple[str, ...]

    def rows(self) -> list[tuple[str, str, str]]:
        """Label, value and unit of every figure, in the order to print them."""
        rows = [
            ("triangles", str(len(self.mesh.triangles)), ""),
            ("extent x", _range(self.low[0], self.high[0]), "m"),
            ("extent y", _range(self.low[1], self.high[1]), "m"),
            ("extent z", _range(self.low[2], self.high[2]), "m"),
        ]
        data = self.hydrostatics
        if data is None:
            return rows
        return [
            *rows,
            ("length", f"{data.length:.6g}", "m"),
            ("beam", f"{data.beam:.6g}", "m"),
            ("draught", f"{data.draught:.6g}", "m"),
            ("displaced volume", f"{data.volume:.6g}", "m3"),
            ("waterplane area", f"{data.waterplane_area:.6g}", "m2"),
            ("centre of buoyancy", _triple(data.centre_of_buoyancy), "m"),
            ("centre of flotation", _triple(data.centre_of_flotation), "m"),
            ("wetted area", f"{data.wetted_area:.6g}", "m2"),
        ]


def inspect_hull(
    path: str | os.PathLike[str],
    *,
    scale: float | None = None,
    up: str | None = None,
    draught: float | None = None,
    trim: float = 0.0,
    heel: float = 0.0,
    without: Sequence[str] = (),
    cut: bool = False,
    panel_size: float | None = None,
) -> Inspection:
    """Read a hull file and say what is in it and what is wrong with it.

    Parameters
    ----------
    path : path
    scale, up, draught, trim, heel, without
        See `put_in_water`; angles in rad.
    cut : bool
        Cut at the waterline; faults under water are then refused, not listed.
    panel_size : float, optional
        Cut and remesh at this size, m.

    Raises
    ------
    InputError
        If the file cannot be read, or cannot be cut where that is asked for.
    MissingLibraryError
        If it is to be remeshed and gmsh cannot be loaded.
    """
    path = Path(path)
    file_mesh = read_mesh(path)
    floating = put_in_water(
        file_mesh,
        path.name,
        scale=scale or 1.0,
        up=up or "z",
        draught=draught,
        trim=trim,
        heel=heel,
        without=without,
    )
    whole = floating.mesh
    faults = [
        *find_odd_size(whole, scale_known=scale is not None, up_known=up is not None),
        *find_faults(whole, open_at=[0.0]),
    ]
    under = below(whole, 0.0, SNAP * extent(whole.points))
    if not len(under.triangles):
        text = "nothing is under still water (z = 0); give the draught"
        faults.append(Fault("above water", 1, text))
    before = hydrostatics(under.flipped()) if len(under.triangles) else None
    mesh, after, notes = whole, before, floating.notes
    if cut or panel_size is not None:
        hull = prepare_hull(
            file_mesh,
            path.stem,
            source=path.name,
            scale=scale,
            up=up,
            draught=draught,
            trim=trim,
            heel=heel,
            without=without,
            panel_size=panel_size,
        )
        mesh, after, notes = hull.mesh.flipped(), hull.hydrostatics, hull.notes
    return Inspection(
        path=path,
        mesh=mesh,
        low=whole.points.min(axis=0),
        high=whole.points.max(axis=0),
        parts=dict(zip(whole.part_names, np.bincount(whole.part).tolist(), strict=False)),
        hydrostatics=after,
        hydrostatics_before=before,
        faults=tuple(faults),
        notes=notes,
    )


def _range(low: float, high: float) -> str:
    return f"{low:.6g} to {high:.6g}"


def _triple(values: FloatArray) -> str:
    # to the micrometre: a hull that is as wide to port as to starboard has y = 0, not 1e-17
    rounded = (round(float(value), 6) + 0.0 for value in values)
    return ", ".join("none" if math.isnan(value) else f"{value:.4g}" for value in rounded)
