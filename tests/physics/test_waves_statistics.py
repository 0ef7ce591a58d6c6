"""What a drawn sea realises: height, periods, directions, and steadiness over a patch of sea."""

import math

import numpy as np
import pytest
from scipy.integrate import quad

from bemwave.waves import jonswap, make_sea, pierson_moskowitz, tma

SEA = {"depth": 40.0, "height": 4.0, "period": 8.0}
SEEDS = range(1, 7)


def band_moment(density, order, low=0.5, high=4.0, period=8.0):
    peak = 2 * math.pi / period
    return quad(lambda w: float(density(w)) * w**order, low * peak, high * peak, points=[peak],
                epsrel=1e-10, limit=200)[0]  # fmt: skip


DENSITIES = {
    "jonswap": lambda w: jonswap(w, 4.0, 8.0),
    "pierson-moskowitz": lambda w: pierson_moskowitz(w, 4.0, 8.0),
    "tma": lambda w: tma(w, 4.0, 8.0, 40.0),
}


@pytest.mark.parametrize("kind", DENSITIES)
@pytest.mark.parametrize("seed", SEEDS)
def test_height_share_and_periods(kind, seed):
    sea = make_sea(kind, seed=seed, **SEA)
    density = DENSITIES[kind]
    assert sea.count == 1000
    assert sea.significant_height == pytest.approx(4.0, rel=1e-12)
    assert sea.share == pytest.approx(band_moment(density, 0), rel=1e-6)  # m0 is 1 m^2
    ratio = band_moment(density, 0) / band_moment(density, 2)
    found = sea.moment(0) / sea.moment(2)
    assert math.sqrt(found) == pytest.approx(math.sqrt(ratio), rel=1e-3)


def test_share_beyond_the_band():
    # Pierson-Moskowitz: exp(-5/4 (w/wp)^-4) of the energy lies below w, in closed form
    for high in (2.0, 3.0, 4.0):
        sea = make_sea("pierson-moskowitz", band=(0.5, high), **SEA)
        below = math.exp(-1.25 * high**-4) - math.exp(-1.25 * 0.5**-4)
        assert sea.share == pytest.approx(below, abs=2e-3 if high < 4 else 1e-8)


@pytest.mark.parametrize("spreading", [2.0, 10.0, 25.0])
@pytest.mark.parametrize("seed", SEEDS)
def test_mean_heading_and_spread(spreading, seed):
    sea = make_sea("jonswap", heading=30.0, spreading=spreading, seed=seed, **SEA)
    assert math.degrees(sea.mean_heading) == pytest.approx(30.0, abs=1.0)
    # of cos^2s: a1 = s/(s+1) (Longuet-Higgins, Cartwright & Smith 1963)
    asked = math.sqrt(2 * (1 - spreading / (spreading + 1)))
    assert sea.spread == pytest.approx(asked, rel=0.03)


def test_long_crested_without_spreading():
    sea = make_sea("jonswap", heading=-200.0, **SEA)
    assert np.ptp(sea.heading) == 0.0
    assert math.cos(sea.heading[0] - math.radians(160.0)) == pytest.approx(1.0)


def test_one_heading_a_frequency_and_no_short_repeat_time():
    sea = make_sea("jonswap", spreading=10.0, **SEA)
    spacing = np.diff(np.sort(sea.frequency))
    assert spacing.min() > 0
    assert sea.repeat_time == pytest.approx(2 * math.pi / spacing.min(), rel=1e-9)
    # equal steps of the same number would repeat after this time
    assert sea.repeat_time > 2 * math.pi / (3.5 * 2 * math.pi / 8.0 / 1000)


SQUARES = np.array([[0.0, 0.0], [700.0, -300.0], [-2500.0, 1800.0], [5000.0, 150.0]])


@pytest.mark.parametrize("period", [7.0, 12.0])
@pytest.mark.parametrize("spreading", [None, 10.0])
@pytest.mark.parametrize("seed", [1, 2])
def test_any_square_of_400_m_has_the_height_over_three_hours(period, spreading, seed):
    sea = make_sea("jonswap", depth=60.0, height=4.0, period=period, spreading=spreading, seed=seed)
    rng = np.random.default_rng(seed)
    inside = rng.uniform(-200.0, 200.0, (len(SQUARES), 50, 2)) + SQUARES[:, None]
    points = np.concatenate([inside, np.zeros((len(SQUARES), 50, 1))], axis=-1)
    elevation = sea.at(points).elevation(np.arange(0.0, 10800.0, 2.9))
    rms = np.sqrt((elevation**2).mean(axis=(0, 2)))
    assert rms == pytest.approx(1.0, rel=0.03)  # Hs/4


def test_time_average_of_the_crossing_period():
    """Mean up-crossing period of a 3 h record against 2 pi sqrt(m0/m2) (Rice 1944)."""
    sea = make_sea("jonswap", spreading=10.0, **SEA)
    record = sea.elevation(0.0, 0.0, np.arange(0.0, 10800.0, 0.4))
    crossings = np.count_nonzero((record[:-1] < 0) & (record[1:] >= 0))
    expected = 2 * math.pi * math.sqrt(sea.moment(0) / sea.moment(2))
    assert 10800.0 / crossings == pytest.approx(expected, rel=0.03)


def test_random_amplitudes_follow_rayleigh_and_keep_the_height():
    plain = make_sea("jonswap", **SEA)
    sea = make_sea("jonswap", random_amplitudes=True, **SEA)
    assert sea.significant_height == pytest.approx(4.0, rel=1e-12)
    ratio = (sea.amplitude / plain.amplitude) ** 2
    ratio /= ratio.mean()
    # the square of a Rayleigh variable is exponential: a share exp(-1) lies above the mean
    assert np.mean(ratio > 1) == pytest.approx(math.exp(-1), abs=0.05)
    assert ratio.std() == pytest.approx(1.0, abs=0.15)
    assert np.array_equal(sea.phase, plain.phase)


@pytest.mark.parametrize("wide", [(0.5, 6.0), (0.2, 4.0), (0.0, 9.0)])
@pytest.mark.parametrize("random_amplitudes", [False, True])
def test_a_wider_band_keeps_the_old_components(wide, random_amplitudes):
    asked = {"spreading": 10.0, "seed": 7, "random_amplitudes": random_amplitudes, **SEA}
    old, new = make_sea("jonswap", **asked), make_sea("jonswap", band=wide, **asked)
    assert new.count > old.count
    assert new.share > old.share
    shared = np.isin(new.frequency, old.frequency)
    assert np.array_equal(new.frequency[shared], old.frequency)
    assert np.array_equal(new.heading[shared], old.heading)
    assert np.array_equal(new.phase[shared], old.phase)
    factor = new.amplitude[shared] / old.amplitude
    assert factor == pytest.approx(factor[0], rel=1e-12)
    if not random_amplitudes:
        assert factor[0] == pytest.approx(math.sqrt(old.share / new.share), rel=1e-12)


@pytest.mark.parametrize("spectrum", ["jonswap", "pierson-moskowitz", "tma"])
def test_a_group_meets_at_its_focus(spectrum):
    focus = (30.0, -12.0, 45.0)
    sea = make_sea("group", spectrum=spectrum, spreading=15.0, heading=20.0, focus=focus, **SEA)
    assert sea.elevation(*focus) == pytest.approx(4.0, rel=1e-12)
    x, y = np.meshgrid(np.linspace(-70, 130, 41), np.linspace(-112, 88, 41))
    around = sea.elevation(x, y, np.linspace(35.0, 55.0, 21))
    assert around.max() == pytest.approx(4.0, rel=1e-9)
    # long before, the energy is spread out
    assert np.abs(sea.elevation(x, y, -1000.0)).max() < 0.5
    # the crest in time is the spectrum's autocorrelation (Tromans et al. 1991)
    lag = 2.5
    long = make_sea("group", spectrum=spectrum, focus=focus, **SEA)
    correlation = quad(
        lambda w: float(DENSITIES[spectrum](w)) * math.cos(w * lag),
        0.39,
        3.14,
        points=[2 * math.pi / 8],
        limit=200,
    )[0] / band_moment(DENSITIES[spectrum], 0)
    assert long.elevation(30.0, -12.0, 45.0 + lag) == pytest.approx(4.0 * correlation, abs=0.02)
