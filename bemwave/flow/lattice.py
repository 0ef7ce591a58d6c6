"""What the images left out of water between four mirrors add.

Four walls by mirrors make a lattice of images without end, cut off at a distance. The images of
one cell (the walls' corner and the bed mirror it into itself) have neither charge nor dipole, so
what is left out is smooth inside the water: the first terms of its Taylor series, summed over the
plane outside the cut-off rectangle as an integral, which Gauss's theorem brings to its sides.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

Array = npt.NDArray[np.float64]


@dataclass(frozen=True)
class LeftOut:
    """Tails of a lattice of images.

    centre : (3,) the walls' corner, on the bed.
    second : (3,) potential anywhere inside per second moments xx, yy, zz of the sources [1/m^3].
    fourth : (3,) part of G, with the signs the images of x, y and z components of curls have, per
        product of moments yz, xz, xy of target and source [1/m^5].
    """

    centre: Array
    second: Array
    fourth: Array


NONE = LeftOut(np.zeros(3), np.zeros(3), np.zeros(3))


def left_out(centre: Array, a: float, b: float, cell: float) -> LeftOut:
    """The tails outside |x| < a, |y| < b of cells of eight images each on `cell` m^2."""
    r = math.hypot(a, b)
    xx, yy = 4 * b / (a * r), 4 * a / (b * r)
    xxyy = -12 * a * b / r**5
    xxxx, yyyy = (4 * q * (2 / (p**3 * r) + 1 / (p * r**3) + 3 * p / r**5)
                  for p, q in ((a, b), (b, a)))  # fmt: skip
    second = np.array([xx, yy, -xx - yy]) / (math.pi * cell)
    fourth = np.array([-yyyy - xxyy, -xxxx - xxyy, xxyy]) * 2 / (math.pi * cell)
    return LeftOut(centre, second, fourth)


def potentials(beyond: LeftOut, vertices: Array, normals: Array) -> tuple[Array, Array]:
    """Potential inside the water of the images left out.

    Parameters
    ----------
    vertices, normals : (m, 3, 3) and (m, 3) of the sources.

    Returns
    -------
    (m,) of unit flux on each triangle [m], (m, 3) of each hat's dipoles, minus sign included.
    """
    x = vertices - beyond.centre
    total = x.sum(axis=1)
    area = 0.5 * np.linalg.norm(np.cross(x[:, 1] - x[:, 0], x[:, 2] - x[:, 0]), axis=1)
    squares = (x**2).sum(axis=1) + total**2
    products = np.einsum("mja,ma->mj", x + total[:, None], normals * beyond.second)
    return area / 12.0 * (squares @ beyond.second), -area[:, None] / 6.0 * products


def curl_moments(beyond: LeftOut, vertices: Array) -> Array:
    """(m, 3) moments yz, xz, xy of triangles about the centre, for `LeftOut.fourth` [m^4]."""
    x = vertices - beyond.centre
    area = 0.5 * np.linalg.norm(np.cross(x[:, 1] - x[:, 0], x[:, 2] - x[:, 0]), axis=1)
    total = x.sum(axis=1)
    pairs = ((1, 2), (0, 2), (0, 1))
    products = [(x[..., p] * x[..., q]).sum(axis=1) + total[:, p] * total[:, q] for p, q in pairs]
    moments: Array = area[:, None] / 12.0 * np.stack(products, axis=1)
    return moments
