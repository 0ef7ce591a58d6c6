"""Route "grid": open water by FFT, hulls by symmetric Galerkin panels on the half-space kernel.

The surface's potential f lives on a uniform grid, continued through waterplanes. Its harmonic
extension phi_s has the vertical velocity A f = IFFT[k tanh(kh) f^]: no numerical dispersion. It is
taken off again where hulls are: with u the potential of the closed surface of hulls and waterplanes
(hats, normals into the bodies), the field is that of the double layers of f and u and the single
layer of the hull's given flux q, and its energy

    E = 1/2 <f, A f> - u' G f + 1/2 u' D u + q' N' u - q' P f

with D, N as on route "panels", G f the flux of phi_s out of the bodies tested with hats, and P f
its potential over panels. On the waterline u is f; elsewhere it is where E is stationary, and then
nothing is left of f inside the bodies. The flow map is the derivative of E after f, tested on the
water alone:

    M d(eta)/dt = X' (A f - G' u + ...),    f = X phi,    M = X' (1 - waterplanes) X

X being the continuation of the nodes' values. S = X' E'' X is symmetric and M positive definite, so
no mode of the water can grow, whatever hulls there are; where E is positive no wave is imaginary.
For that, what quadrature beside waterlines makes of a potential that is the same all over, which
moves nothing, is kept out of S by X' and X alike; so the surface rises by what hulls displace.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence

import numpy as np
import numpy.typing as npt
from scipy import linalg, sparse

from bemwave.flow.coupling import Coupling
from bemwave.flow.elements import Elements, solver_of
from bemwave.flow.images import make_images
from bemwave.flow.panels import forms
from bemwave.flow.sheet import Complex, Sheet
from bemwave.flow.waterplane import Continuation
from bemwave.geometry.surface_mesh import SurfaceMesh
from bemwave.geometry.waterplane import WATERPLANE
from bemwave.kernels.panels import SEVEN

Array = npt.NDArray[np.float64]


class GridFlow:
    """The flow map of a grid with hulls in it.

    Fields are (nx ny, k), continued through waterplanes; what is given for them comes so, and so
    they are returned.

    Parameters
    ----------
    sheet : the grid, absorber included; its depth is the water's.
    bodies : the closed surfaces of hulls and waterplanes (`geometry.waterplane.closed_bodies`);
        None where there are none.
    waterlines : for each body that pierces the surface its waterlines, (k, 2) [m].
    progress : called with the share of the work done, 0 to 1.

    Attributes
    ----------
    elements : of the closed surfaces: `water` the waterplanes, `hull` the hulls.
    """

    def __init__(
        self,
        sheet: Sheet,
        bodies: SurfaceMesh | None = None,
        waterlines: Sequence[Sequence[Array]] = (),
        progress: Callable[[float], None] = lambda share: None,
    ) -> None:
        self.sheet = sheet
        self.elements = body_elements(bodies)
        self.continuation = Continuation(sheet, waterlines)
        self._area = sheet.spacing**2
        if self.elements.nodes:
            self._coupling = _Bodies(sheet, self.elements, progress)
        self.mass = sparse.csr_matrix(self._area * sparse.identity(sheet.size, format="csr"))
        if waterlines:
            self.mass = sparse.csr_matrix(self.mass - self._coupling.dry_mass)
            self._make_mass(self.continuation)

    def _make_mass(self, continuation: Continuation) -> None:
        """Factor M where it is not a multiple of one."""
        ruled = np.unique(continuation.map.indices)
        dry = self._coupling.dry_mass
        touched = np.union1d(ruled, np.unique(dry.indices))
        rows = np.union1d(touched, np.flatnonzero(continuation.inside))
        self._near = np.setdiff1d(touched, np.flatnonzero(continuation.inside))
        spread = sparse.identity(self.sheet.size, format="csr")[rows][:, self._near]
        inside = sparse.csr_matrix(continuation.map[:, self._near])
        at = np.searchsorted(rows, np.flatnonzero(continuation.inside))
        place = sparse.csr_matrix(
            (np.ones(len(at)), (at, np.arange(len(at)))), shape=(len(rows), len(at))
        )
        spread = spread + place @ inside
        some = sparse.csr_matrix(self.mass[rows])
        around = sparse.csr_matrix(some[:, rows])
        local = spread.T @ (around @ spread)
        self._solve_near = solver_of(sparse.csc_matrix(local))

    def surface_flux(self, potential: Array, hull_flux: Array) -> Array:
        """Vertical velocity of the surface, (nx ny, k) [m/s]."""
        return self.answer(potential, hull_flux, self.sheet.rise)[0]

    def both(self, potential: Array, hull_flux: Array) -> tuple[Array, Array]:
        """`surface_flux` and `hull_potential` at once."""
        return self.answer(potential, hull_flux, self.sheet.rise)

    def hull_potential(self, potential: Array, hull_flux: Array) -> Array:
        """Potential at all nodes of hulls and waterplanes, (nodes, k) [m^2/s]."""
        return self.answer(potential, hull_flux, self.sheet.rise)[1]

    def answer(self, potential: Array, hull_flux: Array, rise: Array) -> tuple[Array, Array]:
        """Surface flux and hull potential, `rise` the symbol of the grid's own waves."""
        spectrum = self._transform(potential)
        if not self.elements.nodes:
            return self._back(rise * spectrum), np.zeros((0, potential.shape[1]))
        own = self._back(self.sheet.rise * spectrum)
        u, left = self._coupling.potential(potential, spectrum, own, hull_flux)
        mean = spectrum[:, 0, 0].real / self.sheet.size
        beside = u - self._coupling.of_level * mean
        load, lid, beyond = self._coupling.load(beside, left, hull_flux)
        made = beyond - self.sheet.rise * self._transform(lid)
        made[:, 0, 0] = self._coupling.risen(hull_flux) - load.sum(axis=0)
        result = self._back(self._area * rise * spectrum + made) + load
        self.continuation.gather(result)
        result /= self._area
        if self.continuation.inside.any():
            near = self._area * np.asarray(result[self._near])
            result[self._near] = self._solve_near(near)
        return self.continuation(result), u

    def continued(self, field: Array) -> Array:
        """A field given on the water, (nx ny,) or (nx ny, k), continued through waterplanes."""
        return self.continuation(field)

    @property
    def places(self) -> Array:
        """(nx ny, 2) where the surface's values stand [m]."""
        return self.sheet.xy

    @property
    def hull_places(self) -> Array:
        """(nodes, 3) where the bodies' values stand [m]."""
        return self.elements.points

    def at_nodes(self, surface: Array, hull: Array) -> Array:
        """A field of the surface and of bodies, at the nodes of `elements`."""
        return hull

    def nodal(self, height: Callable[[Array], Array]) -> Array:
        """(nx ny,) values of a function of places (n, 2)."""
        return self.continuation(height(self.sheet.xy))

    def damping(self, rate: Callable[[Array], Array]) -> sparse.csc_matrix:
        """(nx ny, nx ny) int rate, of a rate [1/s] at places (n, 2), zero near hulls."""
        return sparse.csc_matrix(sparse.diags(self._area * rate(self.sheet.xy)))

    def asymmetry(self) -> float:
        """|a' S b - b' S a| over a' S a, of two fields drawn at random."""
        fields = np.random.default_rng(1).standard_normal((self.sheet.size, 2))
        fields = self.continuation(fields)
        still = np.zeros((len(self.elements.hull), 2))
        rise = np.asarray(self.mass @ self.surface_flux(fields, still))
        energy = fields.T @ rise
        return float(abs(energy[0, 1] - energy[1, 0]) / abs(energy[0, 0]))

    def fastest(self, gravity: float) -> float:
        """The largest angular frequency of free waves on the grid [rad/s]."""
        return float(np.sqrt(gravity * self.sheet.rise.max()))

    def march(
        self, gravity: float, step: float, damping: sparse.csc_matrix | None = None
    ) -> GridMarch:
        """Steps of a length [s]."""
        return GridMarch(self, gravity, step, damping)

    def _transform(self, fields: Array) -> Complex:
        return self.sheet.transform(fields.T.reshape(-1, *self.sheet.shape))

    def _back(self, spectra: Complex) -> Array:
        return np.ascontiguousarray(self.sheet.back(spectra).reshape(len(spectra), -1).T)


class _Bodies:
    """All that closed bodies add to the energy of the grid's own waves."""

    def __init__(self, sheet: Sheet, e: Elements, progress: Callable[[float], None]) -> None:
        images = make_images(sheet.depth, True, (), sheet.spacing * max(sheet.shape))
        energy, given = forms(e, images, progress=lambda share: progress(0.4 * share))
        self._count, free = e.nodes, e.free
        line = np.unique(e.hull)
        self._line = line[line < free]
        self._found = np.setdiff1d(np.arange(e.nodes), self._line)
        factor = linalg.cho_factor(energy[np.ix_(self._found, self._found)], lower=True)
        self._energy_line, self._given_line = energy[self._line], given[self._line]
        across = energy[np.ix_(self._found, self._line)]
        self._by_flux = linalg.cho_solve(factor, np.eye(len(self._found)))
        self._by_line = -self._by_flux @ across
        self._by_given = -self._by_flux @ given[self._found]
        self._coupling = Coupling(sheet, e, images)
        self._panel_area = e.hull_table[:, 28]
        self._on_line = sheet.interpolation(e.points[self._line, :2])
        self._from_line = sparse.csr_matrix(self._on_line.T)
        at, weight, hats = _lid_rule(e)
        places = sheet.interpolation(at)
        weighted = sparse.csr_matrix(places.T @ sparse.diags(weight))
        self._lid = sparse.csr_matrix(weighted @ hats)
        self._lid_test = sparse.csr_matrix(self._lid.T)
        self.dry_mass = sparse.csr_matrix(weighted @ places)
        self.of_level = self._of_level(sheet)

    def _of_level(self, sheet: Sheet) -> Array:
        """u (nodes, 1) of a potential of one all over: one; on bodies under water zero."""
        level, still = np.ones((sheet.size, 1)), np.zeros((len(self._panel_area), 1))
        spectrum = sheet.transform(level.reshape(1, *sheet.shape))
        return self.potential(level, spectrum, np.zeros_like(level), still)[0]

    def potential(
        self, field: Array, spectrum: Complex, own: Array, hull_flux: Array
    ) -> tuple[Array, Array]:
        """u (nodes, k), and what waterlines are left with, of a field, its spectrum and its A f."""
        pulled = -self._coupling.pull(field, spectrum)
        free = self._lid_test.shape[0]
        pulled[:free] += self._lid_test @ own
        u = np.empty_like(pulled)
        u[self._line] = self._on_line @ field
        u[self._found] = self._by_flux @ pulled[self._found] + self._by_line @ u[self._line]
        u[self._found] += self._by_given @ hull_flux
        return u, self._energy_line @ u - pulled[self._line] + self._given_line @ hull_flux

    def risen(self, hull_flux: Array) -> Array:
        """(k,) volume that comes up in a second, of what goes into the hulls [m^3/s]."""
        return np.asarray(-self._panel_area @ hull_flux)

    def load(self, u: Array, left: Array, hull_flux: Array) -> tuple[Array, Array, Complex]:
        """What bodies add to A f: on nodes, as a field that A is still to be taken of, in waves."""
        load = self._from_line @ left
        beyond = self._coupling.push(np.concatenate([u, -hull_flux]), load)
        return load, self._lid @ u[: self._lid.shape[1]], beyond


class GridMarch:
    """The surface flux of a step, averaged over it so that leapfrog is exact for free waves.

    Of the grid's own waves A becomes A_dt = 2 (1 - cos w dt)/(g dt^2); what hulls add is of the
    second order, (w dt)^2/12.
    """

    def __init__(
        self, flow: GridFlow, gravity: float, step: float, damping: sparse.csc_matrix | None
    ) -> None:
        self._flow = flow
        half_turn = 0.5 * step * np.sqrt(gravity * flow.sheet.rise)
        self._rise = flow.sheet.rise * np.sinc(half_turn / np.pi) ** 2
        self._rate: Array | None = None
        if damping is not None:
            self._rate = damping.diagonal()[:, None] / flow.sheet.spacing**2
            self._share = 1.0 / (1.0 + 0.5 * step * self._rate)

    def given(self, fluxes: Sequence[Array]) -> Array:
        """(times, ...) to be passed on to `flux`, of the given flux (mB, times) of each part."""
        return np.stack([flux.T for flux in fluxes], axis=2)

    def flux(self, potential: Array, given: Array) -> Array:
        """(nx ny, parts) from the potential in the middle of a step."""
        return self._flow.answer(potential, given, self._rise)[0]

    def damped(self, flux: Array, mean: Array) -> Array:
        """Rate of the step's mean elevation: the flux less what the absorber takes, old and new."""
        if self._rate is None:
            return flux
        return np.asarray((flux - self._rate * mean) * self._share)


def body_elements(bodies: SurfaceMesh | None) -> Elements:
    """The closed surfaces of hulls and waterplanes as elements.

    `free` are the nodes on z = 0 inside and on waterlines, `below` all others.
    """
    if bodies is None:
        empty, none = np.zeros((0, 3), dtype=np.int64), np.zeros(0, dtype=np.int64)
        return Elements(np.zeros((0, 3)), empty, empty, 0, 0, 0, none, none)
    is_lid = bodies.part == bodies.part_names.index(WATERPLANE)
    on_lid = np.unique(bodies.triangles[is_lid])
    below = np.setdiff1d(np.arange(len(bodies.points)), on_lid)
    order = np.concatenate([on_lid, below])
    number = np.empty(len(order), dtype=np.int64)
    number[order] = np.arange(len(order))
    return Elements(
        points=bodies.points[order],
        water=number[bodies.triangles[is_lid]].reshape(-1, 3),
        hull=number[bodies.triangles[~is_lid]],
        free=len(on_lid),
        below=len(below),
        pinned=0,
        order=order,
        hull_triangles=np.flatnonzero(~is_lid),
    )


def _lid_rule(e: Elements) -> tuple[Array, Array, sparse.csr_matrix]:
    """Points on waterplanes (p, 2), their weights [m^2], and values of hats there (p, free)."""
    at = np.einsum("qj,mjc->mqc", SEVEN[:, :3], e.points[e.water][:, :, :2]).reshape(-1, 2)
    weight = (e.water_table[:, 28, None] * SEVEN[:, 3]).ravel()
    owner = np.repeat(np.arange(len(at)), 3)
    corners = np.repeat(e.water, len(SEVEN), axis=0).ravel()
    values = np.tile(SEVEN[:, :3], (len(e.water), 1)).ravel()
    return at, weight, sparse.csr_matrix((values, (owner, corners)), shape=(len(at), e.free))
