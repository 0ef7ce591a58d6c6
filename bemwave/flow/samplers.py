"""Velocity and pressure of the solved field at fixed points, as linear maps built once.

Inside the water the representation formula gives both from potentials and fluxes on the boundary.
Within one panel of the surface its uniform vortex sheets would show as steps; there the field is
the parabola in z that has the recovered value and slope at z = 0 and the formula's value one
panel down, an error below (k d)^3 / 40 of the local amplitude for panels d.  Within a panel of a
hull or a meshed wall the field is only first order.
"""

from __future__ import annotations

import numpy as np
import numpy.typing as npt
from scipy import sparse

from bemwave.errors import InputError
from bemwave.flow.elements import Elements, hat_curls, split
from bemwave.flow.images import Images, Mirror, make_images
from bemwave.flow.lattice import potentials
from bemwave.flow.recovery import Recovery, recover
from bemwave.flow.state import SurfaceState
from bemwave.geometry.surface_mesh import SurfaceMesh
from bemwave.kernels.points import potential_at, velocity_at

Array = npt.NDArray[np.float64]
Ints = npt.NDArray[np.int64]

BLOCK = 256  # points for which influences are held at a time while maps are folded


class PanelSamplers:
    """Makes samplers for one boundary mesh; needs none of the dense matrices.

    Parameters
    ----------
    mesh, depth, closed, mirrors : as for `PanelFlow`.
    density : kg/m^3, for pressures.
    """

    def __init__(
        self,
        mesh: SurfaceMesh,
        depth: float,
        *,
        closed: bool,
        mirrors: tuple[Mirror, ...] = (),
        density: float = 1025.0,
    ) -> None:
        self.elements = split(mesh, closed, mirrors, depth)
        span = float(np.ptp(mesh.points[:, :2], axis=0).max())
        self.images = make_images(depth, not closed, mirrors, span)
        self.depth, self.closed, self.density = depth, closed, density

    def sampler(self, points: Array) -> PointSampler:
        """A sampler of velocity and pressure at points (n, 3), z <= 0.

        Raises
        ------
        InputError : if a point is above still water.
        """
        return PointSampler(self, under_water(points))

    def surface_sampler(self, xy: Array) -> SurfaceSampler:
        """A sampler of the surface at places xy (n, 2)."""
        return SurfaceSampler(self.recovery(np.asarray(xy, dtype=np.float64).reshape(-1, 2)))

    def recovery(self, xy: Array) -> Recovery:
        """Local polynomial fits of the surface's fields at places xy (n, 2)."""
        return recover(self.elements, xy, self.images)


def under_water(points: Array) -> Array:
    """The points (n, 3), refused if one is above still water."""
    points = np.asarray(points, dtype=np.float64).reshape(-1, 3)
    if (points[:, 2] > 0.0).any():
        raise InputError(
            f"a point at z = {points[:, 2].max():g} was given; the solved field is sampled at "
            "z <= 0: above still water use a crest rule"
        )
    return points


class SurfaceSampler:
    """The solved surface at fixed places."""

    def __init__(self, recovery: Recovery) -> None:
        self._at = recovery

    def elevation(self, state: SurfaceState) -> Array:
        """(n,) [m]."""
        return np.asarray(self._at.value @ state.elevation)

    def elevation_rate(self, state: SurfaceState) -> Array:
        """(n,) vertical velocity of the surface [m/s]."""
        return np.asarray(self._at.value @ state.surface_flux)

    def elevation_acceleration(self, state: SurfaceState) -> Array:
        """(n,) vertical acceleration of the surface [m/s^2]."""
        return np.asarray(self._at.value @ state.surface_flux_rate)

    def velocity(self, state: SurfaceState) -> Array:
        """(n, 3) at z = 0 [m/s]."""
        at = self._at
        return np.column_stack(
            [at.dx @ state.potential, at.dy @ state.potential, at.value @ state.surface_flux]
        )

    def velocity_slope(self, state: SurfaceState) -> Array:
        """(n, 3) d(velocity)/dz at z = 0 [1/s]; by Laplace's equation from the surface alone."""
        at = self._at
        return np.column_stack(
            [
                at.dx @ state.surface_flux,
                at.dy @ state.surface_flux,
                -(at.laplacian @ state.potential),
            ]
        )


class PointSampler:
    """The solved field at fixed points."""

    def __init__(self, samplers: PanelSamplers, points: Array) -> None:
        self._samplers = samplers
        self._points = points
        columns, column = np.unique(points[:, :2], axis=0, return_inverse=True)
        column = column.ravel()
        recovery = samplers.recovery(columns)
        strip = np.minimum(recovery.spacing, 0.5 * samplers.depth)[column]
        shallow = points[:, 2] > -strip
        used = np.unique(column[shallow])
        below = np.column_stack([columns[used], -strip_of(recovery, samplers.depth)[used]])
        self._places = np.vstack([points[~shallow], below])
        s = -points[:, 2] / strip
        share = np.where(shallow, s**2, 1.0)
        row = np.empty(len(points), dtype=np.int64)
        row[~shallow] = np.arange((~shallow).sum())
        row[shallow] = (~shallow).sum() + np.searchsorted(used, column[shallow])
        index = np.arange(len(points))
        self._mix = sparse.csr_matrix((share, (index, row)), shape=(len(points), len(self._places)))
        pick = sparse.csr_matrix(
            (np.ones(len(points)), (index, column)), shape=(len(points), len(columns))
        )
        height = sparse.diags(np.where(shallow, 1.0 - s**2, 0.0)) @ pick
        slope = sparse.diags(np.where(shallow, points[:, 2] + strip * s**2, 0.0)) @ pick
        self._by_value = (height @ recovery.value, height @ recovery.dx, height @ recovery.dy)
        self._by_slope = (
            slope @ recovery.value,
            slope @ recovery.dx,
            slope @ recovery.dy,
            -(slope @ recovery.laplacian),
        )
        self._velocity_maps: tuple[Array, ...] | None = None
        self._potential_maps: tuple[Array, ...] | None = None

    def velocity(self, state: SurfaceState) -> Array:
        """(n, 3) [m/s]."""
        if self._velocity_maps is None:
            self._velocity_maps = _maps(self._samplers, self._places, 3)
        inner = _apply(
            self._velocity_maps,
            (state.potential, state.hull_potential, state.surface_flux, state.hull_flux),
        ).reshape(-1, 3)
        result: Array = self._mix @ inner
        value, dx, dy = self._by_value
        _, slope_dx, slope_dy, slope_dz = self._by_slope
        result[:, 0] += dx @ state.potential + slope_dx @ state.surface_flux
        result[:, 1] += dy @ state.potential + slope_dy @ state.surface_flux
        result[:, 2] += value @ state.surface_flux + slope_dz @ state.potential
        return result

    def pressure(self, state: SurfaceState) -> Array:
        """(n,) dynamic pressure -rho d(phi)/dt [Pa]."""
        if self._potential_maps is None:
            self._potential_maps = _maps(self._samplers, self._places, 1)
        inner = _apply(
            self._potential_maps,
            (
                state.potential_rate,
                state.hull_potential_rate,
                state.surface_flux_rate,
                state.hull_flux_rate,
            ),
        )
        rate = self._mix @ inner + self._by_value[0] @ state.potential_rate
        rate += self._by_slope[0] @ state.surface_flux_rate
        return np.asarray(-self._samplers.density * rate)


def strip_of(recovery: Recovery, depth: float) -> Array:
    """Depth of the strip under the surface in which fields are interpolated [m]."""
    return np.minimum(recovery.spacing, 0.5 * depth)


def _apply(maps: tuple[Array, ...], values: tuple[Array, ...]) -> Array:
    """Sum of map times value over (surface and hull potential, surface flux, hull flux)."""
    nodes, water, hull = maps
    result: Array = nodes @ np.concatenate(values[:2])
    if water.size:
        result += water @ values[2]
    if hull.size:
        result += hull @ values[3]
    return result


def _maps(samplers: PanelSamplers, points: Array, components: int) -> tuple[Array, ...]:
    """The representation formula at points: maps of nodal potential, surface and hull flux."""
    e, closed = samplers.elements, samplers.closed
    means = _corner_means(e)
    rows = components * len(points)
    nodes = np.zeros((rows, e.nodes))
    water = np.empty((rows, e.free if closed else 0))
    hull = np.empty((rows, len(e.hull)))
    # in open water flux through the surface has no effect of its own: G vanishes there
    at_surface = samplers.images if closed else samplers.images.of_surface_dipoles()
    sheets = (
        (e.water, e.water_table, at_surface),
        (e.hull, e.hull_table, samplers.images),
    )
    for start in range(0, len(points), BLOCK):
        part = np.ascontiguousarray(points[start : start + BLOCK])
        at = slice(components * start, components * (start + len(part)))
        for corners, table, images in sheets:
            single, double = influences(e.points, corners, table, images, part, components)
            nodes[at] += double[:, : e.nodes]
            if corners is e.hull:
                hull[at] = single
            elif closed:
                water[at] = (means.T @ single.T).T
    return nodes, water, hull


def influences(
    nodes: Array, corners: Ints, table: Array, images: Images, points: Array, components: int
) -> tuple[Array, Array]:
    """Of triangles at points: (rows, m) of unit flux, (rows, nodes) of unit potentials."""
    vertices = nodes[corners].reshape(-1, 3, 3)
    around = (images.signs, images.shifts, images.weights)
    rows = components * len(points)
    if components == 3:
        curls = hat_curls(vertices, table)
        single, double = velocity_at(points, table, corners, curls, len(nodes), *around)
    else:
        single, double = potential_at(points, table, corners, len(nodes), *around)
        of_flux, of_dipoles = potentials(images.beyond, vertices, table[:, 9:12])
        single += of_flux
        far = np.zeros(len(nodes))
        np.add.at(far, corners, of_dipoles)
        double += far
    return single.reshape(rows, -1), double.reshape(rows, -1)


def _corner_means(e: Elements) -> sparse.csr_matrix:
    """(mF, free) from nodal flux to each water triangle's mean."""
    rows = np.repeat(np.arange(len(e.water)), 3)
    full = sparse.csr_matrix(
        (np.full(3 * len(e.water), 1 / 3), (rows, e.water.ravel())),
        shape=(len(e.water), len(e.points)),
    )
    return full[:, : e.free]
