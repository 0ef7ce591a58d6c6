"""Route "grid" at one frequency: cylinders that stand on the bed, one alone and four.

One: MacCamy & Fuchs (1954), Beach Erosion Board Technical Memorandum 69, the series of Bessel
functions summed here; its mean drift by the momentum of the scattered waves, the digits checked
against a table made elsewhere. Four: method of Linton & Evans (1990), J. Fluid Mech. 215:549,
summed elsewhere. All of it goes with cosh k(z+h) over the depth, so that the water may be shallow.
"""

import math

import numpy as np
import pytest
from scipy.special import h1vp, hankel1, jv, jvp

from bemwave.geometry.forms import cylinder
from bemwave.geometry.hull import place_hull
from bemwave.stepping.in_waves import DIRECTIONS, BodiesOnGrid, SteadyWaves
from bemwave.stepping.response import response, water_round

G, DENSITY = 9.81, 1000.0
TERMS = [(m, 1 if m == 0 else 2) for m in range(40)]


def run_up(ka, angle):
    """Elevation at the cylinder over the incident amplitude."""
    parts = (
        share * 1j**m * np.cos(m * angle) * (jv(m, ka) - jvp(m, ka) / h1vp(m, ka) * hankel1(m, ka))
        for m, share in TERMS
    )
    return np.abs(sum(parts))


def force(ka, depth):
    """Per metre of incident amplitude, radius 1."""
    return 4.0 * DENSITY * G * math.tanh(ka * depth) / (ka**2 * abs(h1vp(1, ka)))


def drift(ka):
    """Mean force over rho g a A^2 Cg/C: Maruo (1960), J. Ship Res. 4(3):1."""
    far = sum(share * jvp(m, ka) / h1vp(m, ka) * np.cos(m * DIRECTIONS) for m, share in TERMS)
    return 2.0 / ka * float(np.mean((1.0 - np.cos(DIRECTIONS)) * np.abs(far) ** 2))


@pytest.mark.parametrize(("ka", "value"), [(0.5, 0.571971), (1.0, 1.329851), (2.0, 1.254349)])
def test_the_series_has_the_digits_of_its_table(ka, value):
    assert drift(ka) == pytest.approx(value, abs=1e-6)


def piles(places, panel, spacing, depth, longest, layer):
    """Cylinders of radius 1 on a grid for waves up to a length, and the places of their axes."""
    places = np.array(places) - spacing * np.array([0.27, 0.31])  # off the nodes
    form = cylinder(1.0, depth, panel, stands_on_bed=True)
    hulls = [place_hull(f"pile {i}", form, position=tuple(at)) for i, at in enumerate(places)]
    sheet, useful = water_round(hulls, spacing, layer * longest, depth)
    return BodiesOnGrid(hulls, sheet, useful, DENSITY, G), places


def in_waves(bodies, ka, heading=0.0):
    """What they scatter, and the group speed over the speed of crests."""
    kh = ka * bodies.flow.sheet.depth
    waves = SteadyWaves(bodies, 2.0 * math.pi / math.sqrt(G * ka * math.tanh(kh)))
    return waves.scattered(heading), 0.5 + kh / math.sinh(2.0 * kh)


@pytest.mark.parametrize(
    ("panel", "spacing", "depth", "frequencies"),
    [
        (0.2, 1 / 8, 0.6, (1.0,)),
        pytest.param(0.2, 1 / 6, 1.0, (0.2,), marks=pytest.mark.slow),
        pytest.param(0.15, 1 / 10, 0.6, (0.5, 1.0), marks=pytest.mark.slow),
        pytest.param(0.1, 1 / 14, 0.4, (2.0, 3.0), marks=pytest.mark.slow),
    ],
)
def test_force_run_up_and_drift(panel, spacing, depth, frequencies):
    longest = 2.0 * math.pi / min(frequencies)
    bodies, (axis,) = piles([(0.0, 0.0)], panel, spacing, depth, longest, 2.0)
    for ka in frequencies:
        scattered, speeds = in_waves(bodies, ka)
        assert abs(scattered.load()[0]) == pytest.approx(force(ka, depth), rel=0.005)
        places, elevation = scattered.at_waterlines()
        angle = np.arctan2(*(places - axis).T[::-1])
        np.testing.assert_allclose(np.abs(elevation), run_up(ka, angle), atol=0.02)
        ahead, aside = scattered.mean_drift() / (DENSITY * G * speeds)
        assert ahead == pytest.approx(drift(ka), rel=0.03)
        assert abs(aside) < 0.003 * drift(ka)


FOUR = [(2.0, 2.0), (-2.0, 2.0), (-2.0, -2.0), (2.0, -2.0)]
# (ka, heading in degrees): force over that of one alone, largest elevation at each
LINTON_EVANS = {
    (1.0, 45.0): ((0.703847, 0.831299, 1.320287, 0.831299), (1.0436, 1.5216, 2.0324, 1.5216)),
    (1.0, 0.0): ((0.853966, 0.747383, 0.747383, 0.853966), None),
    (1.66, 45.0): ((1.754761, 1.709020, 2.152163, 1.709020), (4.2862, 3.5382, 2.7870, 3.5382)),
}


@pytest.mark.slow
def test_four_piles():
    bodies, axes = piles(FOUR, 0.2, 1 / 8, 0.4, 2.0 * math.pi, 1.5)
    for (ka, heading), (forces, elevations) in LINTON_EVANS.items():
        scattered, _ = in_waves(bodies, ka, math.radians(heading))
        # the square root of both components' squares, as the method adds them
        found = np.linalg.norm(scattered.load().reshape(4, 6)[:, :2], axis=1)
        assert found / force(ka, 0.4) == pytest.approx(forces, rel=0.02)
        if elevations:
            places, elevation = scattered.at_waterlines()
            own = np.linalg.norm(places[:, None] - axes, axis=2).argmin(axis=1)
            highest = [np.abs(elevation[own == number]).max() for number in range(4)]
            assert highest == pytest.approx(elevations, rel=0.02)


def test_response_has_the_names_and_phases_of_its_table():
    """A pile elsewhere, turned with the waves: its own axes, and the wave at its own origin."""
    ka, depth, turned = 1.0, 0.6, math.radians(30.0)
    form = cylinder(1.0, depth, 0.2, stands_on_bed=True)
    hull = place_hull("pile", form, position=(3.03, -2.04), heading=turned)
    period = 2.0 * math.pi / math.sqrt(G * ka * math.tanh(ka * depth))
    found = response(
        [hull], [period], [turned], spacing=1 / 8, depth=depth, density=DENSITY, gravity=G
    )
    assert found.modes[0] == "pile/surge"
    assert found.added_mass.shape == found.damping.shape == (1, 6, 6)
    assert found.wave_load_amplitude.shape == found.wave_load_phase.shape == (1, 1, 6)
    surge, sway = found.wave_load_amplitude[0, 0, :2]
    assert surge == pytest.approx(force(ka, depth), rel=0.006)
    assert sway < 0.001 * surge
    # the series' first term: F = 4 rho g tanh(kh)/(k^2 a H1'(ka)) exp(-i w t)
    phase = -np.angle(h1vp(1, ka))
    assert found.wave_load_phase[0, 0, 0] == pytest.approx(phase, abs=0.01)
    # Haskind (1957): B11 = k X1^2/(8 rho g Cg)
    speed = math.sqrt(G * math.tanh(ka * depth) / ka)
    speed *= 0.5 + ka * depth / math.sinh(2.0 * ka * depth)
    assert found.damping[0, 0, 0] == pytest.approx(
        ka * surge**2 / (8.0 * DENSITY * G * speed), rel=0.01
    )
    assert found.returned[0] < 0.003
