"""Hulls by formula, wetted part only, in place: still water is z = 0, the origin amidships.

All are structured and symmetric, need no mesher, and have their normals out of the water. Flat
panels cut corners: each form says how its size is set so that the displaced volume is right.
"""

from __future__ import annotations

import math

import numpy as np

from bemwave.errors import InputError
from bemwave.geometry.mesher import check_count
from bemwave.geometry.patterns import (
    disc_angles,
    disc_triangles,
    graded,
    grid_triangles,
    polygon_radius,
)
from bemwave.geometry.surface_mesh import BoolArray, FloatArray, SurfaceMesh, joined
from bemwave.geometry.topology import extent, weld


def wigley(length: float, beam: float, draught: float, panel_size: float) -> SurfaceMesh:
    """Parabolic hull y = +-beam/2 (1 - (2x/length)^2) (1 - (z/draught)^2), bow at +x.

    Points lie on the formula, so the volume is 4/9 length beam draught less the chord error
    (second order in `panel_size`). Wigley (1934), Trans. INA 76.

    Raises
    ------
    InputError
        If a dimension is not positive.
    """
    _positive(form="wigley", length=length, beam=beam, draught=draught, panel_size=panel_size)
    half = max(2, round(0.5 * length / panel_size))
    layers = max(2, round(math.hypot(draught, 0.5 * beam) / panel_size))
    z, x = np.meshgrid(
        np.linspace(-draught, 0.0, layers + 1),
        np.linspace(-0.5 * length, 0.5 * length, 2 * half + 1),
        indexing="ij",
    )
    y = 0.5 * beam * (1.0 - (2.0 * x / length) ** 2) * (1.0 - (z / draught) ** 2)
    # the diagonal ends in the corner of keel and stem: the other one would make a flat triangle
    # there, once for each side of the ship
    forward = np.broadcast_to(np.arange(2 * half) >= half, (layers, 2 * half))
    triangles = grid_triangles(layers, 2 * half, other_diagonal=forward)
    port = SurfaceMesh.of_one_part(np.stack([x, y, z], axis=-1), triangles, "hull")
    starboard = port.with_points(port.points * [1.0, -1.0, 1.0]).flipped()
    return _sewn([port, starboard])


def box(length: float, beam: float, draught: float, panel_size: float) -> SurfaceMesh:
    """Rectangular barge; its volume is exact.

    Raises
    ------
    InputError
        If a dimension is not positive.
    """
    _positive(form="box", length=length, beam=beam, draught=draught, panel_size=panel_size)
    nx, ny = (2 * max(1, round(0.5 * side / panel_size)) for side in (length, beam))
    nz = max(1, round(draught / panel_size))
    a, b = 0.5 * length, 0.5 * beam
    bottom = _plane([-a, -b, -draught], [length, 0, 0], [0, beam, 0], nx, ny, quadrants=True)
    bow = _plane([a, b, -draught], [0, -beam, 0], [0, 0, draught], ny, nz)
    stern = _plane([-a, -b, -draught], [0, beam, 0], [0, 0, draught], ny, nz)
    port = _plane([-a, b, -draught], [length, 0, 0], [0, 0, draught], nx, nz)
    starboard = _plane([a, -b, -draught], [-length, 0, 0], [0, 0, draught], nx, nz)
    return _sewn([bottom, bow, stern, port, starboard])


def cylinder(
    radius: float, draught: float, panel_size: float, *, stands_on_bed: bool = False
) -> SurfaceMesh:
    """Upright circular cylinder with a flat bottom, or open at the bed (`draught` = water depth).

    The section is a polygon of the circle's own area, so the volume and the waterplane area are
    exact. Panels are smaller towards the lower edge, where the flow has a singularity.

    Raises
    ------
    InputError
        If a dimension is not positive.
    """
    _positive(form="cylinder", radius=radius, draught=draught, panel_size=panel_size)
    # 8 sectors: the number of sides is then a multiple of 4 and the body symmetric fore and aft
    rings = max(1, round(2.0 * math.pi * radius / (8 * panel_size)))
    around, down = 8 * rings, max(1, round(draught / panel_size))
    corner = polygon_radius(radius, around)
    depth = draught * (np.linspace(0.0, 1.0, down + 1) if stands_on_bed else graded(down))
    angle = 2.0 * np.pi * np.arange(around + 1) / around
    z, turn = np.meshgrid(-depth[::-1], angle, indexing="ij")
    side = _mirrored_in_quarters(
        np.stack([corner * np.cos(turn), corner * np.sin(turn), z], axis=-1), down, around
    ).flipped()
    if stands_on_bed:
        return _sewn([side])
    ring, angle = disc_angles(rings, 8)
    r = corner * graded(rings)[ring]
    points = np.stack([r * np.cos(angle), r * np.sin(angle), np.full_like(r, -draught)], axis=-1)
    return _sewn([side, SurfaceMesh.of_one_part(points, disc_triangles(rings, 8), "hull")])


def sphere(radius: float, centre_depth: float, panel_size: float) -> SurfaceMesh:
    """Sphere with its centre `centre_depth` below still water; 0 is a floating hemisphere.

    Four sectors of rows, between those of equal latitude and those of an octahedron's faces
    projected radially: the former give a little too much added mass at infinite frequency, the
    latter too little. Points lie on a sphere a little larger than `radius`, those of the waterline
    on a circle a little larger, so that volume and waterplane area are exact: the damping of heave
    goes with the square of the waterplane, which volume alone makes .7 % too large at 9 rows.

    Raises
    ------
    InputError
        If a dimension is not positive or the sphere touches the surface from above or below.
    """
    _positive(form="sphere", radius=radius, panel_size=panel_size)
    if centre_depth <= -radius or abs(centre_depth - radius) < 1e-3 * radius:
        raise InputError(
            f"sphere: centre_depth = {centre_depth} with radius {radius} leaves the sphere "
            f"{'above' if centre_depth < 0 else 'just touching'} still water; "
            "give a depth at which it floats or is well under water"
        )
    submerged = centre_depth > radius
    # angle from the lowest point up to the waterline
    top = math.pi if submerged else math.acos(-centre_depth / radius)
    lower = _cap(min(top, 0.5 * math.pi), radius, panel_size)
    if submerged:
        upper = lower.with_points(lower.points * [1.0, 1.0, -1.0]).flipped()
        unit = _sewn([lower, upper])
    else:
        unit = _sewn([lower, *_belt(lower, top, radius, panel_size)])
    points = radius * _filled_out(unit, top).points
    points[:, 2] -= centre_depth if submerged else points[:, 2].max()
    return unit.with_points(points)


def _cap(top: float, radius: float, panel_size: float) -> SurfaceMesh:
    """Unit sphere from its lowest point up to the angle `top` from there, normals inward."""
    rings = max(2, round(radius * top / panel_size))
    ring, angle = disc_angles(rings, 4)
    along = np.mod(angle / (0.5 * np.pi), 1.0)
    flat = np.arctan2(ring * np.hypot(along, 1.0 - along), rings - ring) / (0.5 * np.pi)
    polar = top * 0.5 * (flat + ring / rings)
    x, y = np.sin(polar) * np.cos(angle), np.sin(polar) * np.sin(angle)
    points = np.stack([x, y, -np.cos(polar)], axis=-1)
    points[ring == rings, 2] = -math.cos(top) if top < 0.5 * math.pi else 0.0
    return SurfaceMesh.of_one_part(points, disc_triangles(rings, 4), "hull")


def _belt(lower: SurfaceMesh, top: float, radius: float, panel_size: float) -> list[SurfaceMesh]:
    """Unit sphere from the equator up to `top`, with as many points a ring as the cap's rim."""
    if top <= 0.5 * math.pi:
        return []
    around = int(np.count_nonzero(lower.points[:, 2] == 0.0))
    layers = max(1, round(radius * (top - 0.5 * math.pi) / panel_size))
    polar, turn = np.meshgrid(
        np.linspace(0.5 * math.pi, top, layers + 1),
        2.0 * np.pi * np.arange(around + 1) / around,
        indexing="ij",
    )
    height = -np.cos(polar)
    height[0] = 0.0
    points = np.stack([np.sin(polar) * np.cos(turn), np.sin(polar) * np.sin(turn), height], axis=-1)
    return [_mirrored_in_quarters(points, layers, around).flipped()]


def _filled_out(unit: SurfaceMesh, top: float) -> SurfaceMesh:
    """Move points of a unit sphere out, to the waterplane and volume of the round one."""
    exact = math.pi * (2.0 / 3.0 - math.cos(top) + math.cos(top) ** 3 / 3.0)
    level = -math.cos(top)
    points = unit.points.copy()
    rim = np.zeros(len(points), dtype=bool)
    if top < math.pi:
        rim = points[:, 2] == points[:, 2].max()
        points[rim, :2] *= polygon_radius(1.0, int(rim.sum()))
    for _ in range(40):  # the volume goes nearly with the cube, so each round gains a digit
        points[~rim] *= (exact / _volume_under(unit.with_points(points), level)) ** (1.0 / 3.0)
    missed = abs(_volume_under(unit.with_points(points), level) / exact - 1.0)
    if not missed < 1e-10:
        raise InputError(
            f"the panels of a sphere could not be given its volume, {missed:.2g} of it is missing, "
            "expected below 1e-10: give the body a smaller panel_size"
        )
    return unit.with_points(points)


def _volume_under(mesh: SurfaceMesh, level: float) -> float:
    """Volume between the surface and the plane z = level (normals inward)."""
    return -float(np.sum((mesh.centroids[:, 2] - level) * mesh.area_vectors[:, 2]))


def _mirrored_in_quarters(points: FloatArray, rows: int, columns: int) -> SurfaceMesh:
    """Grid round an upright body whose diagonals mirror each other in x = 0 and y = 0."""
    quarter = np.arange(columns) // (columns // 4 or 1)
    odd = np.broadcast_to(quarter % 2 == 1, (rows, columns))
    return SurfaceMesh.of_one_part(points, grid_triangles(rows, columns, odd), "hull")


def _plane(
    corner: list[float],
    u: list[float],
    v: list[float],
    columns: int,
    rows: int,
    *,
    quadrants: bool = False,
) -> SurfaceMesh:
    """A flat rectangle with normal u x v; diagonals mirror about its middle line(s)."""
    t, s = np.meshgrid(
        np.linspace(0.0, 1.0, rows + 1), np.linspace(0.0, 1.0, columns + 1), indexing="ij"
    )
    points = np.array(corner) + s[..., None] * np.array(u) + t[..., None] * np.array(v)
    right: BoolArray = np.broadcast_to(np.arange(columns) >= columns // 2, (rows, columns))
    upper: BoolArray = np.broadcast_to(np.arange(rows)[:, None] >= rows // 2, (rows, columns))
    diagonal = right ^ upper if quadrants else right
    return SurfaceMesh.of_one_part(points, grid_triangles(rows, columns, diagonal), "hull")


def _sewn(patches: list[SurfaceMesh]) -> SurfaceMesh:
    """Join patches that were computed to meet."""
    mesh = joined(patches)
    return weld(mesh, 1e-9 * extent(mesh.points))[0]


def _positive(*, form: str, **values: float) -> None:
    for key, value in values.items():
        if not (value > 0.0 and math.isfinite(value)):
            raise InputError(f"{form}: {key} = {value} given, a length above zero in metres wanted")
    check_count(max(values.values()) ** 2, values["panel_size"], f"{form}: panel_size")
