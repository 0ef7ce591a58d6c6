"""Velocity and pressure under and within a crest.

H = 3 m, T = 8 s, h = 20 m, rho = 1025, g = 9.81, linear wave theory (Dean & Dalrymple 1991,
chapter 4); the figures were computed from the formulas by other means than this program.
"""

import math

import numpy as np
import pytest

from bemwave.errors import InputError
from bemwave.waves import (
    Sea,
    SeaUnderCrests,
    depth_factors,
    extrapolated,
    is_wet,
    make_sea,
    pressure_under_crest,
    stretched_z,
)

WATER = {"depth": 20.0, "density": 1025.0, "gravity": 9.81}
REGULAR = make_sea("regular", height=3.0, period=8.0, **WATER)

# z, u under the crest, amplitude of w, dynamic pressure under the crest
TABLE = [
    (0.0, 1.3257850, 1.1780972, 15082.875),
    (-5.0, 0.9840610, 0.7736815, 11195.230),
    (-10.0, 0.7668151, 0.4671322, 8723.719),
    (-20.0, 0.6081060, 0.0, 6918.155),
]


@pytest.mark.parametrize(("z", "u", "w", "pressure"), TABLE)
def test_below_still_water(z, u, w, pressure):
    at = REGULAR.at([[0.0, 0.0, z]])
    under_crest = at.velocity(0.0)[0]
    assert under_crest == pytest.approx([u, 0.0, 0.0], rel=1e-6, abs=1e-12)
    # the surface rises fastest a quarter period before the crest
    assert at.velocity(-2.0)[0, 2] == pytest.approx(w, rel=1e-6, abs=1e-12)
    assert at.pressure(0.0)[0] == pytest.approx(pressure, rel=1e-6)


def test_the_water_moves_round_ellipses():
    # half axes H/2 cosh k(z + h)/sinh kh along and H/2 sinh k(z + h)/sinh kh upward, a quarter
    # period apart (Dean & Dalrymple 1991, section 4.2)
    k = float(REGULAR.wavenumber[0])
    at = REGULAR.at([[0.0, 0.0, -5.0], [0.0, 0.0, 0.0]])
    along = 1.5 * np.cosh(k * np.array([15.0, 20.0])) / math.sinh(20.0 * k)
    upward = 1.5 * np.sinh(k * np.array([15.0, 20.0])) / math.sinh(20.0 * k)
    # on top under the crest, behind its place a quarter period before that
    assert at.displacement(0.0)[:, 2] == pytest.approx(upward, rel=1e-9)
    assert at.displacement(-2.0)[:, 0] == pytest.approx(-along, rel=1e-9)
    assert at.displacement(0.0)[:, 0] == pytest.approx([0.0, 0.0], abs=1e-12)


@pytest.mark.parametrize("angle", [0.0, 35.0, 180.0, -120.0])
def test_velocity_follows_the_heading(angle):
    sea = make_sea("regular", height=3.0, period=8.0, heading=angle, **WATER)
    u, v, w = sea.velocity([[0.0, 0.0, -5.0]], 0.0)[0]
    assert math.hypot(u, v) == pytest.approx(0.9840610, rel=1e-6)
    assert (u, v) == pytest.approx(
        (0.9840610 * math.cos(math.radians(angle)), 0.9840610 * math.sin(math.radians(angle))),
        rel=1e-6,
        abs=1e-12,
    )
    assert w == pytest.approx(0.0, abs=1e-12)


# z, then u at the crest by Wheeler (1970), by linear extrapolation and without any rule
CRESTS = [
    (1.5, 1.325785, 1.4508326, 1.4585430),
    (0.75, 1.2692158, 1.3883088, 1.3902057),
]


@pytest.mark.parametrize(("z", "wheeler", "linear", "unstretched"), CRESTS)
def test_crest_rules(z, wheeler, linear, unstretched):
    point = [[0.0, 0.0, z]]

    def u(rule):
        return SeaUnderCrests(REGULAR, point, rule).velocity(0.0)[0, 0]

    assert u("wheeler") == pytest.approx(wheeler, rel=1e-6)
    assert u("linear") == pytest.approx(linear, rel=1e-6)
    assert u("cut") == pytest.approx(1.3257850, rel=1e-6)
    cosh, _ = depth_factors(REGULAR.wavenumber, z, 20.0)
    assert 1.3257850 * cosh[0] == pytest.approx(unstretched, rel=1e-6)


def test_wheeler_moves_the_whole_column():
    at = SeaUnderCrests(REGULAR, [[0.0, 0.0, 0.0]], "wheeler")
    assert at.velocity(0.0)[0, 0] == pytest.approx(1.2157406, rel=1e-6)


def test_wheeler_takes_the_whole_surface_it_is_told():
    # 1.5 m of incident crest on a solved surface of -.5 m: the column is that under 1 m
    at = SeaUnderCrests(REGULAR, [[0.0, 0.0, 0.5]], "wheeler")
    expected = REGULAR.velocity([[0.0, 0.0, 20.0 * (0.5 - 1.0) / 21.0]], 0.0)
    assert at.velocity(0.0, [1.0]) == pytest.approx(expected, rel=1e-14)


def test_pressure_within_a_crest_is_that_of_its_height():
    times = np.linspace(0.0, 8.0, 9)
    found = SeaUnderCrests(REGULAR, [[0.0, 0.0, 0.4], [0.0, 0.0, -0.4]], "linear").pressure(times)
    elevation = 1.5 * np.cos(2 * np.pi / 8.0 * times)
    assert found[:, 0] == pytest.approx(1025.0 * 9.81 * elevation, rel=1e-12, abs=1e-9)
    below = REGULAR.pressure([[0.0, 0.0, -0.4]], times)[:, 0]
    assert found[:, 1] == pytest.approx(below, rel=1e-14)
    by_function = pressure_under_crest(
        np.stack([below, below], axis=1), [0.4, -0.4], elevation[:, None], 1025.0, 9.81
    )
    assert by_function == pytest.approx(found, rel=1e-12, abs=1e-9)


@pytest.mark.parametrize("rule", ["linear", "wheeler", "cut"])
@pytest.mark.parametrize("depth", [20.0, math.inf])
def test_rules_meet_the_surface_and_leave_the_deep_alone(rule, depth):
    """On a sea: at z = elevation Wheeler gives the value at z = 0, the others below z = 0 too."""
    sea = make_sea("jonswap", depth=depth, height=2.0, period=7.0, spreading=8.0, components=60)
    t = 13.0
    elevation = float(sea.elevation(3.0, 4.0, t))
    points = np.array([[3.0, 4.0, elevation], [3.0, 4.0, -6.0], [3.0, 4.0, -0.3]])
    found = SeaUnderCrests(sea, points, rule).velocity(t)
    at_zero = sea.velocity([[3.0, 4.0, 0.0]], t)[0]
    if rule == "wheeler":
        assert found[0] == pytest.approx(at_zero, rel=1e-12)
    else:
        assert found[1:] == pytest.approx(sea.velocity(points[1:], t), rel=1e-14)


def test_linear_rule_is_the_tangent_at_still_water():
    sea = make_sea("jonswap", depth=15.0, height=2.0, period=7.0, spreading=8.0, components=60)
    step = 1e-4
    points = np.array([[5.0, -2.0, 0.8]])
    under = np.array([[5.0, -2.0, 0.0], [5.0, -2.0, -step], [5.0, -2.0, -2 * step]])
    for t in (0.0, 3.3):
        f0, f1, f2 = sea.velocity(under, t)
        slope = (3 * f0 - 4 * f1 + f2) / (2 * step)
        found = SeaUnderCrests(sea, points, "linear").velocity(t)[0]
        assert found == pytest.approx(f0 + 0.8 * slope, rel=1e-7)


def test_small_functions_on_fields():
    assert stretched_z(1.0, 1.0, 30.0) == pytest.approx(0.0, abs=1e-15)
    assert stretched_z(-30.0, 1.0, 30.0) == pytest.approx(-30.0, rel=1e-15)
    assert stretched_z(-2.0, 1.0, math.inf) == -3.0
    velocity, slope = np.ones((2, 3, 3)), np.full((2, 3, 3), 0.1)
    assert extrapolated(velocity, slope, [-5.0, 0.0, 2.0])[1, :, 0] == pytest.approx([1, 1, 1.2])
    assert is_wet([[-1.0, 0.2, 0.6]], [[0.5], [-1.5]]).tolist() == [
        [True, True, False],
        [False, False, False],
    ]


def test_an_unknown_rule_is_refused():
    with pytest.raises(InputError, match="crest rule was given as 'none'; expected linear"):
        SeaUnderCrests(Sea.still(20.0), [[0.0, 0.0, 0.0]], "none")
