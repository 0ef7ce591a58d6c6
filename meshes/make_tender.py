"""Make tender.stl: the hull of an invented harbour tender, by formula, deck and transom included.

    python meshes/make_tender.py

Axes: x forward from amidships, y to port, z up from the baseline, metres; normals out of the hull.
At her draught of 1.9 m she displaces 185 m3 (190 t in sea water) on a waterline of 23.6 m by
7.8 m: block coefficient .53, centre of buoyancy 1.05 m abaft amidships.
"""

from pathlib import Path

import numpy as np

from bemwave.geometry.files import write_mesh
from bemwave.geometry.patterns import grid_triangles
from bemwave.geometry.surface_mesh import SurfaceMesh, joined
from bemwave.geometry.topology import weld

LENGTH, BEAM, DRAUGHT = 25.0, 8.0, 1.9
STATIONS, HEIGHTS = 48, 14  # steps along the hull and from keel to deck edge, each side


def deck_height(x):
    """Height of the deck edge over the baseline: sheer, more of it forward."""
    return 3.4 + 0.9 * np.clip(x / 12.5, 0.0, None) ** 2 + 0.15 * np.clip(-x / 12.5, 0.0, None) ** 2


def deck_half_breadth(x):
    """Half-breadth at the deck edge: parallel amidships, rounded to the stem, tapered aft."""
    forward = np.clip((x - 1.5) / 11.0, 0.0, 1.0)
    aft = np.clip((-x - 2.0) / 10.5, 0.0, 1.0)
    return 0.5 * BEAM * (1.0 - forward**2.6) ** 0.8 * (1.0 - 0.14 * aft**2)


def keel_height(x):
    """Height of the centre line: straight keel, raked stem, bottom rising to the transom."""
    stem = np.clip((x - 7.5) / 5.0, 0.0, 1.0)
    run = np.clip((-x - 2.5) / 10.0, 0.0, 1.0)
    return deck_height(x) * stem**2.4 + 1.25 * run**1.6


def half_breadth(x, s):
    """Half-breadth at the share s of the way up from keel to deck edge: U amidships, V forward."""
    forward = np.clip((x + 1.0) / 13.5, 0.0, 1.0)
    fullness, rise = 4.0 - 2.6 * forward, 0.62 + 0.38 * forward
    return deck_half_breadth(x) * (1.0 - (1.0 - s) ** fullness) ** rise


def port_side():
    """Points of the port side, (heights, stations, 3), from keel to deck edge."""
    # stations closer together towards the stem, heights towards the keel, where it bends most
    u = np.linspace(0.0, 1.0, STATIONS + 1)
    x = -0.5 * LENGTH + LENGTH * (0.6 * u + 0.4 * np.sin(0.5 * np.pi * u))
    s = np.linspace(0.0, 1.0, HEIGHTS + 1)[:, None] ** 1.6
    z = keel_height(x) + s * (deck_height(x) - keel_height(x))
    return np.stack([np.broadcast_to(x, z.shape), half_breadth(x, s), z], axis=-1)


def tender():
    """Return the closed hull as a mesh, normals out of the hull."""
    port = port_side()
    starboard = port * [1.0, -1.0, 1.0]
    deck = np.stack([starboard[-1], port[-1]])
    transom = np.stack([starboard[:, 0], port[:, 0]])
    shell = patch(port).flipped()
    mesh = joined([shell, patch(starboard), patch(deck), patch(transom)])
    return weld(mesh, 1e-6)[0]


def patch(points):
    """Mesh a grid of points."""
    rows, columns = points.shape[0] - 1, points.shape[1] - 1
    return SurfaceMesh.of_one_part(points, grid_triangles(rows, columns), "tender")


if __name__ == "__main__":
    write_mesh(tender(), Path(__file__).with_name("tender.stl"))
