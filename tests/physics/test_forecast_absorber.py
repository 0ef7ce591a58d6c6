"""What the absorber of a narrow channel sends back, and its waves' phase, against the forecasts.

Source of what is expected: `stepping.absorber.layer_for` (one dimension) and `flow.dispersion`
(closed form), neither of which knows the panels' matrices used here.
"""

import math

import numpy as np
import pytest
from scipy.optimize import minimize_scalar

from bemwave.flow.dispersion import phase_error
from bemwave.flow.images import Mirror
from bemwave.flow.panels import PanelFlow
from bemwave.geometry.outline import Rectangle
from bemwave.geometry.water_surface import structured_water
from bemwave.stepping.absorber import layer_for

G = 9.80665
WIDTHS = [0.6, 1.0, 1.75]  # wavelengths
MAKER_ENDS = 2.625


class Channel:
    """Waves one metre long between two mirrors: made by the wall x = 0, absorbed at the far end."""

    def __init__(self, nodes, cells_across, length, depth, closed):
        self.spacing, self.depth, self.closed = 1 / nodes, depth, closed
        self.length = round(length * nodes) / nodes
        width = cells_across / nodes
        walls = [Mirror("y", 0.0), Mirror("y", width), Mirror("x", 0.0)]
        if closed:
            walls.append(Mirror("x", self.length))
        sheet = structured_water(Rectangle(0.0, self.length, 0.0, width), self.spacing)
        self.flow = PanelFlow(sheet, depth, closed=closed, mirrors=tuple(walls))
        self.x = self.flow.elements.points[: self.flow.elements.free, 0]
        self.k = 2 * math.pi
        self.frequency = math.sqrt(G * self.k * math.tanh(self.k * depth))

    def potential(self, layer):
        """At the frequency, complex, from (g S - w^2 M - i w M_nu) phi = maker."""
        e, w = self.flow.elements, self.frequency
        middles = e.points[e.water].mean(axis=1)[:, 0]
        rate = layer.rate(np.maximum(middles - (self.length - layer.width), 0.0))
        damping = e.weighted_mass(rate).toarray()
        system = G * self.flow.surface_matrix - w**2 * self.flow.mass.toarray() - 1j * w * damping
        maker = np.cos(self.k * self.x) * np.exp(-0.5 * (self.x / 0.75) ** 2)
        return np.linalg.solve(system, (self.flow.mass @ maker).astype(complex))

    def measured(self, layer):
        """Reflection, and relative deficit of the wavenumber, by a fit in the useful water."""
        useful = (self.x > MAKER_ENDS) & (self.x < self.length - layer.width - 0.25)
        x, phi = self.x[useful], self.potential(layer)[useful]

        def fit(k):
            waves = np.exp(np.outer(x, [1j * k, -1j * k]))
            amplitudes = np.linalg.lstsq(waves, phi, rcond=None)[0]
            return amplitudes, float(np.linalg.norm(waves @ amplitudes - phi))

        k = minimize_scalar(
            lambda k: fit(k)[1],
            bounds=(0.97 * self.k, 1.03 * self.k),
            method="bounded",
            options={"xatol": 1e-8},
        ).x
        out, back = fit(k)[0]
        return abs(back / out), 1 - k / self.k


@pytest.fixture(scope="module")
def open_channel():
    return Channel(nodes=12, cells_across=3, length=7.25, depth=math.inf, closed=False)


@pytest.mark.parametrize("width", WIDTHS)
def test_open_end_reflects_what_the_plan_says(open_channel, width):
    layer = layer_for(1.0, math.inf, G, open_channel.spacing, width=width)
    reflected, _ = open_channel.measured(layer)
    assert reflected == pytest.approx(layer.reflection, rel=0.1)
    assert reflected <= 0.01 or width < 1.0


def test_phase_along_an_open_channel_is_as_forecast(open_channel):
    layer = layer_for(1.0, math.inf, G, open_channel.spacing, width=1.75)
    _, deficit = open_channel.measured(layer)
    ahead = phase_error(1.0, open_channel.spacing, 1.0, heading=0.0)
    assert deficit * open_channel.k == pytest.approx(ahead, rel=0.1)


@pytest.mark.slow
def test_end_before_a_wall_reflects_what_the_plan_says():
    """Closed water over a bed: the flux is an unknown, and a wall stands behind the layer."""
    channel = Channel(nodes=8, cells_across=3, length=6.0, depth=0.25, closed=True)
    for width in WIDTHS:
        layer = layer_for(1.0, 0.25, G, channel.spacing, width=width, behind="wall")
        reflected, _ = channel.measured(layer)
        assert reflected == pytest.approx(layer.reflection, rel=0.3)
        assert reflected <= 0.01 or width < 1.0
