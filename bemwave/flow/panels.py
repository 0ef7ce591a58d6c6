"""Route "panels": mixed symmetric Galerkin boundary elements, dense.

The potential is linear on the whole boundary, the flux uniform per triangle.  With G the Green's
function with its images, V its single layer, K its double layer, D its hypersingular form
(through curls, so that only V is ever integrated: Steinbach 2008, Numerical Approximation Methods
for Elliptic Boundary Value Problems, ch. 6), M the shares of hats in triangles, and normals out of
the water, the water's energy is the quadratic form

    Q = D + R' V_FF^-1 R,   R = M/2 + K on F      (closed water: the flux on F is an unknown)
    Q = D                                          (open water: G vanishes on z = 0)

in all nodes, and a given flux q_B on hulls and walls enters through

    N = (K_B - M_B/2)' - R' V_FF^-1 V_FB           (the last term in closed water only).

Hull nodes b follow the surface nodes f from Q_bb phi_b = -Q_bf phi_f - N_b q_B, and what is left
is the flow map M_F d(eta)/dt = S phi_f + C q_B, with S the Schur complement of Q_bb: symmetric
and positive semi-definite on any mesh, hence no growing mode and no need of smoothing.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence

import numpy as np
import numpy.typing as npt
from scipy import linalg, sparse

from bemwave.errors import RunError
from bemwave.flow.elements import Elements, solver_of, split
from bemwave.flow.exact import exact_map, fastest_frequency
from bemwave.flow.images import Images, Mirror, make_images
from bemwave.flow.lattice import curl_moments
from bemwave.geometry.surface_mesh import SurfaceMesh
from bemwave.kernels import panels as kernel

Array = npt.NDArray[np.float64]

BLOCK = 256  # rows of a layer that are copied at a time


class PanelFlow:
    """The flow map of one boundary mesh, factored once.

    Parameters
    ----------
    mesh : the whole boundary, part "water" at z = 0; see `geometry.boundary_mesh`.
    depth : m, or math.inf.
    closed : whether meshed walls (or mirrors) close the water all round.
    mirrors : straight walls that are not meshed.
    progress : called with the share of the work done, 0 to 1.

    Attributes
    ----------
    elements : the mesh cut into F and B, nodes renumbered.
    mass : (free, free) sparse M_F [m^2].
    surface_matrix : (free, free) S [m].
    hull_flux_matrix : (free, mB) C [m^2].
    """

    def __init__(
        self,
        mesh: SurfaceMesh,
        depth: float,
        *,
        closed: bool,
        mirrors: tuple[Mirror, ...] = (),
        progress: Callable[[float], None] = lambda share: None,
    ) -> None:
        self.mesh = mesh
        self.depth = depth
        self.closed = closed
        self.mirrors = mirrors
        self.elements = split(mesh, closed, mirrors, depth)
        span = float(np.ptp(mesh.points[:, :2], axis=0).max())
        self.images = make_images(depth, not closed, mirrors, span)
        self.mass = self.elements.mass
        self._solve_mass = solver_of(self.mass)
        energy, given = forms(self.elements, self.images, closed, progress)
        self._eliminate_hull(energy, given)
        progress(1.0)

    def _eliminate_hull(self, energy: Array, given: Array) -> None:
        f = self.elements.free
        factor = _cholesky(energy[f:, f:], "hull")
        to_surface = linalg.solve_triangular(factor, energy[f:, :f], lower=True)
        to_flux = linalg.solve_triangular(factor, given[f:], lower=True)
        self.surface_matrix: Array = energy[:f, :f] - to_surface.T @ to_surface
        self.hull_flux_matrix: Array = given[:f] - to_surface.T @ to_flux
        self._hull_from_surface = -linalg.solve_triangular(factor, to_surface, lower=True, trans=1)
        self._hull_from_flux = -linalg.solve_triangular(factor, to_flux, lower=True, trans=1)

    def surface_flux(self, potential: Array, hull_flux: Array) -> Array:
        """Vertical velocity of the surface, (free,) or (free, k) [m/s]."""
        load = self.surface_matrix @ potential + self.hull_flux_matrix @ hull_flux
        result: Array = self._solve_mass(load)
        return result

    def hull_potential(self, potential: Array, hull_flux: Array) -> Array:
        """Potential at hull and wall nodes, (below,) or (below, k) [m^2/s]."""
        result: Array = self._hull_from_surface @ potential + self._hull_from_flux @ hull_flux
        return result

    def both(self, potential: Array, hull_flux: Array) -> tuple[Array, Array]:
        """`surface_flux` and `hull_potential`."""
        return self.surface_flux(potential, hull_flux), self.hull_potential(potential, hull_flux)

    def solve_mass(self, load: Array) -> Array:
        """M_F^-1 load."""
        result: Array = self._solve_mass(load)
        return result

    @property
    def places(self) -> Array:
        """(free, 2) where the surface's values stand [m]."""
        return self.elements.points[: self.elements.free, :2]

    @property
    def hull_places(self) -> Array:
        """(below, 3) where the hulls' and walls' values stand [m]."""
        return self.elements.points[self.elements.free : self.elements.nodes]

    def at_nodes(self, surface: Array, hull: Array) -> Array:
        """A field of the surface and of hulls and walls, at the nodes of `elements`."""
        return np.concatenate([surface, hull])

    def nodal(self, height: Callable[[Array], Array]) -> Array:
        """(free,) values whose hats are nearest to a function of places (n, 2)."""
        e = self.elements
        load = np.zeros(len(e.points))
        corners = e.points[e.water, :2]
        for rule in kernel.SEVEN:
            values = height(np.einsum("j,mjc->mc", rule[:3], corners))
            for j in range(3):
                share = e.water_table[:, 28] * rule[3] * rule[j]
                np.add.at(load, e.water[:, j], share * values)
        return self.solve_mass(load[: e.free])

    def damping(self, rate: Callable[[Array], Array]) -> sparse.csc_matrix:
        """(free, free) int rate hat hat, of a rate [1/s] at places (n, 2)."""
        return self.elements.weighted_mass(rate(self.elements.water_table[:, 24:26]))

    def asymmetry(self) -> float:
        """Largest difference across the flow map's diagonal over its largest entry."""
        matrix = self.surface_matrix
        rows = [slice(start, start + 256) for start in range(0, len(matrix), 256)]
        largest = max(np.abs(matrix[row]).max() for row in rows)
        return float(max(np.abs(matrix[row] - matrix[:, row].T).max() for row in rows) / largest)

    def fastest(self, gravity: float) -> float:
        """The largest angular frequency of free waves on the mesh [rad/s]."""
        return fastest_frequency(self.surface_matrix, self.solve_mass, gravity)

    def march(
        self, gravity: float, step: float, damping: sparse.csc_matrix | None = None
    ) -> PanelMarch:
        """Steps of a length [s], exact in time."""
        return PanelMarch(self, gravity, step, damping)


class PanelMarch:
    """The surface flux of a step, averaged over it so that leapfrog is exact for free waves.

    See `exact.exact_map`; what is given is averaged to the fourth order, f - (g dt^2/12) A f.
    """

    def __init__(
        self, flow: PanelFlow, gravity: float, step: float, damping: sparse.csc_matrix | None
    ) -> None:
        self._flow, self._damping = flow, damping
        self._map = exact_map(flow.surface_matrix, flow.solve_mass, gravity, step)
        self._given_map = flow.solve_mass(flow.hull_flux_matrix)
        self._late = gravity * step**2 / 12.0
        if damping is not None:
            self._solve = solver_of(sparse.csc_matrix(flow.mass + 0.5 * step * damping))

    def given(self, fluxes: Sequence[Array]) -> Array:
        """(times, ...) to be passed on to `flux`, of the given flux (mB, times) of each part."""
        return np.stack([(self._given_map @ flux).T for flux in fluxes], axis=2)

    def flux(self, potential: Array, given: Array) -> Array:
        """(free, parts) from the potential in the middle of a step."""
        moving = potential - self._late * given
        # part by part: libraries are slow at products with two or three columns
        return np.column_stack([self._map @ part for part in moving.T]) + given

    def damped(self, flux: Array, mean: Array) -> Array:
        """Rate of the step's mean elevation: the flux less what the absorber takes, old and new."""
        if self._damping is None:
            return flux
        return np.asarray(self._solve(self._flow.mass @ flux - self._damping @ mean))


def _cholesky(matrix: Array, where: str) -> Array:
    try:
        factor: Array = linalg.cholesky(matrix, lower=True) if len(matrix) else matrix
    except linalg.LinAlgError as fault:
        raise RunError(
            f"the influence matrix of the {where} is not positive definite ({fault}); "
            "its panels are probably folded or far too thin: remesh it"
        ) from fault
    return factor


def _single_layers(targets: Array, sources: Array, images: tuple[Array, Array, Array]) -> _Columns:
    """One single layer per column of the images' weights, columns that agree computed once."""
    signs, shifts, weights = images
    unique, back = np.unique(weights, axis=1, return_inverse=True)
    unique = np.ascontiguousarray(unique)
    if targets is sources:
        layers = kernel.single_layer_self(targets, signs, shifts, unique)
    else:
        layers = kernel.single_layer(targets, sources, signs, shifts, unique)
    return _Columns(layers, back.ravel())


class _Columns:
    """Layers by weight column, without copies for columns that agree."""

    def __init__(self, layers: Array, back: npt.NDArray[np.int64]) -> None:
        self.layers, self.back = layers, back

    def __getitem__(self, k: int) -> Array:
        layer: Array = self.layers[self.back[k]]
        return layer


def forms(
    e: Elements,
    images: Images,
    closed: bool = False,
    progress: Callable[[float], None] = lambda share: None,
) -> tuple[Array, Array]:
    """Q (nodes, nodes) and N (nodes, mB) of elements."""
    water, hull = e.water_table, e.hull_table
    curl_f, curl_b = e.curls(e.water, water), e.curls(e.hull, hull)
    weights = np.column_stack([images.curl_weights, images.weights])
    flat = weights[:, [0, 1, 3] if closed else [0, 1]]  # curls on still water are horizontal

    layers = _single_layers(water, water, images.seen_from_surface(flat, True))
    energy = _sandwich(curl_f[0], layers[0], curl_f[0])
    energy += _sandwich(curl_f[1], layers[1], curl_f[1])
    factor = _cholesky(layers[2], "water surface") if closed else None
    del layers
    progress(0.4)
    layers = _single_layers(water, hull, images.seen_from_surface(flat, False))
    mixed = _sandwich(curl_f[0], layers[0], curl_b[0])
    mixed += _sandwich(curl_f[1], layers[1], curl_b[1])
    energy += mixed + mixed.T
    across = layers[2] if closed else None
    sunken = e.sunken()
    columns = weights[:, :4] if len(sunken) else weights[:, :3]
    layers = _single_layers(hull, hull, (images.signs, images.shifts, columns))
    for axis in (0, 1, 2):
        energy += _sandwich(curl_b[axis], layers[axis], curl_b[axis])
    made = sunken @ layers[3] if len(sunken) else np.zeros((0, len(hull)))
    del layers
    _add_images_left_out(energy, e, images, (curl_f, curl_b))
    progress(0.7)
    double = _double_layer(e, hull, images, closed)
    half = 0.5 * e.shares(e.hull, hull).toarray()
    given = (double - half).T
    level = sunken @ (double + half)
    if factor is not None and across is not None:
        share = e.shares(e.water, water)
        row = _double_layer(e, water, images, closed) + 0.5 * share
        inner = linalg.solve_triangular(factor, row, lower=True, overwrite_b=True)
        other = linalg.solve_triangular(factor, across, lower=True)
        energy += inner.T @ inner
        given -= inner.T @ other
        level -= (sunken @ other.T) @ inner
        made = made - (sunken @ other.T) @ other
    _fix_constants(energy, given, level, made)
    return energy, np.ascontiguousarray(given)


def _fix_constants(energy: Array, given: Array, level: Array, made: Array) -> None:
    """Set the mean potential of bodies wholly under water, which Q leaves free.

    On a closed surface curls do not see a constant. The first of the boundary's two equations does:
    its integral over body i, level_i phi = made_i q, joins the energy as a square. At the solution
    it is zero, so that nothing else changes.

    Parameters
    ----------
    energy, given : Q and N, changed in place; N as (nodes, mB).
    level, made : (bodies, nodes) and (bodies, mB).
    """
    for left, right in zip(level, made, strict=True):
        weight = np.trace(energy) / len(energy) / (left @ left) * np.count_nonzero(left)
        energy += weight * np.outer(left, left)
        given -= weight * np.outer(left, right)


def _add_images_left_out(
    energy: Array, e: Elements, images: Images, curls: tuple[list[sparse.csr_matrix], ...]
) -> None:
    """Without them waves beside mirrors are wrong by what a cut through the lattice lets past."""
    beyond = images.beyond
    for axis in np.flatnonzero(beyond.fourth):
        moment = np.zeros(e.nodes)
        for corners, curl in zip((e.water, e.hull), curls, strict=True):
            triangles = e.points[corners].reshape(-1, 3, 3)
            moment += curl[axis].T @ curl_moments(beyond, triangles)[:, axis]
        energy += beyond.fourth[axis] * np.outer(moment, moment)


def _sandwich(left: sparse.csr_matrix, layer: Array, right: sparse.csr_matrix) -> Array:
    """left' layer right, dense; by blocks of rows, for scipy copies what it is given transposed."""
    half = np.empty((len(layer), right.shape[1]))
    for start in range(0, len(layer), BLOCK):
        rows = slice(start, start + BLOCK)
        half[rows] = (right.T @ layer[rows].T).T
    product: Array = left.T @ half
    return product


def _double_layer(e: Elements, targets: Array, images: Images, closed: bool) -> Array:
    """K of all linear potentials, tested on the targets: (len(targets), nodes)."""
    corners = np.vstack([e.water, e.hull])
    sources = np.vstack([e.water_table, e.hull_table])
    layer: Array = kernel.double_layer(
        targets, sources, corners, len(e.points), images.signs, images.shifts, images.weights
    )
    layer = np.asarray(layer[:, : e.nodes])
    if closed:
        # a uniform potential in closed water has K = -1/2: give what quadrature and cut-off
        # images miss to all nodes as the dipole moment of each, which is what is missing
        missing = -0.5 * targets[:, 28] - layer.sum(axis=1)
        upward = np.zeros(e.nodes)
        np.add.at(upward, corners.ravel(), np.repeat(sources[:, 28] * sources[:, 11] / 3.0, 3))
        layer += np.outer(missing, upward / upward.sum())
    return layer
