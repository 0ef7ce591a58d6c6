"""A floating hemisphere forced in heave in deep water: added mass, damping, power radiated.

Hulme (1982), J. Fluid Mech. 121, 443-463: series of wave-free multipoles, summed to six digits
elsewhere; the heave values agree with his table as remembered. Added mass over
2/3 pi rho a^3, damping over that times the frequency; K = w^2/g. The power that the motion puts
into the water is B w^2 amplitude^2 / 2, and with no other loss the absorber takes all of it.
"""

import math

import numpy as np
import pytest

from bemwave.case import Case
from bemwave.running.solution import Solution
from bemwave.running.survey import survey

G, DENSITY = 9.81, 1000.0
VOLUME = 2.0 / 3.0 * math.pi  # of radius 1
AMPLITUDE = 0.1
HULME = {0.5: (0.586080, 0.339053), 1.0: (0.428432, 0.248398), 2.0: (0.388377, 0.103060)}


def harmonic(times, values, frequency):
    """Cosine and sine amplitudes of a record, its mean apart."""
    columns = [np.cos(frequency * times), np.sin(frequency * times), np.ones_like(times)]
    return np.linalg.lstsq(np.column_stack(columns), values, rcond=None)[0][:2]


def forced_heave(ka, useful, spacing, panel):
    """Added mass and damping as Hulme has them, and the share of the power the absorber takes.

    useful : diameter of the water inside the absorber, in wavelengths; spacing : over wavelength.
    """
    frequency, wavelength = math.sqrt(G * ka), 2 * math.pi / ka
    period = 2 * math.pi / frequency
    case = Case(
        water={"depth": "deep", "gravity": G, "density": DENSITY},
        surface={
            "outline": "circle",
            "size": useful * wavelength,
            "spacing": spacing * wavelength,
            "fine_spacing": panel,
        },
        body=[
            {
                "name": "ball",
                "form": "sphere",
                "radius": 1.0,
                "panel_size": panel,
                "attitude": "forced",
                "forced": {"mode": "heave", "amplitude": AMPLITUDE, "period": period},
            }
        ],
        run={"duration": 13 * period},
    )
    solution = Solution(survey(case))
    # what the start sends out and the absorber lets back is gone by then
    times = np.arange(11 * period, 13 * period, solution.step)[:80]
    force, taken = np.zeros((2, len(times)))
    for k, time in enumerate(times):
        solution.advance_to(time)
        force[k] = solution.loads(time)["force_radiated"][0, 2]
        taken[k] = solution.energy(solution.state(time))[2]
    # motion sin(w t), so force = A w^2 sin(w t) - B w cos(w t)
    cosine, sine = harmonic(times, force, frequency) / (AMPLITUDE * DENSITY * VOLUME)
    damping = -cosine / frequency**2
    work = 0.5 * damping * DENSITY * VOLUME * frequency**3 * AMPLITUDE**2
    return sine / frequency**2, damping, taken.mean() / work


@pytest.mark.usefixtures("needs_gmsh")
@pytest.mark.parametrize(
    ("ka", "useful", "spacing"), [(0.5, 1.2, 0.095), (1.0, 1.4, 0.11), (2.0, 1.6, 0.11)]
)
def test_added_mass_and_damping_on_2300_triangles(ka, useful, spacing):
    mass, damping, share = forced_heave(ka, useful, spacing, 0.25)
    assert mass == pytest.approx(HULME[ka][0], rel=0.02)
    assert damping == pytest.approx(HULME[ka][1], rel=0.02)
    assert share == pytest.approx(1.0, abs=0.005)


@pytest.mark.slow
@pytest.mark.usefixtures("needs_gmsh")
@pytest.mark.parametrize(
    ("ka", "useful", "spacing"), [(0.5, 1.8, 0.08), (1.0, 2.0, 0.09), (2.0, 2.4, 0.1)]
)
def test_added_mass_and_damping_on_finer_and_wider_water(ka, useful, spacing):
    mass, damping, _ = forced_heave(ka, useful, spacing, 0.2)
    assert mass == pytest.approx(HULME[ka][0], rel=0.01)
    assert damping == pytest.approx(HULME[ka][1], rel=0.01)
