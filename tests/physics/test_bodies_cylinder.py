"""A cylinder that stands on the bed, in regular waves: force and run-up.

MacCamy & Fuchs (1954), Beach Erosion Board Technical Memorandum 69: the series of Bessel
functions summed here, its digits checked against a table of it made elsewhere.
"""

import math

import numpy as np
import pytest
from scipy.special import h1vp, hankel1, jv, jvp

from bemwave.case import Case
from bemwave.running.solution import Solution
from bemwave.running.survey import survey

G, DENSITY = 9.81, 1000.0
AMPLITUDE = 0.05
# seen from the waves: front, side, back; angles from the heading
ANGLES = np.array([math.pi, 0.5 * math.pi, 0.0])


def run_up(ka, angle):
    """Elevation at the cylinder over the incident amplitude."""
    total = 0.0
    for m in range(40):
        scattered = jvp(m, ka) / h1vp(m, ka) * hankel1(m, ka)
        total += (1 if m == 0 else 2) * 1j**m * np.cos(m * angle) * (jv(m, ka) - scattered)
    return abs(total)


def inertia_coefficient(ka):
    """Force over that of the undisturbed pressure gradient on the displaced water."""
    return 4.0 / (math.pi * ka**2 * abs(h1vp(1, ka)))


@pytest.mark.parametrize(
    ("ka", "coefficient", "heights"),
    [
        (0.2, 2.047559, (1.045620, 0.977244, 0.998940)),
        (0.5, 2.005632, (1.431593, 0.978343, 0.995131)),
        (1.0, 1.371616, (1.707078, 1.171285, 0.888192)),
        (2.0, 0.560834, (1.858533, 1.296593, 0.731847)),
    ],
)
def test_the_series_has_the_digits_of_its_table(ka, coefficient, heights):
    assert inertia_coefficient(ka) == pytest.approx(coefficient, abs=1e-6)
    assert [run_up(ka, angle) for angle in ANGLES] == pytest.approx(heights, abs=1e-6)


def amplitude(times, values, frequency):
    """Of the harmonic in a record (times,) or (times, n), its mean apart."""
    columns = [np.cos(frequency * times), np.sin(frequency * times), np.ones_like(times)]
    return np.hypot(*np.linalg.lstsq(np.column_stack(columns), values, rcond=None)[0][:2])


def pile_in_waves(ka, depth, useful, spacing, panel):
    """Force over its exact amplitude, and run-up (3,) over the incident amplitude.

    useful, spacing : over the wavelength; panel : on the cylinder and at its waterline.
    """
    wavelength = 2 * math.pi / ka
    frequency = math.sqrt(G * ka * math.tanh(ka * depth))
    period = 2 * math.pi / frequency
    case = Case(
        water={"depth": depth, "gravity": G, "density": DENSITY},
        waves=[{"kind": "regular", "height": 2 * AMPLITUDE, "period": period}],
        surface={
            "outline": "circle",
            "size": useful * wavelength,
            "spacing": spacing * wavelength,
            "fine_spacing": panel,
        },
        body=[
            {
                "name": "pile",
                "form": "cylinder",
                "radius": 1.0,
                "draught": "bed",
                "panel_size": panel,
            }
        ],
        run={"duration": 10 * period},
    )
    solution = Solution(survey(case))
    corner = np.hypot(*solution.survey.hulls[0].mesh.points[:, :2].T).max()
    places = corner * np.column_stack([np.cos(ANGLES), np.sin(ANGLES)])
    surface, sea = solution.samplers().surface_sampler(places), solution.survey.sea
    times = np.arange(8 * period, 10 * period, solution.step)[:80]
    force, elevation = np.zeros(len(times)), np.zeros((len(times), 3))
    for k, time in enumerate(times):
        solution.advance_to(time)
        force[k] = solution.loads(time)["force"][0, 0]
        solved = surface.elevation(solution.state(time))
        elevation[k] = solved + sea.elevation(places[:, 0], places[:, 1], time)
    # C_M rho pi a^2 int of the acceleration k g A cosh k(z+h)/cosh kh over the depth
    undisturbed = DENSITY * math.pi * G * AMPLITUDE * math.tanh(ka * depth)
    ratio = amplitude(times, force, frequency) / (inertia_coefficient(ka) * undisturbed)
    return ratio, amplitude(times, elevation, frequency) / AMPLITUDE


@pytest.mark.usefixtures("needs_gmsh")
@pytest.mark.parametrize(
    ("ka", "depth", "useful", "spacing", "panel"),
    [
        (0.5, 2.0, 1.0, 0.11, 0.18),
        (1.0, 2.0, 1.4, 0.11, 0.18),
        pytest.param(2.0, 1.5, 2.0, 0.11, 0.11, marks=pytest.mark.slow),
    ],
)
def test_force_and_run_up(ka, depth, useful, spacing, panel):
    force, heights = pile_in_waves(ka, depth, useful, spacing, panel)
    wanted = np.array([run_up(ka, angle) for angle in ANGLES])
    assert force == pytest.approx(1.0, abs=0.01)
    np.testing.assert_allclose(heights, wanted, atol=0.02)
