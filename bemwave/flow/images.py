"""Images of the boundary: flat bed, straight walls, still water seen from outside the sheet.

With images in the Green's function, the bed and straight walls carry no panels; and where the
water is open the plane outside the meshed sheet, on which the potential is zero, carries none
either (the half-space kernel: the image in z = 0 with a minus sign).
"""

from __future__ import annotations

import math
from dataclasses import dataclass, replace

import numpy as np
import numpy.typing as npt

from bemwave.flow.lattice import NONE, LeftOut, left_out

Array = npt.NDArray[np.float64]

# Images above and below kept for the half-space over a bed.  Their signs alternate, so with the
# weights of `_layer_weights` this many leave less than 2e-8 of 1/depth, at any distance.
BED_LAYERS = 8


@dataclass(frozen=True)
class Mirror:
    """A straight wall that is not meshed: the plane where coordinate `axis` equals `position`."""

    axis: str
    position: float


@dataclass(frozen=True)
class Images:
    """The maps x -> signs x + shifts, each with its weight; the first is the identity.

    signs, shifts : (k, 3); weights : (k,).
    beyond : what a cut-off lattice of images leaves out.
    """

    signs: Array
    shifts: Array
    weights: Array
    beyond: LeftOut = NONE

    @property
    def curl_weights(self) -> Array:
        """(k, 3) weights of x, y and z components of curls in the hypersingular form.

        On a mirrored surface n x grad turns into det(D) D (n x grad), D the mirror's diagonal.
        """
        turn: Array = np.prod(self.signs, axis=1)[:, None] * self.signs
        return self.weights[:, None] * turn

    def of_surface_dipoles(self) -> Images:
        """Fewer images for dipoles on z = 0 in open water, where G has opposite signs by pairs.

        A point's mirror image in z = 0 sees them with the opposite sign, so both count alike.
        """
        up = self.signs[:, 2] > 0
        return replace(
            self, signs=self.signs[up], shifts=self.shifts[up], weights=2.0 * self.weights[up]
        )

    def seen_from_surface(self, weights: Array, sources_too: bool) -> tuple[Array, Array, Array]:
        """Signs, shifts and weights (k, c) of fewer images for targets on z = 0.

        There a mirror in the bed and a shift by twice the depth look alike; and if the sources are
        on z = 0 as well, so do images above and below.
        """
        height = -self.signs[:, 2] * self.shifts[:, 2]
        if sources_too:
            height = np.abs(height)
        keys = np.column_stack([self.signs[:, :2], self.shifts[:, :2], height])
        unique, back = np.unique(np.round(keys, 9), axis=0, return_inverse=True)
        total = np.zeros((len(unique), weights.shape[1]))
        np.add.at(total, back.ravel(), weights)
        signs = np.column_stack([unique[:, :2], np.ones(len(unique))])
        shifts = np.column_stack([unique[:, 2:4], -unique[:, 4]])
        return signs, shifts, total


def make_images(
    depth: float, half_space: bool, mirrors: tuple[Mirror, ...] = (), span: float = 0.0
) -> Images:
    """The images for water of one depth.

    Parameters
    ----------
    depth : metres, or math.inf.
    half_space : whether the plane z = 0 outside the mesh is still water (phi = 0 there).
    mirrors : walls; two of one axis make a channel, whose images are cut off at a distance.
    span : largest horizontal extent of the water [m], which sets that distance.
    """
    groups = [_axis_group("x", mirrors, span), _axis_group("y", mirrors, span)]
    groups.append(_vertical_group(depth, half_space))
    made = [
        ((sx, sy, sz), (bx, by, bz), wx * wy * wz)
        for sx, bx, wx in groups[0]
        for sy, by, wy in groups[1]
        for sz, bz, wz in groups[2]
    ]
    # those that mirror alike stand together, the identity first: kernels sum them as one
    made.sort(key=lambda image: image[0], reverse=True)
    signs, shifts, weights = zip(*made, strict=True)
    beyond = NONE
    if not half_space and math.isfinite(depth) and min(len(groups[0]), len(groups[1])) > 2:
        beyond = _beyond(groups)
    return Images(np.array(signs), np.array(shifts), np.array(weights), beyond)


_Group = list[tuple[float, float, float]]


def _beyond(groups: list[_Group]) -> LeftOut:
    """What the images of a closed tank of four mirrors leave out."""
    # each group starts with the identity and the reflection x -> 2 centre - x
    centre = 0.5 * np.array([group[1][1] for group in groups])
    dx, dy = (abs(group[2][1]) for group in groups[:2])
    a, b = 0.25 * len(groups[0]) * dx, 0.25 * len(groups[1]) * dy
    return left_out(centre, a, b, dx * dy)


def _axis_group(axis: str, mirrors: tuple[Mirror, ...], span: float) -> _Group:
    walls = sorted(m.position for m in mirrors if m.axis == axis)
    if not walls:
        return [(1.0, 0.0, 1.0)]
    if len(walls) == 1:
        return [(1.0, 0.0, 1.0), (-1.0, 2 * walls[0], 1.0)]
    period = 2 * (walls[1] - walls[0])
    layers = max(6, math.ceil(4 * span / period))
    shifts = sorted((m * period for m in range(-layers, layers + 1)), key=abs)
    return [(s, b if s > 0 else 2 * walls[0] + b, 1.0) for b in shifts for s in (1.0, -1.0)]


def _vertical_group(depth: float, half_space: bool) -> _Group:
    if math.isinf(depth):
        return [(1.0, 0.0, 1.0), (-1.0, 0.0, -1.0)] if half_space else [(1.0, 0.0, 1.0)]
    if not half_space:
        return [(1.0, 0.0, 1.0), (-1.0, -2 * depth, 1.0)]
    group: _Group = []
    weights = _layer_weights()
    for m in sorted(range(-BED_LAYERS, BED_LAYERS + 1), key=abs):
        weight = (-1.0) ** m * weights[abs(m)]
        group += [(1.0, 2 * m * depth, weight), (-1.0, 2 * m * depth, -weight)]
    return group


def _layer_weights() -> list[float]:
    """Weights of layers 0 to `BED_LAYERS` with which their alternating sum is that of all layers.

    The first two layers, which may touch the source, count in full; the rest as in algorithm 1 of
    Cohen, Rodriguez Villegas & Zagier (2000), Experimental Mathematics 9:3, whose error falls as
    5.8^-n with n terms.
    """
    n = BED_LAYERS - 1
    half = (3.0 + math.sqrt(8.0)) ** n
    d = 0.5 * (half + 1.0 / half)
    weights, b, c = [1.0, 1.0], -1.0, -d
    for k in range(n):
        c = b - c
        weights.append(abs(c) / d)
        b *= (k + n) * (k - n) / ((k + 0.5) * (k + 1.0))
    return weights
