"""A mound of water let go in deep and shallow water: elevation, velocities, energy.

The Cauchy-Poisson problem, Lamb, Hydrodynamics, art. 255, in finite depth with k tanh kh for k.
The mound is exp(-r^2/2), at rest, metres. A quarter of the water is solved; the sides x = 0
and y = 0 are mirrors. Its longest waves fade but slowly, so the water is wide for the times.
"""

import math

import numpy as np
import pytest
from scipy.integrate import quad
from scipy.special import j0, j1

from bemwave.case import Case
from bemwave.running.solution import Solution
from bemwave.running.survey import survey

G, DENSITY = 9.81, 1000.0
LARGEST_K = 9.0  # exp(-k^2/2) is then 3e-18


def integral(integrand):
    return quad(integrand, 1e-12, LARGEST_K, limit=400)[0]


def frequency(k, depth):
    return np.sqrt(G * k * np.tanh(k * depth))


def elevation(r, time, depth):
    return integral(
        lambda k: k * np.exp(-k * k / 2) * j0(k * r) * np.cos(frequency(k, depth) * time)
    )


def velocity(r, z, time, depth):
    """Outward and upward."""

    def potential(k):
        w = frequency(k, depth)
        return -G / w * np.sin(w * time) * k * np.exp(-k * k / 2)

    def fall(k, sign):  # cosh k(z+h)/cosh kh, or with sinh above
        deep = np.exp(-2 * k * (z + depth)) if math.isfinite(depth) else 0.0
        bed = np.exp(-2 * k * depth) if math.isfinite(depth) else 0.0
        return np.exp(k * z) * (1 + sign * deep) / (1 + bed)

    outward = integral(lambda k: -k * potential(k) * j1(k * r) * fall(k, 1))
    return outward, integral(lambda k: k * potential(k) * j0(k * r) * fall(k, -1))


DEPTHS = (math.inf, 2.0)


@pytest.mark.parametrize(
    ("place", "values"),
    [
        ((0, 1), (-0.61349607, -0.54988785)),
        ((5, 4), (-0.02692263, -0.02307956)),
        ((10, 8), (-0.06294542, -0.05386094)),
        ((20, 12), (0.01936171, -0.00939459)),
    ],
)
def test_the_integrals_have_the_digits_of_their_table(place, values):
    assert [elevation(*place, depth) for depth in DEPTHS] == pytest.approx(values, abs=1e-8)


@pytest.mark.parametrize(
    ("place", "values"),
    [
        ((2, -1, 1), (0.07053065, -0.26555607, 0.14077925, -0.19676003)),
        ((5, -0.5, 2), (-0.06449204, -0.16738599, 0.01451076, -0.18838776)),
    ],
)
def test_velocities_have_the_digits_of_their_table(place, values):
    found = np.concatenate([velocity(*place, depth) for depth in DEPTHS])
    assert found == pytest.approx(values, abs=1e-8)


def let_go(depth, size, absorber, spacing, duration):
    return Solution(
        survey(
            Case(
                water={"depth": depth if math.isfinite(depth) else "deep", "gravity": G,
                       "density": DENSITY},
                hump=[{"height": 1.0, "width": 1.0, "centre": [0.0, 0.0]}],
                surface={
                    "size": [size, size],
                    "centre": [0.5 * size, 0.5 * size],
                    "spacing": spacing,
                    "absorber": absorber,
                    "edges": {"x_min": "wall", "y_min": "wall"},
                },
                run={"duration": duration},
            )
        )
    )  # fmt: skip


def errors(solution, depth, times, radii, below):
    """Largest errors of elevation and velocity, and the largest velocity met."""
    angles = (0.0, 0.6)
    ways = np.array([[math.cos(angle), math.sin(angle)] for angle in angles])
    plan = np.concatenate([r * ways for r in radii])
    points = np.array([[*(r * way), z] for r in radii for way in ways for z in below])
    samplers = solution.samplers()
    surface, inside = samplers.surface_sampler(plan), samplers.sampler(points)
    wrong = np.zeros(2)
    fastest = 0.0
    for time in times:
        solution.advance_to(time)
        state = solution.state(time)
        level = np.repeat([elevation(r, time, depth) for r in radii], len(ways))
        wrong[0] = max(wrong[0], np.abs(surface.elevation(state) - level).max())
        exact = np.array(
            [
                [*(u * way), w]
                for r in radii
                for flows in [[velocity(r, z, time, depth) for z in below]]
                for way in ways
                for u, w in flows
            ]
        )
        wrong[1] = max(wrong[1], np.abs(inside.velocity(state) - exact).max())
        fastest = max(fastest, np.abs(exact).max())
    return *wrong, fastest


@pytest.mark.parametrize("depth", DEPTHS)
def test_elevation_and_velocities(depth):
    """Both within 1 % of the peak: 1 m at the start, and the fastest water."""
    solution = let_go(depth, 7.0, 6.3, 0.35, 2.0)
    times, radii = (0.0, 0.5, 1.0, 1.5, 2.0), (0.0, 1.0, 2.0, 3.0, 5.0)
    level, moving, fastest = errors(solution, depth, times, radii, (0.0, -0.1, -0.5, -1.0))
    assert level < 0.01
    assert moving < 0.01 * fastest


@pytest.mark.slow
@pytest.mark.parametrize("depth", DEPTHS)
def test_elevation_and_velocities_far_and_late(depth):
    """To r = 10 and t = 8."""
    solution = let_go(depth, 13.2, 12.0, 0.37, 8.0)
    times, radii = (0.5, 1.0, 2.0, 4.0, 8.0), (0.0, 2.0, 5.0, 7.0, 10.0)
    level, moving, fastest = errors(solution, depth, times, radii, (0.0, -0.1, -0.5, -1.0))
    assert level < 0.01
    assert moving < 0.01 * fastest


def test_share_of_potential_energy():
    """Deep water, of rho g pi/2 in all; the quarter solved has a fourth of each."""
    solution = let_go(math.inf, 9.1, 6.3, 0.35, 1.5)
    density_g = DENSITY * G
    total = density_g * math.pi / 2
    assert total == pytest.approx(15409.512, abs=1e-3)
    shares = {0.25: 0.56917989, 0.5: 0.15305897, 1.0: 0.61429096, 1.5: 0.47887044}
    for time, share in shares.items():
        solution.advance_to(time)
        state = solution.state(time)
        potential = 0.5 * density_g * state.elevation @ (solution.flow.mass @ state.elevation)
        assert 4 * potential / total == pytest.approx(share, abs=0.005)
        assert 4 * solution.energy(state)[0] == pytest.approx(total, rel=0.005)
