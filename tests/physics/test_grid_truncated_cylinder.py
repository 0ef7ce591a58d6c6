"""Route "grid" at one frequency: a floating upright cylinder, its panels graded to its edge.

Matched series under and round the cylinder (Garrett 1971, J. Fluid Mech. 46:129; Yeung 1981, Appl.
Ocean Res. 3:119), summed elsewhere. Added mass A and damping B over rho pi a^2 T (B also over the
frequency), wave loads X over rho g pi a^2; K = w^2/g. Errors are over the value or a fifth of the
largest in its column, whichever is larger.
"""

import math

import numpy as np
import pytest

from bemwave.geometry.forms import cylinder
from bemwave.geometry.hull import place_hull
from bemwave.stepping.in_waves import BodiesOnGrid, SteadyWaves
from bemwave.stepping.response import water_round
from bemwave.waves import wavelength

G, DENSITY = 9.81, 1000.0
SPACING = 1 / 6

# (draught, depth) over the radius: Ka: heave A, B, X, surge A, B, X
SERIES = {
    (1.0, 10.0): {
        0.2: (0.66951, 0.14466, 0.69939, 0.65676, 0.01388, 0.30640),
        0.6: (0.53850, 0.11450, 0.34857, 0.80305, 0.26589, 0.75121),
        1.0: (0.52183, 0.05179, 0.18158, 0.58001, 0.54355, 0.83190),
    },
    (2.0, 4.0): {
        0.2: (0.31562, 0.07110, 0.64532, 0.84245, 0.05341, 0.79100),
        0.6: (0.29103, 0.02161, 0.21861, 0.89516, 0.38642, 1.30735),
        1.0: (0.30276, 0.00389, 0.07055, 0.55356, 0.53920, 1.17412),
    },
}


def largest_error(case, panel, frequencies, layer):
    """Of all coefficients at some Ka; layer : width of the absorber in the longest waves."""
    draught, depth = case
    hull = place_hull("float", cylinder(1.0, draught, panel), position=(-0.045, -0.052))
    periods = [2.0 * math.pi / math.sqrt(G * ka) for ka in frequencies]
    width = layer * float(np.max(wavelength(periods, depth, G)))
    sheet, useful = water_round([hull], SPACING, width, depth)
    bodies = BodiesOnGrid([hull], sheet, useful, DENSITY, G)
    scale = np.max(list(SERIES[case].values()), axis=0) / 5.0
    worst = 0.0
    for ka, period in zip(frequencies, periods, strict=True):
        waves = SteadyWaves(bodies, period)
        mass, damping = waves.added_mass_and_damping([2, 0])
        load = np.abs(waves.scattered(0.0).load()[[2, 0]]) / (DENSITY * G * math.pi)
        moved = DENSITY * math.pi * draught
        found = [
            mass[[2, 0], [0, 1]] / moved,
            damping[[2, 0], [0, 1]] / (moved * waves.frequency),
            load,
        ]
        error = (np.array(found).T.ravel() - SERIES[case][ka]) / np.maximum(SERIES[case][ka], scale)
        worst = max(worst, float(np.abs(error).max()))
    return worst


def test_coefficients_on_448_panels():
    assert largest_error((1.0, 10.0), 0.2, (1.0,), 1.5) < 0.02


@pytest.mark.long
@pytest.mark.parametrize("case", SERIES)
def test_coefficients_on_finer_panels(case):
    assert largest_error(case, 0.15, (0.2, 0.6, 1.0), 1.5) < 0.015
