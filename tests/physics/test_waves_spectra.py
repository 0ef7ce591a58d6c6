"""Spectra, their moments and directional spreading against published and computed values."""

import math

import numpy as np
import pytest
from scipy.integrate import quad
from scipy.special import gamma as gamma_function

from bemwave.waves import (
    jonswap,
    jonswap_normaliser,
    pierson_moskowitz,
    spectral_moment,
    spreading_density,
    spreading_quantile,
    tma,
    tma_depth_factor,
)


def periods(density, peak_period):
    """T01, T02 and Te over the peak period."""
    m = {n: spectral_moment(density, n, peak_period) for n in (-1, 0, 1, 2)}
    mean = 2 * math.pi * m[0] / m[1]
    crossing = 2 * math.pi * math.sqrt(m[0] / m[2])
    energy = 2 * math.pi * m[-1] / m[0]
    return np.array([mean, crossing, energy]) / peak_period


def test_pierson_moskowitz_periods():
    # the moments in closed form: m_n is a Gamma function of 1 - n/4
    ratios = periods(lambda w: pierson_moskowitz(w, 4.0, 10.0), 10.0)
    assert ratios == pytest.approx([0.77177144, 0.71037068, 0.85722254], rel=1e-7)
    assert ratios[1] == pytest.approx((5 * math.pi / 4) ** -0.25, rel=1e-9)


# exact integral, T02/Tp, Te/Tp, computed with scipy
NORMALISERS = [
    (1.0, 1.0, 0.71037068, 0.85722254),
    (2.0, 0.8028102, 0.7464361, 0.8835391),
    (3.3, 0.6557598, 0.7773992, 0.9032959),
    (5.0, 0.5380899, 0.8052858, 0.9191932),
    (7.0, 0.4494040, 0.8284977, 0.9312344),
]


@pytest.mark.parametrize(("peakedness", "factor", "crossing", "energy"), NORMALISERS)
def test_jonswap_normaliser_and_periods(peakedness, factor, crossing, energy):
    assert jonswap_normaliser(peakedness) == pytest.approx(factor, rel=1e-6)
    ratios = periods(lambda w: jonswap(w, 4.0, 10.0, peakedness), 10.0)
    assert ratios[1:] == pytest.approx([crossing, energy], rel=1e-6)


@pytest.mark.parametrize("g", [1.0, 2.0, 3.3, 5.0, 7.0])
def test_jonswap_against_the_fits_of_practice(g):
    # DNV-RP-C205, 3.5.5: 1 - .287 ln(gamma); its period fits are from memory, good to .0017
    assert jonswap_normaliser(g) == pytest.approx(1 - 0.287 * math.log(g), rel=0.02)
    mean, crossing, _ = periods(lambda w: jonswap(w, 4.0, 10.0, g), 10.0)
    assert crossing == pytest.approx(
        0.6673 + 0.05037 * g - 0.00623 * g**2 + 0.0003341 * g**3, abs=0.0017
    )
    assert mean == pytest.approx(
        0.7303 + 0.04936 * g - 0.006556 * g**2 + 0.000361 * g**3, abs=0.0017
    )


def test_jonswap_densities():
    # DNV-RP-C205's form with its fitted factor, Hs = 4, Tp = 10, gamma = 3.3; ours is exact
    frequency = np.array([0.5, 2 * np.pi / 10, 0.8, 1.2])
    with_fit = np.array([0.7383283, 4.9457122, 0.9831867, 0.1874017])
    exact = with_fit * 0.6557598030897296 / (1 - 0.287 * math.log(3.3))
    assert jonswap(frequency, 4.0, 10.0) == pytest.approx(exact, rel=1e-6)


@pytest.mark.parametrize("peakedness", [1.0, 3.3, 7.0])
def test_height_is_exact(peakedness):
    """By a quadrature of the test's own; the fit would give 4.004829 at 3.3."""

    def density(x):  # over ln(w)
        return float(jonswap(np.exp(x), 4.0, 10.0, peakedness) * np.exp(x))

    peak = math.log(2 * math.pi / 10)
    pieces = [(peak - 3, peak - 0.4), (peak - 0.4, peak), (peak, peak + 0.4), (peak + 0.4, 4.0)]
    m0 = sum(quad(density, a, b, epsabs=0, epsrel=1e-10, limit=200)[0] for a, b in pieces)
    tail = density(4.0) / 4
    assert 4 * math.sqrt(m0 + tail) == pytest.approx(4.0, rel=1e-8)


def test_tma_depth_factor():
    # h = 15, g = 9.81, from the formula of Kitaigorodskii et al. (1975)
    factor = tma_depth_factor([0.5, 0.6283185, 0.8, 1.2], 15.0, 9.81)
    assert factor == pytest.approx([0.1903889, 0.2985937, 0.4732766, 0.8698200], rel=1e-6)
    assert tma_depth_factor(1.0, math.inf) == 1.0


def test_tma_height_is_that_at_the_depth():
    m0 = spectral_moment(lambda w: tma(w, 4.0, 10.0, 15.0), 0, 10.0)
    assert 4 * math.sqrt(m0) == pytest.approx(4.0, rel=1e-9)
    w = np.array([0.5, 0.9])
    shape = jonswap(w, 1.0, 10.0) * tma_depth_factor(w, 15.0)
    found = tma(w, 4.0, 10.0, 15.0)
    assert found[0] / found[1] == pytest.approx(shape[0] / shape[1], rel=1e-12)


def test_densities_vanish_quietly_at_both_ends():
    for density in (pierson_moskowitz, jonswap):
        low, high = density(np.array([1e-12, 1e6]), 4.0, 10.0)
        assert low == 0.0
        assert 0.0 < high < 1e-25


@pytest.mark.parametrize(("s", "peak"), [(5.0, 0.64672485), (10.0, 0.90327813), (25.0, 1.41754352)])
def test_spreading(s, peak):
    # Longuet-Higgins, Cartwright & Smith (1963); a1 = s/(s+1), a2 = s(s-1)/((s+1)(s+2))
    assert spreading_density(0.0, s) == pytest.approx(peak, rel=1e-7)
    direct = gamma_function(s + 1) / (2 * math.sqrt(math.pi) * gamma_function(s + 0.5))
    assert spreading_density(0.0, s) == pytest.approx(direct, rel=1e-12)

    def moment(n):
        return quad(lambda a: float(spreading_density(a, s)) * math.cos(n * a), -np.pi, np.pi)[0]

    assert moment(0) == pytest.approx(1.0, rel=1e-9)
    assert moment(1) == pytest.approx(s / (s + 1), rel=1e-9)
    assert moment(2) == pytest.approx(s * (s - 1) / ((s + 1) * (s + 2)), rel=1e-9)


@pytest.mark.parametrize("s", [0.0, 1.0, 10.0, 75.0])
def test_spreading_quantile_inverts_the_integral(s):
    probability = np.array([1e-6, 0.1, 0.5, 0.7, 0.999])
    angle = spreading_quantile(probability, s)
    below = [
        quad(lambda a: float(spreading_density(a, s)), -np.pi, a, epsabs=1e-13)[0] for a in angle
    ]
    assert below == pytest.approx(probability, rel=0, abs=1e-10)
