"""Dispersion, speeds and power against published tables and against mpmath."""

import math

import mpmath
import numpy as np
import pytest

from bemwave.errors import InputError
from bemwave.waves import (
    group_speed,
    irregular_wave_power,
    phase_speed,
    wave_power,
    wavelength,
    wavenumber,
    wavenumber_of_frequency,
)

# Shore Protection Manual (1984), App. C, Tables C-1..C-3, digits recomputed to seven places;
# the row d/L0 = .10 is from memory. d/L0, d/L, Ks, n, Cg/C0
TABLE = [
    (0.01, 0.0403168, 1.434779, 0.9792336, 0.2428845),
    (0.02, 0.0576282, 1.225791, 0.9588309, 0.3327645),
    (0.05, 0.0941549, 1.022860, 0.8999335, 0.4779007),
    (0.10, 0.1409807, 0.932729, 0.8102498, 0.5747239),
    (0.15, 0.1833018, 0.913331, 0.7324682, 0.5993953),
    (0.20, 0.2251153, 0.918074, 0.6677125, 0.5932181),
    (0.30, 0.3121185, 0.948943, 0.5776804, 0.5552511),
    (0.50, 0.5018284, 0.990492, 0.5115089, 0.5096453),
]


@pytest.mark.parametrize("row", TABLE)
def test_shore_protection_manual(row):
    ratio, relative_depth, shoaling, n, group = row
    period = 8.0
    deep_length = wavelength(period, math.inf)
    deep_speed = phase_speed(period, math.inf)
    depth = ratio * deep_length
    cg = group_speed(period, depth)
    found = (
        depth / wavelength(period, depth),
        math.sqrt(deep_speed / (2 * cg)),
        cg / phase_speed(period, depth),
        cg / deep_speed,
    )
    assert found == pytest.approx((relative_depth, shoaling, n, group), rel=0, abs=1e-6)


def test_deep_water_length():
    # g T^2/(2 pi)
    assert wavelength(1.0, math.inf, 9.81) == pytest.approx(1.5613100, rel=1e-7)
    assert wavelength(1.0, math.inf) == pytest.approx(1.5607768, rel=1e-7)


def test_worked_figures():
    # linear theory with g = 9.81, computed independently with scipy (Dean & Dalrymple 1991)
    assert wavenumber(8.0, 20.0, 9.81) == pytest.approx(0.0707624287, rel=1e-9)
    assert wavelength(8.0, 20.0, 9.81) == pytest.approx(88.7926746, rel=1e-9)
    assert phase_speed(8.0, 20.0, 9.81) == pytest.approx(11.0990843, rel=1e-8)
    assert group_speed(8.0, 20.0, 9.81) == pytest.approx(7.4090335, rel=1e-8)
    assert wavelength(10.0, 30.0, 9.81) == pytest.approx(137.2948929, rel=1e-9)
    assert group_speed(10.0, 30.0, 9.81) == pytest.approx(9.2948056, rel=1e-8)
    assert wave_power(2.0, 8.0, 20.0, 1025.0, 9.81) == pytest.approx(37249.842, rel=1e-7)
    assert wave_power(2.0, 10.0, math.inf, 1025.0, 9.81) == pytest.approx(39248.406, rel=1e-7)
    assert irregular_wave_power(1.0, 1.0, 1025.0, 9.81) == pytest.approx(490.60507, rel=1e-7)


@pytest.mark.parametrize("depth", [1e-6, 1e-3, 0.5, 20.0, 300.0, 1e4, 1e7])
def test_against_mpmath(depth):
    periods = np.geomspace(0.05, 2000.0, 9)
    found = wavenumber(periods, depth)
    with mpmath.workdps(40):
        for period, k in zip(periods, found, strict=True):
            w2 = (2 * mpmath.pi / mpmath.mpf(float(period))) ** 2
            alpha = w2 * mpmath.mpf(depth) / mpmath.mpf(9.80665)
            start = mpmath.mpf(float(k)) * depth
            x = mpmath.findroot(lambda x, a=alpha: x * mpmath.tanh(x) - a, start)
            assert abs(float(k) * mpmath.mpf(depth) / x - 1) < 2e-15


def test_residual_over_the_whole_range():
    period = np.geomspace(1e-2, 1e5, 4001)[:, None]
    depth = np.append(np.geomspace(1e-4, 1e5, 40), math.inf)
    k = wavenumber(period, depth)
    assert k.shape == (4001, 41)
    residual = 9.80665 * k * np.tanh(k * depth) * (period / (2 * np.pi)) ** 2 - 1
    assert np.abs(residual).max() < 1e-14


def test_group_speed_is_the_slope_of_the_dispersion_relation():
    for depth in (0.01, 3.0, 50.0, math.inf):
        w = 2 * np.pi / 7.0
        below, above = wavenumber_of_frequency(np.array([w - 1e-5, w + 1e-5]), depth)
        assert group_speed(7.0, depth) == pytest.approx(2e-5 / (above - below), rel=1e-8)


def test_a_number_in_gives_a_number_out():
    assert isinstance(wavenumber(8.0, 20.0), float)
    assert wavenumber([8.0, 9.0], 20.0).shape == (2,)


@pytest.mark.parametrize(
    ("period", "depth", "words"),
    [
        (0.0, 20.0, "period of a wave was given as 0; expected a number above zero"),
        (8.0, -3.0, "depth of a wave was given as -3; expected a number above zero .*deep water"),
        ([8.0, math.nan], 20.0, "period of a wave was given as nan"),
    ],
)
def test_what_is_not_positive_is_refused(period, depth, words):
    with pytest.raises(InputError, match=words):
        wavenumber(period, depth)
