"""What the absorber of a periodic grid sends back and lets through its seam, against the forecast.

Source of what is expected: `stepping.damped_line`, on a line, at one frequency. Measured here in
time on the sheet itself, free waves and damping turn by turn, until all is steady. The waves are
made on a strip across the middle and travel one way: what comes back meets them on their side of
the strip, what passes the seam arrives on the other.
"""

import math

import numpy as np
import pytest

from bemwave.flow.sheet import Sheet
from bemwave.stepping.absorber import layer_for
from bemwave.stepping.damped_line import Waves, returned

G = 9.80665
NODES = 24  # in the width of the layer, the unit of length
STEPS = 32  # a period
STRIP, CLEAR, USEFUL = 0.75, 3.25, 10.0  # strip's width, its end, useful water [apparent waves]
SHARES = [1.0, 0.57, 0.25]  # of the layer's width: lengths of waves


class Crossing:
    """Long-crested waves that cross a periodic sheet with a layer along both ends in x."""

    def __init__(self, waves, layer):
        self.waves = waves
        self.along = waves.along
        self.across = waves.wavenumber * math.sin(waves.angle)
        rows = round(2 * math.pi / self.across * NODES) if self.across else 2
        self.crest = 2 * math.pi / self.along
        half = round(NODES * USEFUL * self.crest / 2)
        columns = 2 * (half + round(NODES * layer.width))
        self.sheet = Sheet(-columns / 2 / NODES, 0.0, 1 / NODES, (columns, rows), waves.depth)
        self.x, self.y = (part.reshape(columns, rows) for part in self.sheet.xy.T)
        self.half = half / NODES
        self.rate = layer.rate(np.maximum(np.abs(self.x) - self.half, 0.0))

    def steady(self, periods, ramp=8.0):
        """Complex elevation (columns,), of exp(-i w t), after that many periods."""
        w = self.waves.frequency
        step = 2 * math.pi / w / STEPS
        turn = np.sqrt(G * self.sheet.rise)
        cos, sin = np.cos(turn * step / 2), step / 2 * np.sinc(turn * step / 2 / math.pi)
        keep = np.exp(-self.rate * step)
        phase = self.along * self.x + self.across * self.y
        strip = np.exp(1j * phase - 0.5 * (self.x / (STRIP * self.crest)) ** 2)
        elevation = potential = self.sheet.transform(np.zeros(self.sheet.shape))

        def free():
            return (
                cos * elevation + self.sheet.rise * sin * potential,
                cos * potential - G * sin * elevation,
            )

        found = 0.0
        for n in range(periods * STEPS):
            elevation, potential = free()
            time = (n + 0.5) * step
            eased = math.sin(0.5 * math.pi * min(time * w / (2 * math.pi * ramp), 1.0)) ** 2
            made = eased * step * (strip * np.exp(-1j * w * time)).real
            elevation = self.sheet.transform(keep * self.sheet.back(elevation) + made)
            elevation, potential = free()
            if n >= (periods - 1) * STEPS:
                found += self.sheet.back(elevation) * np.exp(1j * w * (n + 1) * step) / STEPS
        return (found * np.exp(-1j * self.across * self.y)).mean(axis=1)

    def returned(self, periods):
        """Reflected and passed, from waves of both directions on both sides of the strip."""
        elevation, x = self.steady(periods), self.x[:, 0]
        far = self.half - 0.25 * self.crest
        fits = []
        for side in (x, -x):
            at = (side > CLEAR * self.crest) & (side < far)
            out = np.exp(1j * self.along * side[at])
            both = np.stack([out, out.conj()], axis=1)
            fits.append(np.linalg.lstsq(both, elevation[at], rcond=None)[0])
        (out, back), (other_out, through) = fits
        entering = np.array([[out, other_out], [other_out, out]])
        return np.abs(np.linalg.solve(entering, [back, through]))


def compare(share, depth, angle=0.0, periods=80):
    """Both figures of a wave against the forecast, of the layer made for waves of its width."""
    layer = layer_for(1.0, depth, G, 1 / NODES, width=1.0, behind="itself")
    waves = Waves(share, depth, G, angle)
    expected = returned(1.0, np.array([layer.strength]), waves, 1 / NODES, "itself")
    found = Crossing(waves, layer).returned(periods)
    # a millionth is left of the strip's own field where the waves are fitted
    np.testing.assert_allclose(found, np.ravel(expected), rtol=0.1, atol=1e-6)
    return found


@pytest.mark.parametrize("share", SHARES)
def test_what_returns_on_deep_water_is_as_forecast(share):
    found = compare(share, math.inf)
    assert found.max() <= 0.01
    assert found.max() <= 0.002 or share > 0.57


@pytest.mark.parametrize("share", SHARES)
def test_what_returns_on_shallow_water_is_as_forecast(share):
    compare(share, 0.05)


@pytest.mark.slow
@pytest.mark.parametrize("rows", [34, 20, 8])
def test_what_returns_of_slanting_waves_is_as_forecast(rows):
    """At 45 degrees; a whole wave along the seam, so that it fits the sheet."""
    angle = math.pi / 4
    compare(rows / NODES * math.sin(angle), math.inf, angle, periods=200)
