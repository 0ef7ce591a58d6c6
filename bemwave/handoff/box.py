"""Where the field is handed over: the points of a box, of its transition zone, of a list.

A box's faces are cut in cells; the points are the cells' centres. Still water (z = 0) is always an
edge between cells, so that the flux up to it is a sum over whole cells.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, fields

import numpy as np
from numpy.typing import ArrayLike, NDArray

Array = NDArray[np.float64]
Ints = NDArray[np.int64]

FACES = ("x_min", "x_max", "y_min", "y_max", "bottom", "top", "zone", "free")
BOX_FACES = FACES[:6]
ZONE, FREE = FACES.index("zone"), FACES.index("free")


@dataclass(frozen=True)
class Box:
    """A hand-off box on earth.

    Attributes
    ----------
    centre, size : m, in plan; `size` along the box's own x and y.
    angle : rad, of the box's x axis from earth's, counter-clockwise.
    bottom, top : m, levels.
    spacing : m, largest cell (horizontal, vertical).
    zone : m, width of the transition zone inside the four sides.
    """

    centre: tuple[float, float]
    size: tuple[float, float]
    angle: float
    bottom: float
    top: float
    spacing: tuple[float, float]
    zone: float = 0.0

    @property
    def area(self) -> float:
        """Area in plan, m2."""
        return self.size[0] * self.size[1]

    def to_earth(self, plan: ArrayLike) -> Array:
        """Turn plan coordinates in the box's own axes (..., 2) into those on earth."""
        return np.asarray(plan) @ turn(self.angle).T + self.centre

    def to_box(self, plan: ArrayLike) -> Array:
        """Turn plan coordinates on earth (..., 2) into those in the box's own axes."""
        return (np.asarray(plan) - self.centre) @ turn(self.angle)


@dataclass(frozen=True)
class PointSet:
    """Points of a hand-off, on earth.

    Attributes
    ----------
    points, normals : (n, 3); normals point out of the box and are zero where there is no face.
    face : (n,) index in `FACES`.
    area : (n,) m2 of the face's cell; 0 without a face.
    height : (n,) m of the cell; 0 where the point stands for itself alone.
    zone_weight : (n,) 0 inside .. 1 at the sides.
    columns : (m, 2) the distinct (x, y), m.
    column : (n,) each point's column.
    """

    points: Array
    normals: Array
    face: Ints
    area: Array
    height: Array
    zone_weight: Array
    columns: Array
    column: Ints


def turn(angle: float) -> Array:
    """Rotation by `angle`, rad, counter-clockwise in plan, (2, 2)."""
    cos, sin = math.cos(angle), math.sin(angle)
    return np.array([[cos, -sin], [sin, cos]])


def box_points(box: Box) -> PointSet:
    """Cell centres of the six faces, then those of the transition zone where there is one."""
    xs, ys, zs = cell_edges(box)
    side = [_face(index, xs, ys, zs) for index in range(6)]
    if box.zone > 0:
        volume = _volume(xs, ys, zs)
        weight = _zone_weight(box, volume.centres)
        side.append(volume.keep(weight > 0))
    return _point_set(box, side)


def box_volume(box: Box) -> PointSet:
    """Cell centres of the whole box."""
    return _point_set(box, [_volume(*cell_edges(box))], FREE)


def free_points(points: ArrayLike) -> PointSet:
    """Points as they were given, (n, 3), on earth."""
    given = np.array(points, dtype=np.float64).reshape(-1, 3)
    columns, column = _columns(given[:, :2])
    nothing = np.zeros(len(given))
    return PointSet(
        points=given,
        normals=np.zeros_like(given),
        face=np.full(len(given), FREE),
        area=nothing,
        height=nothing,
        zone_weight=nothing,
        columns=columns,
        column=column,
    )


def cell_edges(box: Box) -> tuple[Array, Array, Array]:
    """Edges of the box's cells along its own x, y and z, m; z = 0 is one of them."""
    x, y = (_edges(-0.5 * s, 0.5 * s, box.spacing[0]) for s in box.size)
    levels = _edges(box.bottom, min(box.top, 0.0), box.spacing[1])
    if box.bottom < 0.0 < box.top:
        levels = np.concatenate([levels, _edges(0.0, box.top, box.spacing[1])[1:]])
    return x, y, levels


def _edges(low: float, high: float, spacing: float) -> Array:
    cells = max(1, math.ceil((high - low) / spacing - 1e-9))
    return np.linspace(low, high, cells + 1)


@dataclass(frozen=True)
class _Cells:
    """Cells in the box's own axes; the attributes are those of `PointSet`."""

    centres: Array
    normals: Array
    face: Ints
    area: Array
    height: Array

    def keep(self, chosen: NDArray[np.bool_]) -> _Cells:
        return _Cells(*(getattr(self, f.name)[chosen] for f in fields(self)))


def _face(index: int, xs: Array, ys: Array, zs: Array) -> _Cells:
    """Cells of one face in the box's own axes."""
    axis, far = divmod(index, 2)
    edges = [xs, ys, zs]
    lines = [0.5 * (e[1:] + e[:-1]) for e in edges]
    lines[axis] = edges[axis][-1:] if far else edges[axis][:1]
    widths = [np.diff(e) for e in edges]
    widths[axis] = np.ones(1)
    centres, (wx, wy, wz) = _lattice(lines), _lattice(widths).T
    normals = np.zeros_like(centres)
    normals[:, axis] = 1.0 if far else -1.0
    height = wz if axis < 2 else np.zeros(len(centres))
    return _Cells(centres, normals, np.full(len(centres), index), wx * wy * wz, height)


def _volume(xs: Array, ys: Array, zs: Array) -> _Cells:
    centres = _lattice([0.5 * (e[1:] + e[:-1]) for e in (xs, ys, zs)])
    height = _lattice([np.diff(e) for e in (xs, ys, zs)])[:, 2]
    nothing = np.zeros(len(centres))
    return _Cells(centres, np.zeros_like(centres), np.full(len(centres), ZONE), nothing, height)


def _lattice(lines: list[Array]) -> Array:
    return np.stack([g.ravel() for g in np.meshgrid(*lines, indexing="ij")], axis=1)


def _zone_weight(box: Box, local: Array) -> Array:
    """(1 - s)^2 with s the distance inside the nearest side over the zone's width."""
    half = 0.5 * np.asarray(box.size)
    inside = np.maximum((half - np.abs(local[:, :2])).min(axis=1), 0.0)
    if box.zone == 0.0:
        return np.where(inside <= 1e-9 * half.min(), 1.0, 0.0)
    weight: Array = np.maximum(1.0 - inside / box.zone, 0.0) ** 2
    return weight


def _point_set(box: Box, cells: list[_Cells], face: int | None = None) -> PointSet:
    local, normals, faces, area, height = (
        np.concatenate([getattr(c, f.name) for c in cells]) for f in fields(_Cells)
    )
    columns, column = _columns(local[:, :2])
    return PointSet(
        points=np.column_stack([box.to_earth(local[:, :2]), local[:, 2]]),
        normals=np.column_stack([normals[:, :2] @ turn(box.angle).T, normals[:, 2]]),
        face=faces if face is None else np.full(len(local), face),
        area=area,
        height=height,
        zone_weight=_zone_weight(box, local),
        columns=box.to_earth(columns),
        column=column,
    )


def _columns(plan: Array) -> tuple[Array, Ints]:
    """Distinct (x, y), to a micrometre, and which of them each point stands in."""
    _, first, column = np.unique(np.round(plan, 6), axis=0, return_index=True, return_inverse=True)
    distinct: Array = plan[first]
    return distinct, column.reshape(-1)
