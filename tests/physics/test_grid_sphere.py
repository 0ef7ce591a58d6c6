"""Route "grid" at one frequency: a sphere under deep water, its centre two radii down.

Method of Wang (1986): series of multipoles, summed elsewhere. Added mass A and damping B over
4/3 pi rho a^3 (B also over the frequency); K = w^2/g. Errors are over the value or a fifth of the
largest in its column, whichever is larger.
"""

import math

import numpy as np
import pytest

from bemwave.geometry.forms import sphere
from bemwave.geometry.hull import place_hull
from bemwave.stepping.in_waves import BodiesOnGrid, SteadyWaves
from bemwave.stepping.response import water_round

G, DENSITY = 9.81, 1000.0
VOLUME = 4.0 / 3.0 * math.pi  # of radius 1

# Ka: heave A, B, surge A, B
WANG = {
    0.1: (0.537504, 0.003322, 0.518499, 0.001620),
    0.5: (0.534925, 0.084706, 0.518388, 0.041192),
    1.0: (0.448073, 0.080582, 0.475009, 0.041738),
    2.0: (0.441157, 0.010885, 0.469902, 0.005787),
}
SCALE = np.maximum(list(WANG.values()), np.max(list(WANG.values()), axis=0) / 5.0)


def largest_error(panel, frequencies):
    """Of all coefficients at some Ka, on a grid of a third of the radius."""
    hull = place_hull("ball", sphere(1.0, 2.0, panel), position=(-0.1, -0.13))
    sheet, useful = water_round([hull], 1 / 3, 4.0 * math.pi / min(frequencies), math.inf)
    bodies = BodiesOnGrid([hull], sheet, useful, DENSITY, G)
    worst = 0.0
    for ka in frequencies:
        frequency = math.sqrt(G * ka)
        waves = SteadyWaves(bodies, 2.0 * math.pi / frequency)
        mass, damping = waves.added_mass_and_damping([2, 0])
        found = np.stack([mass[[2, 0], [0, 1]], damping[[2, 0], [0, 1]] / frequency], axis=1)
        error = found.ravel() / (DENSITY * VOLUME) - WANG[ka]
        worst = max(worst, float(np.abs(error / SCALE[list(WANG).index(ka)]).max()))
    return worst


def test_coefficients_on_512_panels():
    assert largest_error(0.2, (0.5, 1.0, 2.0)) < 0.003


@pytest.mark.slow
def test_coefficients_on_800_panels():
    assert largest_error(0.15, (0.1, 0.5)) < 0.003
