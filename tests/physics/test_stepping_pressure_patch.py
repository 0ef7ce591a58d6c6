"""A pressure patch switched on and run over deep water: the elevation of its wake.

Lamb, Hydrodynamics, art. 256; Havelock (1908, 1917). By Fourier's integral the patch
p = rho g head exp(-r^2/2), let go at t = 0 with speed U, raises the water by

    eta = -1/(2 pi) int int g head exp(-k^2/2) k/w int_0^t sin(w s) exp(i k.(x - U (t - s))) ds dk
"""

import math

import numpy as np
import pytest

from bemwave.case import Case
from bemwave.running.solution import Solution
from bemwave.running.survey import survey

G, HEAD, SPEED, TIME = 9.81, 0.1, 4.0, 8.0
# places behind the patch, across from its track, and the elevation there
WAKE = {
    (0.0, 0.0): -0.04442198,
    (-4.0, 0.0): 0.01295213,
    (-8.0, 0.0): 0.02651501,
    (-8.0, 3.0): 0.10071583,
    (-12.0, 4.0): -0.06454533,
}


def elevation(behind, across, count=1500):
    """The integral by the midpoint rule in wavenumber and direction."""
    k = (np.arange(count) + 0.5) * 8.0 / count
    k, angle = np.meshgrid(k, (np.arange(count) + 0.5) * math.pi / count)
    w, ahead = np.sqrt(G * k), k * np.cos(angle)

    def turned(rate):  # int_0^t exp(i rate s) ds
        return TIME * np.exp(0.5j * rate * TIME) * np.sinc(rate * TIME / (2 * math.pi))

    lasting = (turned(ahead * SPEED + w) - turned(ahead * SPEED - w)) / 2j
    field = np.exp(1j * ahead * behind) * np.cos(k * np.sin(angle) * across)
    each = -G * HEAD * np.exp(-k * k / 2) * k**2 / w * lasting * field
    return each.sum().real * (8.0 / count) * (math.pi / count) / math.pi


def test_the_integral_has_the_digits_of_its_table():
    found = [elevation(*place) for place in WAKE]
    assert found == pytest.approx(list(WAKE.values()), abs=1e-6)


@pytest.mark.slow
def test_wake():
    """Half the water, y = 0 a mirror; within 2 % of the highest wave."""
    case = Case(
        water={"depth": "deep", "gravity": G},
        pressure=[{"head": HEAD, "width": 1.0, "centre": [0.0, 0.0], "velocity": [SPEED, 0.0]}],
        surface={
            "size": [32.0, 9.0],
            "centre": [18.0, 4.5],
            "spacing": 0.4,
            "absorber": 6.0,
            "edges": {"y_min": "wall"},
        },
        run={"duration": TIME},
    )
    solution = Solution(survey(case))
    places = np.array(list(WAKE)) + np.array([SPEED * TIME, 0.0])
    solution.advance_to(TIME)
    found = solution.samplers().surface_sampler(places).elevation(solution.state(TIME))
    np.testing.assert_allclose(found, list(WAKE.values()), atol=0.02 * max(WAKE.values()))
