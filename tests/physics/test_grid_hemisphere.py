"""Route "grid" at one frequency: a floating hemisphere in deep water.

Hulme (1982), J. Fluid Mech. 121, 443-463: series of wave-free multipoles, summed to six digits
elsewhere; the heave values agree with his table as remembered. Added mass A and damping B over
2/3 pi rho a^3 (B also over the frequency), wave loads X over rho g pi a^2; K = w^2/g. Errors are
over the value or a fifth of the largest in its column, whichever is larger.

Damping and wave loads of one body are tied by Haskind (1957): B33 = k X3^2/(4 rho g Cg),
B11 = k X1^2/(8 rho g Cg), a relation between what the body sends out and what comes in.
"""

import math

import numpy as np
import pytest

from bemwave.errors import RunError
from bemwave.geometry.forms import sphere
from bemwave.geometry.hull import place_hull
from bemwave.stepping import at_frequency
from bemwave.stepping.in_waves import BodiesOnGrid, SteadyWaves
from bemwave.stepping.response import water_round

G, DENSITY = 9.81, 1000.0
VOLUME = 2.0 / 3.0 * math.pi  # of radius 1
SPACING = 1 / 6

# Ka: heave A, B, X, surge A, B, X
HULME = {
    0.2: (0.793828, 0.279300, 0.769866, 0.551533, 0.008153, 0.186015),
    0.5: (0.586080, 0.339053, 0.536467, 0.643897, 0.098670, 0.409277),
    0.8: (0.469790, 0.289892, 0.392164, 0.642116, 0.265308, 0.530566),
    1.0: (0.428432, 0.248398, 0.324690, 0.573952, 0.353489, 0.547769),
    1.5: (0.389046, 0.160614, 0.213177, 0.368321, 0.401352, 0.476570),
    2.0: (0.388377, 0.103060, 0.147886, 0.249279, 0.342411, 0.381214),
}
SCALE = np.maximum(list(HULME.values()), np.max(list(HULME.values()), axis=0) / 5.0)


def ball(panel, longest, layer):
    """A hemisphere off the nodes, its water made for waves up to a length."""
    hull = place_hull("ball", sphere(1.0, 0.0, panel), position=(-0.045, -0.052))
    sheet, useful = water_round([hull], SPACING, layer * longest, math.inf)
    return BodiesOnGrid([hull], sheet, useful, DENSITY, G)


def coefficients(bodies, ka):
    """As in the table, and the loads that Haskind's relation makes of the damping."""
    frequency = math.sqrt(G * ka)
    waves = SteadyWaves(bodies, 2.0 * math.pi / frequency)
    mass, damping = waves.added_mass_and_damping([2, 0])
    mass, damping = mass[[2, 0], [0, 1]], damping[[2, 0], [0, 1]]
    load = np.abs(waves.scattered(0.0).load()[[2, 0]])
    speed = 0.5 * frequency / ka
    sent = np.sqrt(np.array([4.0, 8.0]) * DENSITY * G * speed * damping / ka)
    table = [mass / (DENSITY * VOLUME), damping / (DENSITY * VOLUME * frequency)]
    table = np.array([*table, load / (DENSITY * G * math.pi)]).T.ravel()
    return table, load / sent


def test_coefficients_on_484_panels():
    table, haskind = coefficients(ball(0.148, 2.0 * math.pi, 1.75), 1.0)
    error = (table - HULME[1.0]) / SCALE[list(HULME).index(1.0)]
    assert np.abs(error).max() < 0.01
    assert haskind == pytest.approx(1.0, abs=0.005)


@pytest.mark.slow
@pytest.mark.parametrize("frequencies", [(0.2,), (0.5, 0.8, 1.0, 1.5, 2.0)])
def test_coefficients_on_1024_panels(frequencies):
    bodies = ball(0.0982, 2.0 * math.pi / min(frequencies), 2.0)
    assert len(bodies.flow.elements.hull) == 1024
    for ka in frequencies:
        table, haskind = coefficients(bodies, ka)
        error = (table - HULME[ka]) / SCALE[list(HULME).index(ka)]
        assert np.abs(error).max() < 0.005
        assert haskind == pytest.approx(1.0, abs=0.01)


def test_iterations_that_do_not_come_to_an_end_are_an_error(monkeypatch):
    monkeypatch.setattr(at_frequency, "BASIS", 2)
    monkeypatch.setattr(at_frequency, "CYCLES", 1)
    waves = SteadyWaves(ball(0.5, 2.0, 1.0), 1.2)
    with pytest.raises(RunError, match="2 iterations leave"):
        waves.added_mass_and_damping([2])
