"""From a hull file's triangles to the wetted hull, level in the water at the origin."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from bemwave.errors import InputError
from bemwave.geometry.cut import above, below
from bemwave.geometry.faults import find_faults, find_odd_size
from bemwave.geometry.pose import Pose, trim_and_heel, up_rotation
from bemwave.geometry.surface_mesh import BoolArray, SurfaceMesh
from bemwave.geometry.topology import extent, pieces, weld

SNAP = 1e-5  # of the hull's extent: points nearer to the waterline are put on it
WELD = 1e-6  # of the hull's extent: points nearer to each other are one


@dataclass(frozen=True)
class Floating:
    """A whole hull put in the water: level axes, still water at z = 0, normals out of the hull.

    `pose` takes points of the file, after scale, to these axes. `notes` say what was changed.
    `left_out` has the name of each part left out and its `width_under_water`.
    """

    mesh: SurfaceMesh
    pose: Pose
    notes: tuple[str, ...]
    left_out: tuple[tuple[str, float | None], ...] = ()


@dataclass(frozen=True)
class Wetted:
    """The part under water, open at z = 0 (and at the bed), normals out of the water.

    `cut` says whether any triangle had to be cut; if not, the mesh is the file's own.
    """

    mesh: SurfaceMesh
    cut: bool


def put_in_water(
    mesh: SurfaceMesh,
    source: str,
    *,
    scale: float | None = None,
    up: str | None = None,
    draught: float | None = None,
    trim: float = 0.0,
    heel: float = 0.0,
    without: Sequence[str] = (),
    weld_tolerance: float | None = None,
) -> Floating:
    """Weld, leave parts out, scale and turn a hull as read from its file.

    Parameters
    ----------
    mesh : SurfaceMesh
        As `read_mesh` gives it.
    source : str
        What to call it in messages: the file's name.
    scale : float, optional
        Metres for each unit of the file. Not given: 1, and an absurd length is refused.
    up : str, optional
        Axis of the file that points up, "x", "y", "z", "-x" ... Not given: z, and a hull that looks
        as if y were up is refused.
    draught : float, optional
        Depth of the lowest point, m. Not given: the file's z = 0 is still water.
    trim, heel : float
        Turn about the file's origin, bow down and port up positive, rad.
    without : sequence of str
        Names of parts left out; in a file without names, piece1, piece2 ... by size.
    weld_tolerance : float, optional
        Points nearer than this are one, m after scale; default 1e-6 of the extent.

    Raises
    ------
    InputError
        For unknown parts, absurd sizes, a wrong up axis.
    """
    mesh = mesh.with_points(mesh.points * (1.0 if scale is None else scale))
    tolerance = WELD * extent(mesh.points) if weld_tolerance is None else weld_tolerance
    mesh, merged, dropped = weld(mesh, tolerance)
    notes = []
    if merged:
        notes.append(f"{merged} points within {tolerance:.3g} m of others merged")
    if dropped:
        notes.append(f"{dropped} triangles without area dropped by the merging")
    whole = named_pieces(mesh)
    mesh = _without(whole, without, source) if without else whole
    if not len(mesh.triangles):
        raise InputError(f"{source}: no triangles are left; leave fewer parts out")
    odd = find_odd_size(
        mesh if up is None else mesh.with_points(mesh.points @ up_rotation(up).T),
        scale_known=scale is not None,
        up_known=up is not None,
    )
    if odd:
        raise InputError(f"{source}: {odd[0].text}")
    rotation = trim_and_heel(trim, heel) @ up_rotation("z" if up is None else up)
    turned = mesh.points @ rotation.T
    rise = 0.0 if draught is None else -draught - float(turned[:, 2].min())
    pose = Pose(rotation, np.array([0.0, 0.0, rise]))
    parts = {name: whole.keep(whole.in_part(name)) for name in without}
    left_out = tuple(
        (name, width_under_water(part.with_points(pose(part.points))))
        for name, part in parts.items()
    )
    return Floating(mesh.with_points(pose(mesh.points)), pose, tuple(notes), left_out)


def wetted_part(hull: Floating, source: str, depth: float = math.inf) -> Wetted:
    """Cut a hull at still water and at the bed.

    Raises
    ------
    InputError
        If the hull lies wholly above water, or its wetted part has holes or other faults.
    """
    points = hull.mesh.points
    snap = SNAP * extent(points)
    low, high = points[:, 2].min(), points[:, 2].max()
    if low > -snap:
        raise InputError(
            f"{source}: the whole hull lies above still water (z from {low:.4g} to {high:.4g} m); "
            "give its draught, or move it down in the file"
        )
    mesh, cut = hull.mesh, bool(_crosses(hull.mesh, 0.0, snap).any())
    mesh = below(mesh, 0.0, snap)
    open_at = [0.0]
    if math.isfinite(depth) and low < -depth + snap:
        cut |= bool(_crosses(mesh, -depth, snap).any())
        mesh = above(mesh, -depth, snap)
        open_at.append(-depth)
        if not len(mesh.triangles):
            raise InputError(f"{source}: the whole hull lies under the bed at z = {-depth:g} m")
    faults = find_faults(mesh, open_at)
    if faults:
        raise InputError(f"{source}, under water: {'; also '.join(map(str, faults))}")
    return Wetted(mesh.flipped(), cut)


def width_under_water(mesh: SurfaceMesh) -> float | None:
    """Least extent in plan, in any direction, of what lies under z = 0, m; None if nothing does.

    Of a shape with straight sides in plan the narrowest direction is square to one of them (the
    convex hull's: Houle & Toussaint 1988, IEEE PAMI 10:761).
    """
    from scipy.spatial import ConvexHull, QhullError

    plan = below(mesh, 0.0, 0.0).points[:, :2]
    if not len(plan):
        return None
    try:
        outward = ConvexHull(plan).equations[:, :2]
    except QhullError:  # a sheet seen on edge
        return 0.0
    return float(np.ptp(plan @ outward.T, axis=0).min())


def named_pieces(mesh: SurfaceMesh) -> SurfaceMesh:
    """Name the connected pieces of a mesh of one part piece1, piece2 ... by size."""
    if len(mesh.part_names) > 1 or not len(mesh.triangles):
        return mesh
    piece = pieces(mesh)
    names = [f"piece{k + 1}" for k in range(int(piece.max()) + 1)]
    return SurfaceMesh(mesh.points, mesh.triangles, piece, names)


def _without(mesh: SurfaceMesh, names: Sequence[str], source: str) -> SurfaceMesh:
    for name in names:
        if name not in mesh.part_names:
            raise InputError(
                f"{source}: without names {name!r}, and its parts are "
                f"{', '.join(mesh.part_names[:20])}; use one of these"
            )
    left_out = [mesh.part_names.index(name) for name in names]
    return mesh.keep(~np.isin(mesh.part, left_out))


def _crosses(mesh: SurfaceMesh, level: float, snap: float) -> BoolArray:
    height = mesh.vertices[:, :, 2] - level
    return np.asarray((height.min(axis=1) < -snap) & (height.max(axis=1) > snap))
