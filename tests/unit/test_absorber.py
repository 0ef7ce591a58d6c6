"""The absorbing layer: its rate, its size, and the computation of what it reflects."""

import math

import numpy as np
import pytest
from scipy.optimize import newton

from bemwave.errors import InputError
from bemwave.stepping.absorber import Layer, forecast, layer_for
from bemwave.stepping.damped_line import Waves, returned
from bemwave.waves.dispersion import phase_speed, wavenumber

G = 9.80665
DEPTHS = [math.inf, 0.2, 0.05, 0.016]  # wavelengths


BEHIND = ["still water", "wall", "itself"]


def frequency(depth):
    return math.sqrt(G * 2 * math.pi * math.tanh(2 * math.pi * depth))


def returns(layer, wavelength, depth, spacing, behind="still water", angle=0.0):
    """(reflected, passed) of one layer."""
    waves = Waves(wavelength, depth, G, angle)
    reflected, passed = returned(layer.width, np.array([layer.strength]), waves, spacing, behind)
    return float(reflected[0]), float(passed[0])


def all_that_returns(*args, **kwargs):
    return math.hypot(*returns(*args, **kwargs))


def test_rate_is_zero_in_useful_water_and_grows_with_the_square_outside():
    layer = Layer(width=8.0, strength=2.0, reflection=0.01)
    np.testing.assert_allclose(layer.rate(np.array([0.0, 4.0, 8.0])), [0.0, 0.5, 2.0])


@pytest.mark.parametrize("depth", DEPTHS)
@pytest.mark.parametrize("angle", [0.0, math.radians(30.0)])
def test_gentle_layer_returns_what_slow_damping_leaves(depth, angle):
    """There and back before a wall, or there and on through the layer of the opposite side.

    Source: WKB on the local dispersion k tanh kh = (w^2 + i w nu)/g of damped elevation.
    """
    w, width = frequency(depth), 4.0
    layer = Layer(width, 0.15 * w, math.nan)
    across = 2 * math.pi * math.sin(angle)
    s = (np.arange(400) + 0.5) / 400 * width
    k = np.full(400, 2 * math.pi + 0j)
    target = (w**2 + 1j * w * layer.rate(s)) / G
    reach = min(depth, 10.0)
    k = newton(lambda q: q * np.tanh(q * reach) - target, k)
    expected = math.exp(-2 * np.sqrt(k**2 - across**2).imag.mean() * width)
    reflected, _ = returns(layer, 1.0, depth, 1 / 16, "wall", angle)
    reflected_at_seam, passed = returns(layer, 1.0, depth, 1 / 16, "itself", angle)
    assert reflected == pytest.approx(expected, rel=0.02)
    assert passed == pytest.approx(expected, rel=0.02)
    assert reflected_at_seam < 0.02 * passed


def test_long_waves_lose_half_of_what_damping_both_conditions_would_take():
    """Damping both conditions equally leaves exp(-2 int nu dx/c) of long waves (Peric &
    Abdel-Maksoud 2016 give the setting; the formula is elementary); elevation alone carries half
    the energy, so exp(-int nu dx/c), with int nu dx = strength x width/3.
    """
    depth, width = 0.016, 3.0
    period = 2 * math.pi / frequency(depth)
    layer = Layer(width, 0.1 * frequency(depth), math.nan)
    expected = math.exp(-layer.strength * width / 3 / float(phase_speed(period, depth)))
    assert returns(layer, 1.0, depth, 1 / 16, "wall")[0] == pytest.approx(expected, rel=0.02)
    assert returns(layer, 1.0, depth, 1 / 16, "itself")[1] == pytest.approx(expected, rel=0.02)


@pytest.mark.parametrize("behind", BEHIND)
def test_nothing_is_lost_without_damping(behind):
    expected = (0.0, 1.0) if behind == "itself" else (1.0, 0.0)
    found = returns(Layer(1.0, 0.0, 1.0), 1.0, math.inf, 1 / 16, behind)
    assert found == pytest.approx(expected, abs=1e-9)


@pytest.mark.parametrize("depth", DEPTHS)
@pytest.mark.parametrize("behind", BEHIND)
def test_automatic_width_keeps_the_limit(depth, behind):
    spacing = 2.5
    layer = layer_for(40.0, 40.0 * depth, G, spacing, behind=behind)
    assert layer.width / spacing == pytest.approx(round(layer.width / spacing))
    assert 40.0 <= layer.width <= 60.0
    assert layer.reflection <= 0.005
    assert layer.passed <= 0.005
    assert (layer.passed > 0.0) == (behind == "itself")
    again = returns(layer, 40.0, 40.0 * depth, spacing, behind)
    assert again == pytest.approx((layer.reflection, layer.passed))


@pytest.mark.parametrize("behind", ["still water", "itself"])
def test_one_wavelength_returns_a_hundredth_at_most_in_deep_water(behind):
    layer = layer_for(40.0, math.inf, G, 2.5, width=40.0, behind=behind)
    assert max(layer.reflection, layer.passed) <= 0.01


@pytest.mark.parametrize("behind", ["still water", "itself"])
@pytest.mark.parametrize("shorter", [0.4, 0.6, 0.8])
def test_less_returns_of_shorter_waves_than_of_the_longest_allowed(shorter, behind):
    layer = layer_for(40.0, math.inf, G, 2.0, limit=0.01, behind=behind)
    assert max(returns(layer, 40.0 * shorter, math.inf, 2.0, behind)) <= 0.01


@pytest.mark.parametrize("behind", BEHIND)
def test_the_chosen_strength_is_the_best_one(behind):
    layer = layer_for(40.0, math.inf, G, 2.5, width=30.0, behind=behind)
    for factor in (0.8, 1.25):
        other = Layer(layer.width, factor * layer.strength, math.nan)
        assert all_that_returns(other, 40.0, math.inf, 2.5, behind) > math.hypot(
            layer.reflection, layer.passed
        )


def test_forecast_lists_waves_as_long_as_the_layer_is_wide_and_shorter():
    layer = layer_for(40.0, math.inf, G, 2.0, width=40.0, behind="itself")
    found = list(forecast(layer, math.inf, G, 2.0, "itself"))
    lengths = [length for length in (40.0, 22.8, 10.0) for _ in range(2)]
    assert [f.wavelength for f in found] == pytest.approx(lengths)
    assert [f.angle for f in found] == [0.0, math.pi / 4] * 3
    longest, _, shorter, slanting, shortest, _ = found
    assert (longest.reflected, longest.passed) == pytest.approx((layer.reflection, layer.passed))
    assert max(shorter.reflected, shorter.passed) <= 0.002
    assert max(shortest.reflected, shortest.passed) <= 0.0005
    assert slanting.reflected > 3 * shorter.reflected
    assert slanting.passed < shorter.passed  # its way through is longer


def test_forecast_leaves_out_waves_of_less_than_three_spacings():
    layer = layer_for(40.0, math.inf, G, 4.0, width=40.0, behind="itself")
    found = [f.wavelength for f in forecast(layer, math.inf, G, 4.0, "itself")]
    assert found == pytest.approx([40.0, 40.0, 22.8, 22.8])


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


@pytest.mark.parametrize("width", [1e-5, 1e5])
@pytest.mark.parametrize(("spacing", "least"), [(2.5, "2.5"), (0.1, "0.8")])
def test_an_absurd_width_is_refused(width, spacing, least):
    with pytest.raises(InputError, match=rf"absorber = \S+ m was .* from {least} to 1000 m, or"):
        layer_for(40.0, math.inf, 9.81, spacing, width=width)
