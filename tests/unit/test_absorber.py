"""The absorbing layer: its rate, its size, and the computation of what it reflects."""

import math

import numpy as np
import pytest
from scipy.optimize import newton

from bemwave.errors import InputError
from bemwave.stepping.absorber import Layer, layer_for, reflection
from bemwave.waves.dispersion import phase_speed, wavenumber

G = 9.80665
DEPTHS = [math.inf, 0.2, 0.05, 0.016]  # wavelengths


def frequency(depth):
    return math.sqrt(G * 2 * math.pi * math.tanh(2 * math.pi * depth))


def test_rate_is_zero_in_useful_water_and_grows_with_the_square_outside():
    layer = Layer(width=8.0, strength=2.0, reflection=0.01)
    np.testing.assert_allclose(layer.rate(np.array([0.0, 4.0, 8.0])), [0.0, 0.5, 2.0])


@pytest.mark.parametrize("depth", DEPTHS)
@pytest.mark.parametrize("angle", [0.0, math.radians(30.0)])
def test_gentle_layer_before_a_wall_reflects_what_slow_damping_leaves(depth, angle):
    """Source: WKB on the local dispersion k tanh kh = (w^2 + i w nu)/g of damped elevation."""
    w, width = frequency(depth), 4.0
    layer = Layer(width, 0.15 * w, math.nan)
    across = 2 * math.pi * math.sin(angle)
    s = (np.arange(400) + 0.5) / 400 * width
    k = np.full(400, 2 * math.pi + 0j)
    target = (w**2 + 1j * w * layer.rate(s)) / G
    reach = min(depth, 10.0)
    k = newton(lambda q: q * np.tanh(q * reach) - target, k)
    expected = math.exp(-2 * np.sqrt(k**2 - across**2).imag.mean() * width)
    found = reflection(layer, 1.0, depth, G, 1 / 16, angle=angle, closed=True)
    assert found == pytest.approx(expected, rel=0.02)


def test_long_waves_lose_half_of_what_damping_both_conditions_would_take():
    """Damping both conditions equally leaves exp(-2 int nu dx/c) of long waves (Peric &
    Abdel-Maksoud 2016 give the setting; the formula is elementary); elevation alone carries half
    the energy, so exp(-int nu dx/c), with int nu dx = strength x width/3.
    """
    depth, width = 0.016, 3.0
    period = 2 * math.pi / frequency(depth)
    layer = Layer(width, 0.1 * frequency(depth), math.nan)
    expected = math.exp(-layer.strength * width / 3 / float(phase_speed(period, depth)))
    found = reflection(layer, 1.0, depth, G, 1 / 16, closed=True)
    assert found == pytest.approx(expected, rel=0.02)


@pytest.mark.parametrize("closed", [False, True])
def test_everything_comes_back_without_damping(closed):
    assert reflection(Layer(1.0, 0.0, 1.0), 1.0, math.inf, G, 1 / 16, closed=closed) == (
        pytest.approx(1.0, abs=1e-9)
    )


@pytest.mark.parametrize("depth", DEPTHS)
@pytest.mark.parametrize("closed", [False, True])
def test_automatic_width_keeps_the_limit(depth, closed):
    spacing = 2.5
    layer = layer_for(40.0, 40.0 * depth, G, spacing, closed=closed)
    assert layer.width / spacing == pytest.approx(round(layer.width / spacing))
    assert 40.0 <= layer.width <= 60.0
    assert layer.reflection <= 0.005
    again = reflection(layer, 40.0, 40.0 * depth, G, spacing, closed=closed)
    assert again == pytest.approx(layer.reflection)


def test_one_wavelength_reflects_a_hundredth_at_most_in_deep_water():
    assert layer_for(40.0, math.inf, G, 2.5, width=40.0).reflection <= 0.01


@pytest.mark.parametrize("shorter", [0.4, 0.6, 0.8])
def test_shorter_waves_are_reflected_less_than_the_longest_allowed(shorter):
    layer = layer_for(40.0, math.inf, G, 2.0, limit=0.01)
    assert reflection(layer, 40.0 * shorter, math.inf, G, 2.0) <= 0.01


def test_the_chosen_strength_is_the_best_one():
    layer = layer_for(40.0, math.inf, G, 2.5, width=30.0)
    for factor in (0.8, 1.25):
        other = Layer(layer.width, factor * layer.strength, math.nan)
        assert reflection(other, 40.0, math.inf, G, 2.5) > layer.reflection


def test_the_unit_of_length_does_not_matter():
    small = layer_for(1.0, 0.3, G, 1 / 12, width=0.9)
    large = layer_for(100.0, 30.0, G, 100 / 12, width=90.0)
    assert large.reflection == pytest.approx(small.reflection, rel=1e-6)
    assert large.strength == pytest.approx(small.strength / 10, rel=1e-6)


def test_panels_too_large_for_the_waves_are_refused():
    with pytest.raises(InputError, match=r"spacing of 5 m was given for waves 10 m long.* 1\.67 m"):
        layer_for(10.0, math.inf, G, 5.0)


def test_a_limit_out_of_reach_is_refused():
    with pytest.raises(InputError, match=r"no absorber up to 30 m wide .* within 1e-09"):
        layer_for(10.0, math.inf, G, 1.0, limit=1e-9)


def test_wavelength_of_the_frequency_used():
    """The computation's frequency belongs to the wavelength by linear dispersion."""
    assert float(wavenumber(2 * math.pi / frequency(0.2), 0.2)) == pytest.approx(2 * math.pi)
