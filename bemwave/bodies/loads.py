"""Pressure loads on a body: of the incident sea, and of the parts of the solved field.

Linear theory: p = -rho d(phi)/dt on the mean wetted surface, the quadratic term left out. For
design or operations these need qualified practice and the codes that apply.
"""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from bemwave.bodies.modes import centre_on_earth
from bemwave.flow.elements import Elements
from bemwave.geometry.hull import Hull
from bemwave.kernels.panels import THREE
from bemwave.waves import Sea

Array = npt.NDArray[np.float64]
Ints = npt.NDArray[np.int64]


class BodyLoads:
    """Force and moment about the centre of mass, along the body's axes, as linear maps.

    Parameters
    ----------
    elements, panels : the mesh, and which of its hull triangles are the body's.
    hull : the body at rest.
    sea : the incident sea.
    """

    def __init__(self, elements: Elements, panels: Ints, hull: Hull, sea: Sea) -> None:
        self._density = sea.density
        axes, centre = hull.place.rotation, centre_on_earth(hull)
        corners = elements.hull[panels]
        table = elements.hull_table[panels]
        vertices = elements.points[corners]
        normal = table[:, 9:12] @ axes
        area = table[:, 28]
        # int hat_j r dA = area/12 (sum of the corners + corner j), exact for linear pressure
        arm = (vertices.sum(axis=1, keepdims=True) + vertices) / 4.0 - centre
        self._nodal = np.zeros((6, len(elements.points)))
        for j in range(3):
            share = (area / 3.0)[:, None] * np.hstack([normal, np.cross(arm[:, j] @ axes, normal)])
            np.add.at(self._nodal.T, corners[:, j], share)
        self._nodal = self._nodal[:, : elements.nodes]
        points = np.einsum("qj,mjc->mqc", THREE[:, :3], vertices).reshape(-1, 3)
        self._sea = sea.at(points)
        lever = np.cross((points - centre) @ axes, np.repeat(normal, 3, axis=0))
        weight = np.repeat(area / 3.0, 3)[:, None]
        self._incident = (weight * np.hstack([np.repeat(normal, 3, axis=0), lever])).T

    def incident(self, times: Array) -> Array:
        """(times, 6) load of the incident sea's pressure on the mean wetted surface [N, N m]."""
        return np.asarray(self._sea.pressure(np.atleast_1d(times)) @ self._incident.T)

    def solved(self, rate: Array) -> Array:
        """(6, ...) load of a solved potential's rate at the elements' nodes [N, N m]."""
        return np.asarray(-self._density * (self._nodal @ rate))
