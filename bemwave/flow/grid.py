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

from bemwave.flow.coupling import Coupling, times
from bemwave.flow.elements import Elements, solver_of
from bemwave.flow.images import make_images
from bemwave.flow.panels import forms
from bemwave.flow.sheet import Complex, Lines, Sheet, touched
from bemwave.flow.waterplane import Continuation
from bemwave.geometry.surface_mesh import SurfaceMesh
from bemwave.geometry.waterplane import WATERPLANE
from bemwave.kernels.panels import SEVEN

Array = npt.NDArray[np.float64]
Ints = npt.NDArray[np.int64]

ITERATIONS = 20  # for the quickest wave


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
        self._bodies = None
        self._near: Ints = np.zeros(0, dtype=np.int64)
        self.mass = sparse.csr_matrix(self._area * sparse.identity(sheet.size, format="csr"))
        if self.elements.nodes:
            self._bodies = _Bodies(sheet, self.elements, progress)
            if waterlines:
                self._make_mass(self._bodies, self.continuation)

    def _make_mass(self, bodies: _Bodies, continuation: Continuation) -> None:
        """Take waterplanes off M, and factor it where it is not a multiple of one."""
        self.mass = sparse.csr_matrix(self.mass - bodies.dry_mass)
        weights = continuation.map
        near = np.union1d(np.unique(weights.indices), bodies.on_lids)
        inside = np.flatnonzero(continuation.inside)
        rows = np.union1d(near, inside)
        self._near = np.setdiff1d(near, inside)
        spread = sparse.identity(self.sheet.size, format="csr")[rows][:, self._near]
        at = np.searchsorted(rows, inside)
        place = sparse.csr_matrix(
            (np.ones(len(at)), (at, np.arange(len(at)))), shape=(len(rows), len(at))
        )
        spread = spread + place @ sparse.csr_matrix(weights[:, self._near])
        around = sparse.csr_matrix(sparse.csr_matrix(self.mass[rows])[:, rows])
        self._solve_near = solver_of(sparse.csc_matrix(spread.T @ (around @ spread)))

    def surface_flux(self, potential: Array, hull_flux: Array) -> Array:
        """Vertical velocity of the surface, (nx ny, k) [m/s]."""
        return self.both(potential, hull_flux)[0]

    def hull_potential(self, potential: Array, hull_flux: Array) -> Array:
        """Potential at all nodes of hulls and waterplanes, (nodes, k) [m^2/s]."""
        return self.both(potential, hull_flux)[1]

    def both(self, potential: Array, hull_flux: Array) -> tuple[Array, Array]:
        """`surface_flux` and `hull_potential` at once."""
        if self._bodies is None:
            return self.moved(potential, hull_flux)
        u, given = self._bodies.given(hull_flux)
        surface, by_water = self.moved(potential, given)
        return surface, by_water + u

    def given(self, hull_flux: Array) -> Array:
        """What `moved` needs of given fluxes (mB, k): a column for each."""
        return hull_flux if self._bodies is None else self._bodies.given(hull_flux)[1]

    def moved(
        self, potential: Array, given: Array, rise: Array | None = None
    ) -> tuple[Array, Array]:
        """`surface_flux`, and the hulls' potential but for that of the flux `given` alone.

        `rise` (nx, ny/2 + 1): of A, if not the sheet's.
        """
        # each field in one piece, for the transforms
        potential = np.asfortranarray(potential)
        spectrum = self.sheet.transform(potential.T.reshape(-1, *self.sheet.shape))
        rise = self.sheet.rise if rise is None else rise
        bodies = self._bodies
        if bodies is None:
            spectrum *= rise
            return self._back(spectrum), np.zeros((0, potential.shape[1]))
        pulled = bodies.pulled(potential, spectrum)
        mean = spectrum[:, 0, 0].real / self.sheet.size
        spectrum *= rise
        u, left = bodies.potential(potential, pulled, spectrum)
        pushed = bodies.push(u - bodies.of_level * mean, left) + given
        bodies.add_waves(pushed, spectrum, rise)
        result = self._back(spectrum)
        bodies.add_near(pushed, result)
        self.continuation.gather(result)
        if len(self._near):
            result[self._near] = self._solve_near(self._area * result[self._near])
        self.continuation.fill(result)
        return result, u

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
        """The largest angular frequency of free waves on the grid [rad/s].

        Waterlines with edges longer than a spacing have quicker ones of their own, found by power
        iteration from noise beside them.
        """
        largest = float(self.sheet.rise.max())
        if len(self._near):
            vector = np.zeros((self.sheet.size, 1))
            vector[self._near, 0] = np.random.default_rng(1).standard_normal(len(self._near))
            vector = self.continuation(vector)
            still = self.given(np.zeros((len(self.elements.hull), 1)))
            for _ in range(ITERATIONS):
                image = self.moved(vector, still)[0]
                ratio = float(np.linalg.norm(image) / np.linalg.norm(vector))
                vector = image / np.linalg.norm(image)
            largest = max(largest, 1.05 * ratio)
        return float(np.sqrt(gravity * largest))

    def march(
        self, gravity: float, step: float, damping: sparse.csc_matrix | None = None
    ) -> GridMarch:
        """Steps of a length [s]."""
        return GridMarch(self, gravity, step, damping)

    def _back(self, spectrum: Complex) -> Array:
        """(nx ny, k), each field in one piece."""
        return np.asarray(self.sheet.back(spectrum).reshape(len(spectrum), -1).T)


class _Bodies:
    """All that closed bodies add to the energy of the grid's own waves."""

    def __init__(self, sheet: Sheet, e: Elements, progress: Callable[[float], None]) -> None:
        self._sheet, self._area = sheet, sheet.spacing**2
        images = make_images(sheet.depth, True, (), sheet.spacing * max(sheet.shape))
        energy, given = forms(e, images, progress=lambda share: progress(0.4 * share))
        self._count, self._first = e.nodes, int(e.hull.min())
        self._line = np.arange(self._first, e.free)
        self._found = np.setdiff1d(np.arange(e.nodes), self._line)
        factor = linalg.cho_factor(energy[np.ix_(self._found, self._found)], lower=True)
        self._energy_line, self._given_line = energy[self._line], given[self._line]
        across = energy[np.ix_(self._found, self._line)]
        self._by_flux = linalg.cho_solve(factor, np.eye(len(self._found)))
        self._by_line = -self._by_flux @ across
        self._by_given = -self._by_flux @ given[self._found]
        self._coupling = Coupling(sheet, e, images)
        on_line = sheet.interpolation(e.points[self._line, :2])
        self._at_line, self._on_line = touched(on_line)
        self._from_line = sparse.csr_matrix(self._on_line.T)
        self._panel_area = e.hull_table[:, 28]
        self._make_lids(e)
        sizes = [self._coupling.size, len(self.on_lids), len(self._line)]
        self._ends = np.cumsum(sizes)
        self.of_level = self._of_level(sheet)

    def _of_level(self, sheet: Sheet) -> Array:
        """u (nodes, 1) of a potential of one all over: one; on bodies under water zero."""
        level = np.ones((sheet.size, 1))
        spectrum = sheet.transform(level.reshape(1, *sheet.shape))
        pulled = self.pulled(level, spectrum)
        return self.potential(level, pulled, np.zeros_like(spectrum))[0]

    def _make_lids(self, e: Elements) -> None:
        """Nodes of the grid on waterplanes, and what these weigh."""
        sheet, (at, weight, hats) = self._sheet, _lid_rule(e)
        self.on_lids, places = touched(sheet.interpolation(at))
        weighted = sparse.csr_matrix(places.T @ sparse.diags(weight))
        self._lid = sparse.csr_matrix(weighted @ hats)
        self._lid_test = sparse.csr_matrix(self._lid.T)
        dry, shape = sparse.coo_matrix(weighted @ places), (sheet.size, sheet.size)
        at_nodes = self.on_lids[dry.row], self.on_lids[dry.col]
        self.dry_mass = sparse.csr_matrix((dry.data, at_nodes), shape=shape)
        rows, columns = np.divmod(self.on_lids, sheet.shape[1])
        used, row = np.unique(rows, return_inverse=True)
        self._lines = Lines(sheet, used)
        self._in_lines = (slice(None), row, columns)
        self._count_lines = len(used)

    def pulled(self, field: Array, spectrum: Complex) -> Array:
        """-G f over hulls (nodes, k), of a field f and its spectrum."""
        pulled = np.zeros((self._count, field.shape[1]))
        pulled[self._first :] = -self._coupling.pull(field, spectrum)
        return pulled

    def potential(self, field: Array, pulled: Array, rise: Complex) -> tuple[Array, Array]:
        """u (nodes, k), and what waterlines are left with; `rise` the spectrum of A f.

        `pulled` gets what A f does on waterplanes.
        """
        free = self._lid_test.shape[0]
        if free:
            pulled[:free] += self._lid_test @ self._lines.of(rise)[self._in_lines].T
        u = np.empty_like(pulled)
        u[self._line] = self._on_line @ field[self._at_line]
        u[self._found] = times(self._by_flux, pulled[self._found])
        u[self._found] += times(self._by_line, u[self._line])
        return u, times(self._energy_line, u) - pulled[self._line]

    def given(self, hull_flux: Array) -> tuple[Array, Array]:
        """u (nodes, k) of a given flux alone, and what it pushes."""
        u = np.zeros((self._count, hull_flux.shape[1]))
        u[self._found] = times(self._by_given, hull_flux)
        left = times(self._energy_line, u) + times(self._given_line, hull_flux)
        pushed = self.push(np.concatenate([u, -hull_flux]), left)
        # what goes into the hulls comes up
        pushed[-1] -= self._panel_area @ hull_flux / self._area
        return u, pushed

    def push(self, load: Array, left: Array) -> Array:
        """What a load of u and less the given flux does to the surface, before it is spread.

        (size, k): of the coupling, on nodes of waterplanes, on waterlines, `left` there, and the
        volume that comes up in a second, to be made good by the mean.
        """
        free = self._lid.shape[1]
        pushed = self._coupling.push(load[self._first :])
        near = -self._coupling.near(pushed) - left.sum(axis=0)
        parts = [pushed, self._lid @ load[:free], left, near[None, :]]
        return np.asarray(np.concatenate(parts) / self._area)

    def add_waves(self, pushed: Array, spectrum: Complex, rise: Array) -> None:
        """Add what is pushed and goes out in waves, waterplanes' A u too; `rise` is that of A."""
        far, on_lids, _, mean = np.split(pushed, self._ends)
        self._coupling.add_far(far, spectrum)
        if len(on_lids):
            lid = np.zeros((pushed.shape[1], self._count_lines, self._sheet.shape[1]))
            lid[self._in_lines] = on_lids.T
            waves = self._lines.spectrum(lid)
            waves *= rise
            spectrum -= waves
        spectrum[:, 0, 0] = mean

    def add_near(self, pushed: Array, field: Array) -> None:
        """Add the rest, on nodes and waterlines, in place."""
        near, _, left, _ = np.split(pushed, self._ends)
        self._coupling.add_near(near, field)
        field[self._at_line] += self._from_line @ left


class GridMarch:
    """The surface flux of a step, averaged over it so that leapfrog is exact for free waves.

    A becomes A_dt = 2 (1 - cos w dt)/(g dt^2); what hulls add is of the second order, (w dt)^2/12.
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
            self._kept = 1.0 / (1.0 + 0.5 * step * self._rate)

    def given(self, fluxes: Sequence[Array]) -> Array:
        """(times, ...) to be passed on to `flux`, of the given flux (mB, times) of each part."""
        return np.stack([self._flow.given(flux).T for flux in fluxes], axis=2)

    def flux(self, potential: Array, given: Array) -> Array:
        """(nx ny, parts) from the potential in the middle of a step."""
        return self._flow.moved(potential, given, self._rise)[0]

    def damped(self, flux: Array, mean: Array) -> Array:
        """Rate of the step's mean elevation: the flux less what the absorber takes, old and new.

        The flux is changed to it in place.
        """
        if self._rate is None:
            return flux
        flux -= self._rate * mean
        flux *= self._kept
        return flux


def body_elements(bodies: SurfaceMesh | None) -> Elements:
    """The closed surfaces of hulls and waterplanes as elements.

    `free` are the nodes on z = 0, those inside waterlines before those on them; `below` all others.
    """
    if bodies is None:
        empty, none = np.zeros((0, 3), dtype=np.int64), np.zeros(0, dtype=np.int64)
        return Elements(np.zeros((0, 3)), empty, empty, 0, 0, 0, none, none)
    is_lid = bodies.part == bodies.part_names.index(WATERPLANE)
    on_lid, on_hull = (np.unique(bodies.triangles[part]) for part in (is_lid, ~is_lid))
    inside, below = np.setdiff1d(on_lid, on_hull), np.setdiff1d(on_hull, on_lid)
    order = np.concatenate([inside, np.intersect1d(on_lid, on_hull), below])
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
