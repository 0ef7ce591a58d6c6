"""Route "grid": open water by FFT, hulls by symmetric Galerkin on the half-space kernel.

The potential in the water is phi_s + phi_b. phi_s is the harmonic extension of the surface's
potential, continued through waterplanes, so its vertical velocity is IFFT[k tanh(kh) phi^]: no
numerical dispersion. phi_b vanishes on z = 0 and takes up what phi_s leaves of the hulls' flux,

    D phi_b = (M/2 - K)' (q - d(phi_s)/dn),

the same hull operators as on route "panels" with no water in them, factored once.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import numpy.typing as npt
from scipy import linalg

from bemwave.flow.coupling import Coupling
from bemwave.flow.elements import Elements
from bemwave.flow.images import make_images
from bemwave.flow.panels import forms
from bemwave.flow.sheet import Sheet
from bemwave.flow.waterplane import Continuation, Waterline, inside_nodes
from bemwave.geometry.hull import Hull
from bemwave.geometry.surface_mesh import IntArray, joined

Array = npt.NDArray[np.float64]


class GridFlow:
    """The flow map of a grid with hulls in it.

    Parameters
    ----------
    sheet : the grid, absorber included; its depth is the water's.
    hulls : bodies at rest; none of their waterplanes under three spacings wide.

    Attributes
    ----------
    elements : the hulls' panels, nodes renumbered: below the surface, then on waterlines.
    inside : (nx ny,) nodes of the grid inside waterplanes.
    given_points, given_normals : (m + p, 3) where fluxes are given: the middles of the m panels,
        then p points of waterlines, which the continuation through waterplanes needs.
    """

    def __init__(self, sheet: Sheet, hulls: Sequence[Hull]) -> None:
        self.sheet = sheet
        self.elements, lines = hull_elements(hulls)
        on_line = [np.column_stack([li.points, np.zeros(len(li.points))]) for li in lines]
        self.given_points = np.vstack([self.elements.hull_table[:, 24:27], *on_line])
        normals = [line.normals for line in lines]
        self.given_normals = np.vstack([self.elements.hull_table[:, 9:12], *normals])
        span = sheet.spacing * max(sheet.shape)
        images = make_images(sheet.depth, True, (), span)
        self.inside = np.zeros(sheet.size, dtype=bool)
        within = [
            inside_nodes(sheet, hull.polygons(), line)
            for hull, line in zip(hulls, lines, strict=True)
            if hull.waterlines
        ]
        for nodes in within:
            self.inside |= nodes
        standing = [line for hull, line in zip(hulls, lines, strict=True) if hull.waterlines]
        self._continuations = [
            Continuation(sheet, nodes, line, self.inside)
            for nodes, line in zip(within, standing, strict=True)
        ]
        if hulls:
            energy, given = forms(self.elements, images)
            factor = linalg.cho_factor(energy, lower=True)
            self._hull_response = -linalg.cho_solve(factor, given)
            self._coupling = Coupling(sheet, self.elements, images)

    def continued(self, potential: Array, hull_flux: Array) -> Array:
        """A copy of a potential (nx ny, k), through waterplanes by the hull's condition."""
        result = potential.copy()
        for continuation in self._continuations:
            continuation.potential(result, hull_flux)
        return result

    def surface_flux(self, potential: Array, hull_flux: Array) -> Array:
        """Vertical velocity of the surface, (nx ny, k) [m/s]."""
        potential = self.continued(potential, hull_flux)
        own = self._back(self.sheet.rise * self._transform(potential))
        return own + self.made_by_hulls(potential, hull_flux, own)

    def made_by_hulls(self, potential: Array, hull_flux: Array, own: Array) -> Array:
        """What hulls add to the surface's own flux, of a continued potential; (nx ny, k)."""
        if not len(self.elements.hull):
            return np.zeros_like(own)
        left = hull_flux[: len(self.elements.hull)] - self._coupling.flux(potential)
        total = own + self._coupling.rise(left, self._hull_response @ left)
        for continuation in self._continuations:
            continuation.smooth(total)
        return np.asarray(total - own)

    def hull_potential(self, potential: Array, hull_flux: Array) -> Array:
        """Potential at hull nodes, below the surface and on waterlines, (nodes, k) [m^2/s]."""
        potential = self.continued(potential, hull_flux)
        result = self._coupling.potential(potential)
        left = hull_flux[: len(self.elements.hull)] - self._coupling.flux(potential)
        result[: self.elements.below] += self._hull_response @ left
        return result

    def march(self, gravity: float, step: float) -> GridMarch:
        """The exact propagation of free waves over steps of a length [s]."""
        return GridMarch(self, gravity, step)

    def _transform(self, fields: Array) -> npt.NDArray[np.complex128]:
        return self.sheet.transform(fields.T.reshape(-1, *self.sheet.shape))

    def _back(self, spectra: npt.NDArray[np.complex128]) -> Array:
        return np.ascontiguousarray(self.sheet.back(spectra).reshape(len(spectra), -1).T)


class GridMarch:
    """Mean surface flux over a step of free waves, exact, with the hulls' as forcing.

    The same form of a step as on route "panels" (see `stepping.stepper`): there the flux is
    A_dt phi + f, here IFFT[A_dt phi^ + (A_dt/A) f^] with f what the hulls make, so that A_dt is
    2 (1 - cos w dt)/(g dt^2) and A_dt/A = (sin(x)/x)^2, x = w dt/2.
    """

    def __init__(self, flow: GridFlow, gravity: float, step: float) -> None:
        self._flow = flow
        rise = flow.sheet.rise
        half_turn = 0.5 * step * np.sqrt(gravity * rise)
        self._smooth = np.sinc(half_turn / np.pi) ** 2
        self._mean_rise = rise * self._smooth

    def flux(self, potential: Array, hull_flux: Array) -> Array:
        """(nx ny, k) from the potential at the step's middle and the given flux, smoothed."""
        flow = self._flow
        potential = flow.continued(potential, hull_flux)
        spectrum = flow._transform(potential)
        own = flow._back(flow.sheet.rise * spectrum)
        made = flow.made_by_hulls(potential, hull_flux, own)
        return flow._back(self._mean_rise * spectrum + self._smooth * flow._transform(made))


def hull_elements(hulls: Sequence[Hull]) -> tuple[Elements, list[Waterline]]:
    """The hulls' panels as elements without water, and their waterlines."""
    empty = np.zeros((0, 3), dtype=np.int64)
    none = np.zeros(0, dtype=np.int64)
    if not hulls:
        return Elements(np.zeros((0, 3)), empty, empty, 0, 0, 0, none, none), []
    mesh = joined([hull.mesh for hull in hulls])
    on_line = mesh.points[:, 2] == 0.0
    order = np.concatenate([np.flatnonzero(~on_line), np.flatnonzero(on_line)])
    number = np.empty(len(order), dtype=np.int64)
    number[order] = np.arange(len(order))
    below = int((~on_line).sum())
    elements = Elements(
        points=mesh.points[order],
        water=empty,
        hull=number[mesh.triangles],
        free=0,
        below=below,
        pinned=len(order) - below,
        order=order,
        hull_triangles=np.arange(len(mesh.triangles)),
    )
    first = 0
    lines: list[Waterline] = []
    for hull in hulls:
        panels = first + np.arange(len(hull.mesh.triangles))
        row = len(elements.hull) + sum(len(line.rows) for line in lines)
        lines.append(_waterline(elements, panels, row))
        first += len(panels)
    return elements, lines


def _waterline(e: Elements, panels: IntArray, row: int) -> Waterline:
    """Middles of the panel edges on z = 0, with the normals of their facets."""
    corners = e.hull[panels]
    on_line = corners >= e.below
    edge = np.flatnonzero(on_line.sum(axis=1) == 2)
    share = on_line[edge][:, :, None] / 2.0
    points = (e.points[corners[edge]] * share).sum(axis=1)[:, :2]
    normals = e.hull_table[panels[edge], 9:12]
    return Waterline(points, normals, row + np.arange(len(edge)))
