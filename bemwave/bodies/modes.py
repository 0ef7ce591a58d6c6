"""The six motions of a body as normal velocities of its panels, and its hydrostatic stiffness."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from bemwave.flow.elements import Elements
from bemwave.geometry.hull import Hull
from bemwave.geometry.pose import Pose, on_earth, trim_and_heel

Array = npt.NDArray[np.float64]
Ints = npt.NDArray[np.int64]

MODES = ("surge", "sway", "heave", "roll", "pitch", "yaw")


def panels_of(elements: Elements, part: Ints, number: int) -> Ints:
    """Which of the elements' hull triangles belong to a part of the mesh.

    Parameters
    ----------
    part : (m,) part number of every triangle of the mesh.
    number : the part.
    """
    return np.flatnonzero(part[elements.hull_triangles] == number)


def mode_shapes(elements: Elements, panels: Ints, hull: Hull) -> Array:
    """(hull triangles, 6) velocity along the normal out of the water for unit velocities.

    The velocities are along and about the body's axes, at its centre of mass; triangles that are
    not the body's have zero.
    """
    table = elements.hull_table[panels]
    axes = hull.place.rotation  # columns are the body's axes on earth
    normal = table[:, 9:12] @ axes
    arm = (table[:, 24:27] - centre_on_earth(hull)) @ axes
    shapes = np.zeros((len(elements.hull), 6))
    shapes[panels] = np.hstack([normal, np.cross(arm, normal)])
    return shapes


def stiffness(hull: Hull, density: float, gravity: float) -> Array:
    """(6, 6) hydrostatic restoring load on the body per displacement, about its centre of mass.

    Pressure alone, so the weight comes in through the centre of mass only (Newman 1977, Marine
    Hydrodynamics, sect. 6.16, with moments taken there). N, N m per m, rad; body axes.
    """
    water = hull.hydrostatics
    weight, area = density * gravity, water.waterplane_area
    result = np.zeros((6, 6))
    if area > 0.0:
        x, y = np.asarray(water.centre_of_flotation) - hull.centre_of_mass[:2]
        xx = water.waterplane_xx + area * x * x
        yy = water.waterplane_yy + area * y * y
        xy = water.waterplane_xy + area * x * y
        result[2:5, 2:5] = [[area, area * y, -area * x], [area * y, yy, -xy], [-area * x, -xy, xx]]
    lever = np.asarray(water.centre_of_buoyancy) - hull.centre_of_mass
    result[3, 3] += water.volume * lever[2]
    result[4, 4] += water.volume * lever[2]
    result[3, 5] = -water.volume * lever[0]
    result[4, 5] = -water.volume * lever[1]
    return np.asarray(weight * result)


def centre_on_earth(hull: Hull) -> Array:
    """(3,) the centre of mass in its mean place [m]."""
    centre: Array = hull.place(hull.centre_of_mass)
    return centre


def displacement(hull: Hull, motion: Array) -> Pose:
    """From the hull's place at rest to where six motions about its centre of mass take it."""
    axes, centre = hull.place.rotation, centre_on_earth(hull)
    turn = on_earth((0.0, 0.0), float(motion[5])).rotation
    turn = axes @ turn @ trim_and_heel(float(motion[4]), float(motion[3])) @ axes.T
    return Pose(turn, centre - turn @ centre + axes @ motion[:3])
